// SPDX-License-Identifier: GPL-2.0-or-later
#include "physics/band_law.h"

#include <algorithm>
#include <cmath>

#include "base/constants.h"
#include "base/error.h"
#include "base/vector_width.h"
#include "math/least_squares.h"
#include "math/vector_exp.h"
#include "physics/spectral_law.h"

namespace foreglow {
namespace {

using Kernel = BandLaw::Kernel;

/// One parameter's range, as the interval [-1, 1]; a single value is the middle alone.
struct Axis {
    Axis(double low, double high) : middle(0.5 * (low + high)), half(0.5 * (high - low)) {}
    [[nodiscard]] double at(double x) const { return middle + half * x; }
    [[nodiscard]] bool varies() const { return half > 0; }
    double middle, half;
};

std::vector<double> chebyshev_points(const Axis& axis, int count) {
    if (!axis.varies()) return {0.0};
    std::vector<double> points;
    points.reserve(static_cast<std::size_t>(count));
    for (int i = 0; i < count; ++i)
        points.push_back(-std::cos(constants::pi * (i + 0.5) / count));
    return points;
}

std::vector<double> even_points(const Axis& axis, int count) {
    if (!axis.varies()) return {0.0};
    std::vector<double> points;
    points.reserve(static_cast<std::size_t>(count));
    for (int i = 0; i < count; ++i)
        points.push_back(-1.0 + 2.0 * i / (count - 1));
    return points;
}

constexpr int any_degree = -1;

// One pass over the pixels with everything in registers. Usual degrees are compile-time numbers, so that the
// sums unroll.
template <int fixed_degree, bool two_dimensional, ExpPrecision precision>
FOREGLOW_INLINE void run(const Kernel& k, const double* index, const double* curvature, double* out,
                         std::size_t n) {
    const int degree = fixed_degree == any_degree ? k.degree : fixed_degree;
    for (std::size_t p = 0; p < n; ++p) {
        const double x = (index[p] - k.index_middle) * k.index_scale;
        const double y = (curvature[p] - k.curvature_middle) * k.curvature_scale;
        double sum = 0;
        int end = two_dimensional ? (degree + 1) * (degree + 2) / 2 : degree + 1;
#pragma GCC unroll 16
        for (int j = two_dimensional ? degree : 0; j >= 0; --j) {
            const int terms = degree - j + 1;
            const auto first = static_cast<std::size_t>(end) - static_cast<std::size_t>(terms);
            double row = k.c[first + static_cast<std::size_t>(terms) - 1];
#pragma GCC unroll 16
            for (int i = terms - 2; i >= 0; --i)
                row = row * x + k.c[first + static_cast<std::size_t>(i)];
            sum = sum * y + row;
            end -= terms;
        }
        out[p] = vector_exp<precision>((index[p] + curvature[p] * k.log_ref) * k.log_ref + sum);
    }
}

template <bool two_dimensional, ExpPrecision precision>
FOREGLOW_INLINE void run_degree(const Kernel& k, const double* index, const double* curvature, double* out,
                                std::size_t n) {
    switch (k.degree) {
        case 0:
            return run<0, two_dimensional, precision>(k, index, curvature, out, n);
        case 1:
            return run<1, two_dimensional, precision>(k, index, curvature, out, n);
        case 2:
            return run<2, two_dimensional, precision>(k, index, curvature, out, n);
        case 3:
            return run<3, two_dimensional, precision>(k, index, curvature, out, n);
        case 4:
            return run<4, two_dimensional, precision>(k, index, curvature, out, n);
        case 5:
            return run<5, two_dimensional, precision>(k, index, curvature, out, n);
        default:
            return run<any_degree, two_dimensional, precision>(k, index, curvature, out, n);
    }
}

FOREGLOW_WIDE
void run_double(const Kernel& k, const double* index, const double* curvature, double* out, std::size_t n) {
    if (k.varies_with_curvature)
        run_degree<true, ExpPrecision::Double>(k, index, curvature, out, n);
    else
        run_degree<false, ExpPrecision::Double>(k, index, curvature, out, n);
}

FOREGLOW_WIDE
void run_single(const Kernel& k, const double* index, const double* curvature, double* out, std::size_t n) {
    if (k.varies_with_curvature)
        run_degree<true, ExpPrecision::Single>(k, index, curvature, out, n);
    else
        run_degree<false, ExpPrecision::Single>(k, index, curvature, out, n);
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
    kernel_.log_ref = log_sum / weight_sum;
    const Axis index(range.index_low, range.index_high);
    const Axis curvature(range.curvature_low, range.curvature_high);
    kernel_.index_middle = index.middle;
    kernel_.curvature_middle = curvature.middle;
    kernel_.index_scale = index.varies() ? 1.0 / index.half : 0.0;
    kernel_.curvature_scale = curvature.varies() ? 1.0 / curvature.half : 0.0;
    kernel_.varies_with_curvature = curvature.varies();
    for (kernel_.degree = 0; kernel_.degree <= Kernel::highest_degree; ++kernel_.degree) {
        fit(band, reference, range);
        worst_error_ = error_on_check_grid(band, reference, range);
        if (worst_error_ <= tolerance) return;
    }
    worst_error_ = 0;
    log_ratios_.reserve(band.hz.size());
    for (const double hz : band.hz)
        log_ratios_.push_back(std::log(hz / reference.hz()));
    band_weights_ = band.weights;
}

void BandLaw::fit(const BandSum& band, Frequency reference, const ParameterRange& range) {
    const Axis index(range.index_low, range.index_high);
    const Axis curvature(range.curvature_low, range.curvature_high);
    const int degree = kernel_.degree;
    std::vector<std::array<int, 3>> powers;  // of x, of y, and the place among the coefficients
    int place = 0;
    for (int j = 0; j <= (curvature.varies() ? degree : 0); ++j)
        for (int i = 0; i <= degree - j; ++i, ++place)
            if (index.varies() || i == 0) powers.push_back({i, j, place});
    const auto x_fit = chebyshev_points(index, degree + 4);
    const auto y_fit = chebyshev_points(curvature, degree + 4);
    Matrix a(x_fit.size() * y_fit.size(), powers.size());
    std::vector<double> b(a.rows);
    std::size_t row = 0;
    for (const double y : y_fit)
        for (const double x : x_fit) {
            const SpectralParameters p{index.at(x), curvature.at(y)};
            b[row] = std::log(exact_band_value(band, reference, p.index, p.curvature)) -
                     log_brightness_ratio(p, kernel_.log_ref);
            for (std::size_t k = 0; k < powers.size(); ++k)
                a(row, k) = std::pow(x, powers[k][0]) * std::pow(y, powers[k][1]);
            ++row;
        }
    const std::vector<double> solution = solve_least_squares(std::move(a), std::move(b));
    kernel_.c.fill(0.0);
    for (std::size_t k = 0; k < powers.size(); ++k)
        kernel_.c[static_cast<std::size_t>(powers[k][2])] = solution[k];
}

double BandLaw::error_on_check_grid(const BandSum& band, Frequency reference,
                                    const ParameterRange& range) const {
    const Axis index(range.index_low, range.index_high);
    const Axis curvature(range.curvature_low, range.curvature_high);
    double worst = 0;
    for (const double y : even_points(curvature, 17))
        for (const double x : even_points(index, 33)) {
            const double exact = exact_band_value(band, reference, index.at(x), curvature.at(y));
            worst = std::max(worst, std::abs(value(index.at(x), curvature.at(y)) / exact - 1.0));
        }
    return worst;
}

void BandLaw::evaluate(std::span<const double> index, std::span<const double> curvature,
                       std::span<double> out, ExpPrecision precision) const {
    FOREGLOW_EXPECTS(index.size() == out.size() && curvature.size() == out.size());
    if (!log_ratios_.empty()) {
        std::fill(out.begin(), out.end(), 0.0);
        for (std::size_t k = 0; k < log_ratios_.size(); ++k)
            for (std::size_t p = 0; p < out.size(); ++p)
                out[p] += band_weights_[k] *
                          vector_exp((index[p] + curvature[p] * log_ratios_[k]) * log_ratios_[k]);
        return;
    }
    if (precision == ExpPrecision::Single)
        run_single(kernel_, index.data(), curvature.data(), out.data(), out.size());
    else
        run_double(kernel_, index.data(), curvature.data(), out.data(), out.size());
}

double BandLaw::value(double index, double curvature) const {
    double out = 0;
    evaluate({&index, 1}, {&curvature, 1}, {&out, 1});
    return out;
}

}  // namespace foreglow
