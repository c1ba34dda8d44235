// SPDX-License-Identifier: GPL-2.0-or-later
#include "physics/band_law.h"

#include <algorithm>
#include <array>
#include <cmath>

#include "base/constants.h"
#include "base/error.h"
#include "base/text.h"
#include "math/least_squares.h"
#include "math/vector_exp.h"
#include "physics/spectral_law.h"

// Compiled for several vector widths and chosen at run time; contraction is off, so all widths round alike.
#if defined(__x86_64__) && defined(__GNUC__) && !defined(__clang__)
#define FOREGLOW_WIDE __attribute__((target_clones("default", "avx2", "avx512f")))
#else
#define FOREGLOW_WIDE
#endif

namespace foreglow {
namespace {

constexpr int highest_degree = 12;
constexpr std::size_t block = 512;  // fits the first-level cache three times over

struct Axis {
    double middle = 0, half = 0;
    [[nodiscard]] double at(double x) const { return middle + half * x; }
};

Axis axis_of(double low, double high) {
    return {0.5 * (low + high), 0.5 * (high - low)};
}

std::vector<double> chebyshev_points(int count) {
    std::vector<double> points;
    for (int i = 0; i < count; ++i) points.push_back(-std::cos(constants::pi * (i + 0.5) / count));
    return points;
}

std::vector<double> even_points(int count) {
    std::vector<double> points;
    for (int i = 0; i < count; ++i) points.push_back(-1.0 + 2.0 * i / (count - 1));
    return points;
}

std::size_t terms_of(int degree, bool two_dimensional) {
    const auto d = static_cast<std::size_t>(degree);
    return two_dimensional ? (d + 1) * (d + 2) / 2 : d + 1;
}

FOREGLOW_WIDE
void exponentiate(double* values, std::size_t n) {
    for (std::size_t i = 0; i < n; ++i) values[i] = vector_exp(values[i]);
}

FOREGLOW_WIDE
void horner(double* sum, const double* x, double coefficient, std::size_t n) {
    for (std::size_t i = 0; i < n; ++i) sum[i] = sum[i] * x[i] + coefficient;
}

}  // namespace

double exact_band_value(const BandSum& band, Frequency reference, double index, double curvature) {
    double sum = 0;
    for (std::size_t i = 0; i < band.hz.size(); ++i) {
        const double log_ratio = std::log(band.hz[i] / reference.hz());
        sum += band.weights[i] * std::exp(log_brightness_ratio({index, curvature}, log_ratio));
    }
    return sum;
}

BandLaw::BandLaw(const BandSum& band, Frequency reference, const ParameterRange& range, double tolerance) {
    FOREGLOW_EXPECTS(!band.hz.empty() && tolerance >= 1e-12);
    double weight_sum = 0;
    double log_sum = 0;
    for (std::size_t i = 0; i < band.hz.size(); ++i) {
        weight_sum += band.weights[i];
        log_sum += band.weights[i] * std::log(band.hz[i] / reference.hz());
    }
    log_ref_ = log_sum / weight_sum;
    const Axis index_axis = axis_of(range.index_low, range.index_high);
    const Axis curvature_axis = axis_of(range.curvature_low, range.curvature_high);
    index_middle_ = index_axis.middle;
    curvature_middle_ = curvature_axis.middle;
    index_scale_ = index_axis.half > 0 ? 1.0 / index_axis.half : 0.0;
    curvature_scale_ = curvature_axis.half > 0 ? 1.0 / curvature_axis.half : 0.0;
    varies_with_curvature_ = curvature_axis.half > 0;

    const auto log_correction = [&](double x, double y) {
        const SpectralParameters p{index_axis.at(x), curvature_axis.at(y)};
        return std::log(exact_band_value(band, reference, p.index, p.curvature)) - log_brightness_ratio(p, log_ref_);
    };
    const std::vector<double> x_check = index_axis.half > 0 ? even_points(33) : std::vector<double>{0.0};
    const std::vector<double> y_check = varies_with_curvature_ ? even_points(17) : std::vector<double>{0.0};
    const int first_degree = band.hz.size() == 1 ? 0 : 1;
    const int last_degree = band.hz.size() == 1 ? 0 : highest_degree;
    for (degree_ = first_degree; degree_ <= last_degree; ++degree_) {
        const auto x_fit = index_axis.half > 0 ? chebyshev_points(degree_ + 4) : std::vector<double>{0.0};
        const auto y_fit = varies_with_curvature_ ? chebyshev_points(degree_ + 4) : std::vector<double>{0.0};
        const int degree_x = index_axis.half > 0 ? degree_ : 0;
        Matrix a(x_fit.size() * y_fit.size(), 0);
        a.columns = 0;
        std::vector<std::array<int, 2>> powers;
        for (int j = 0; j <= (varies_with_curvature_ ? degree_ : 0); ++j)
            for (int i = 0; i <= degree_ - j; ++i)
                if (i <= degree_x) powers.push_back({i, j});
        a = Matrix(x_fit.size() * y_fit.size(), powers.size());
        std::vector<double> b(a.rows);
        std::size_t row = 0;
        for (const double y : y_fit)
            for (const double x : x_fit) {
                b[row] = log_correction(x, y);
                for (std::size_t k = 0; k < powers.size(); ++k) a(row, k) = std::pow(x, powers[k][0]) * std::pow(y, powers[k][1]);
                ++row;
            }
        const std::vector<double> solution = solve_least_squares(a, b);
        coefficients_.assign(terms_of(degree_, varies_with_curvature_), 0.0);
        std::size_t place = 0;
        std::size_t k = 0;
        for (int j = 0; j <= (varies_with_curvature_ ? degree_ : 0); ++j)
            for (int i = 0; i <= degree_ - j; ++i, ++place)
                if (i <= degree_x) coefficients_[place] = solution[k++];
        worst_error_ = 0;
        for (const double y : y_check)
            for (const double x : x_check) {
                const SpectralParameters p{index_axis.at(x), curvature_axis.at(y)};
                const double exact = exact_band_value(band, reference, p.index, p.curvature);
                worst_error_ = std::max(worst_error_, std::abs(value(p.index, p.curvature) / exact - 1.0));
            }
        if (worst_error_ <= tolerance) return;
    }
    if (degree_ > last_degree) degree_ = last_degree;
    if (band.hz.size() > 1)
        throw NumericError("the average over the band around " + to_text(Frequency::from_hz(reference.hz() * std::exp(log_ref_))) +
                           " reaches a relative error of " + format_number(worst_error_, 2) + ", not the " +
                           format_number(tolerance, 2) + " asked for: narrow the band, or the range of the index map");
}

void BandLaw::evaluate(std::span<const double> index, std::span<const double> curvature, std::span<double> out) const {
    const std::size_t n = out.size();
    std::array<double, block> x{}, y{}, inner{};
    FOREGLOW_EXPECTS(n <= block);
    for (std::size_t i = 0; i < n; ++i) {
        x[i] = (index[i] - index_middle_) * index_scale_;
        y[i] = (curvature[i] - curvature_middle_) * curvature_scale_;
        out[i] = 0;
    }
    const int rows = varies_with_curvature_ ? degree_ : 0;
    std::size_t end = coefficients_.size();
    for (int j = rows; j >= 0; --j) {
        const auto terms = static_cast<std::size_t>(degree_ - j + 1);
        const double* c = coefficients_.data() + (end - terms);
        end -= terms;
        if (rows == 0) {
            for (std::size_t i = 0; i < n; ++i) out[i] = c[terms - 1];
            for (std::size_t k = terms - 1; k-- > 0;) horner(out.data(), x.data(), c[k], n);
            break;
        }
        for (std::size_t i = 0; i < n; ++i) inner[i] = c[terms - 1];
        for (std::size_t k = terms - 1; k-- > 0;) horner(inner.data(), x.data(), c[k], n);
        for (std::size_t i = 0; i < n; ++i) out[i] = out[i] * y[i] + inner[i];
    }
    for (std::size_t i = 0; i < n; ++i) out[i] += (index[i] + curvature[i] * log_ref_) * log_ref_;
    exponentiate(out.data(), n);
}

double BandLaw::value(double index, double curvature) const {
    double out = 0;
    evaluate({&index, 1}, {&curvature, 1}, {&out, 1});
    return out;
}

void BandLaw::apply(std::span<const double> amplitude, std::span<const double> index, std::span<const double> curvature,
                    std::span<double> out) const {
    std::array<double, block> factor{};
    for (std::size_t first = 0; first < out.size(); first += block) {
        const std::size_t n = std::min(block, out.size() - first);
        evaluate(index.subspan(first, n), curvature.subspan(first, n), {factor.data(), n});
        for (std::size_t i = 0; i < n; ++i) out[first + i] = amplitude[first + i] * factor[i];
    }
}

void BandLaw::apply(std::span<const double> q, std::span<const double> u, std::span<const double> index,
                    std::span<const double> curvature, std::span<double> q_out, std::span<double> u_out) const {
    std::array<double, block> factor{};
    for (std::size_t first = 0; first < q_out.size(); first += block) {
        const std::size_t n = std::min(block, q_out.size() - first);
        evaluate(index.subspan(first, n), curvature.subspan(first, n), {factor.data(), n});
        for (std::size_t i = 0; i < n; ++i) {
            q_out[first + i] = q[first + i] * factor[i];
            u_out[first + i] = u[first + i] * factor[i];
        }
    }
}

}  // namespace foreglow
