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
constexpr std::size_t block = 512;  // a few arrays of it stay in the first-level cache

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
    for (int i = 0; i < count; ++i)
        points.push_back(-std::cos(constants::pi * (i + 0.5) / count));
    return points;
}

std::vector<double> even_points(const Axis& axis, int count) {
    if (!axis.varies()) return {0.0};
    std::vector<double> points;
    for (int i = 0; i < count; ++i)
        points.push_back(-1.0 + 2.0 * i / (count - 1));
    return points;
}

FOREGLOW_WIDE
void exponentiate(double* values, std::size_t n) {
    for (std::size_t i = 0; i < n; ++i)
        values[i] = vector_exp(values[i]);
}

FOREGLOW_WIDE
void horner(double* sum, const double* x, double coefficient, std::size_t n) {
    for (std::size_t i = 0; i < n; ++i)
        sum[i] = sum[i] * x[i] + coefficient;
}

FOREGLOW_WIDE
void add_product(double* sum, const double* factor, const double* added, std::size_t n) {
    for (std::size_t i = 0; i < n; ++i)
        sum[i] = sum[i] * factor[i] + added[i];
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
    const Axis index(range.index_low, range.index_high);
    const Axis curvature(range.curvature_low, range.curvature_high);
    index_middle_ = index.middle;
    curvature_middle_ = curvature.middle;
    index_scale_ = index.varies() ? 1.0 / index.half : 0.0;
    curvature_scale_ = curvature.varies() ? 1.0 / curvature.half : 0.0;
    for (degree_ = 0; degree_ <= highest_degree; ++degree_) {
        fit(band, reference, range);
        worst_error_ = error_on_check_grid(band, reference, range);
        if (worst_error_ <= tolerance) return;
    }
    throw NumericError("the average over the band around " +
                       to_text(Frequency::from_hz(reference.hz() * std::exp(log_ref_))) +
                       " reaches a relative error of " + format_number(worst_error_, 2) + ", not the " +
                       format_number(tolerance, 2) +
                       " asked for: narrow the band, or the range of the index map");
}

void BandLaw::fit(const BandSum& band, Frequency reference, const ParameterRange& range) {
    const Axis index(range.index_low, range.index_high);
    const Axis curvature(range.curvature_low, range.curvature_high);
    std::vector<std::array<int, 2>> powers;
    for (int j = 0; j <= (curvature.varies() ? degree_ : 0); ++j)
        for (int i = 0; i <= (index.varies() ? degree_ - j : 0); ++i)
            powers.push_back({i, j});
    const auto x_fit = chebyshev_points(index, degree_ + 4);
    const auto y_fit = chebyshev_points(curvature, degree_ + 4);
    Matrix a(x_fit.size() * y_fit.size(), powers.size());
    std::vector<double> b(a.rows);
    std::size_t row = 0;
    for (const double y : y_fit)
        for (const double x : x_fit) {
            const SpectralParameters p{index.at(x), curvature.at(y)};
            b[row] = std::log(exact_band_value(band, reference, p.index, p.curvature)) -
                     log_brightness_ratio(p, log_ref_);
            for (std::size_t k = 0; k < powers.size(); ++k)
                a(row, k) = std::pow(x, powers[k][0]) * std::pow(y, powers[k][1]);
            ++row;
        }
    const std::vector<double> solution = solve_least_squares(std::move(a), std::move(b));
    rows_.assign(static_cast<std::size_t>(powers.back()[1]) + 1, {});
    for (std::size_t k = 0; k < powers.size(); ++k)
        rows_[static_cast<std::size_t>(powers[k][1])].push_back(solution[k]);
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

void BandLaw::evaluate_block(const double* index, const double* curvature, double* out, std::size_t n) const {
    std::array<double, block> x, y, inner;  // NOLINT: filled below as far as used
    for (std::size_t i = 0; i < n; ++i) {
        x[i] = (index[i] - index_middle_) * index_scale_;
        y[i] = (curvature[i] - curvature_middle_) * curvature_scale_;
        out[i] = 0;
    }
    for (std::size_t j = rows_.size(); j-- > 0;) {
        const std::vector<double>& row = rows_[j];
        std::fill_n(inner.begin(), n, row.back());
        for (std::size_t k = row.size() - 1; k-- > 0;)
            horner(inner.data(), x.data(), row[k], n);
        add_product(out, y.data(), inner.data(), n);
    }
    for (std::size_t i = 0; i < n; ++i)
        out[i] += (index[i] + curvature[i] * log_ref_) * log_ref_;
    exponentiate(out, n);
}

void BandLaw::evaluate(std::span<const double> index, std::span<const double> curvature,
                       std::span<double> out) const {
    FOREGLOW_EXPECTS(index.size() == out.size() && curvature.size() == out.size());
    for (std::size_t first = 0; first < out.size(); first += block)
        evaluate_block(index.data() + first, curvature.data() + first, out.data() + first,
                       std::min(block, out.size() - first));
}

double BandLaw::value(double index, double curvature) const {
    double out = 0;
    evaluate_block(&index, &curvature, &out, 1);
    return out;
}

}  // namespace foreglow
