// SPDX-License-Identifier: GPL-2.0-or-later
#include "math/chebyshev_box.h"

#include <algorithm>
#include <cmath>

#include "base/constants.h"
#include "base/error.h"
#include "base/parallel.h"

namespace foreglow {
namespace {

constexpr std::array first_counts{12, 24, 48, 96, 160};
constexpr std::array other_counts{5, 9, 17, 25, 25};  // the same step each
constexpr int highest_count = 160;

double node(int i, int count) {
    return std::cos(constants::pi * (i + 0.5) / count);
}

double at(const Interval& interval, double scaled) {
    return 0.5 * (interval.low + interval.high) + 0.5 * (interval.high - interval.low) * scaled;
}

// Values at the nodes of one variable to coefficients, in place.
void transform_line(std::vector<double>& values, std::size_t first, std::size_t stride, int count) {
    std::array<double, highest_count> line{};
    for (int j = 0; j < count; ++j) {
        double sum = 0;
        for (int i = 0; i < count; ++i)
            sum += values[first + static_cast<std::size_t>(i) * stride] *
                   std::cos(constants::pi * j * (i + 0.5) / count);
        line[static_cast<std::size_t>(j)] = sum * (j == 0 ? 1.0 : 2.0) / count;
    }
    for (int j = 0; j < count; ++j)
        values[first + static_cast<std::size_t>(j) * stride] = line[static_cast<std::size_t>(j)];
}

// Clenshaw's sum for many places; the order of operations is the same for each.
FOREGLOW_WIDE void sum_series(std::span<const double> c, double middle, double scale,
                              std::span<const double> places, std::span<double> out) {
    for (std::size_t i = 0; i < out.size(); ++i) {
        double t = (places[i] - middle) * scale;
        t = t < -1 ? -1 : t;
        t = t > 1 ? 1 : t;
        double a = 0;
        double b = 0;
        for (std::size_t k = c.size() - 1; k > 0; --k) {
            const double next = 2 * t * a - b + c[k];
            b = a;
            a = next;
        }
        out[i] = t * a - b + c[0];
    }
}

}  // namespace

ChebyshevBox::ChebyshevBox(const std::array<Interval, most_variables>& box, const Row& row, double tolerance,
                           double lowest)
    : box_(box) {
    FOREGLOW_EXPECTS(tolerance > 0);
    double best = 0;
    for (std::size_t step = 0; step < first_counts.size(); ++step) {
        std::array<int, most_variables> counts{};
        for (std::size_t v = 0; v < most_variables; ++v)
            counts[v] = box[v].is_point() ? 1 : v == 0 ? first_counts[step] : other_counts[step];
        ChebyshevBox next;
        next.box_ = box;
        next.sample(row, counts);
        next.measure(row, lowest);
        if (step == 0 || next.worst_error_ < best) *this = std::move(next);
        best = worst_error_;
        const bool varies =
            std::any_of(box.begin(), box.end(), [](const Interval& range) { return !range.is_point(); });
        if (best <= tolerance || !varies) break;
    }
    trim(0.1 * tolerance);
}

void ChebyshevBox::sample(const Row& row, const std::array<int, most_variables>& counts) {
    counts_ = counts;
    const auto n = static_cast<std::size_t>(counts[0]);
    std::vector<double> first(n);
    for (int i = 0; i < counts[0]; ++i)
        first[static_cast<std::size_t>(i)] = at(box_[0], counts[0] == 1 ? 0 : node(i, counts[0]));
    coefficients_.assign(n * static_cast<std::size_t>(counts[1]) * static_cast<std::size_t>(counts[2]) *
                             static_cast<std::size_t>(counts[3]),
                         0.0);
    const std::int64_t rows = std::int64_t{counts[1]} * counts[2] * counts[3];
    parallel_for_blocks(rows, 1, [&](std::int64_t begin, std::int64_t) {
        const auto i = static_cast<int>(begin % counts[1]);
        const auto j = static_cast<int>(begin / counts[1] % counts[2]);
        const auto k = static_cast<int>(begin / counts[1] / counts[2]);
        row({0, at(box_[1], counts[1] == 1 ? 0 : node(i, counts[1])),
             at(box_[2], counts[2] == 1 ? 0 : node(j, counts[2])),
             at(box_[3], counts[3] == 1 ? 0 : node(k, counts[3]))},
            first, std::span(coefficients_).subspan(static_cast<std::size_t>(begin) * n, n));
    });
    std::size_t stride = 1;
    for (std::size_t v = 0; v < most_variables; ++v) {
        const auto count = static_cast<std::size_t>(counts[v]);
        if (count > 1)
            for (std::size_t line = 0; line < coefficients_.size() / count; ++line)
                transform_line(coefficients_, line / stride * stride * count + line % stride, stride,
                               counts[v]);
        stride *= count;
    }
}

// The worst places are between the nodes: along the first variable at the extrema of the next polynomial, the
// ends included; along the others at both ends and between.
void ChebyshevBox::measure(const Row& row, double lowest) {
    const int count = counts_[0];
    std::vector<double> first;
    for (int i = 0; i <= count; ++i)
        first.push_back(at(box_[0], std::cos(constants::pi * i / count)));
    if (box_[0].is_point()) first.resize(1);
    std::array<std::vector<double>, most_variables> others;
    for (std::size_t v = 1; v < most_variables; ++v) {
        others[v] = {at(box_[v], -1)};
        if (!box_[v].is_point()) others[v] = {at(box_[v], -1), at(box_[v], 0.13), at(box_[v], 0.97)};
    }
    std::vector<double> exact(first.size());
    worst_error_ = 0;
    for (const double z : others[3])
        for (const double y : others[2])
            for (const double x : others[1]) {
                row({0, x, y, z}, first, exact);
                for (std::size_t i = 0; i < first.size(); ++i)
                    if (exact[i] > lowest)
                        worst_error_ =
                            std::max(worst_error_, std::abs(value({first[i], x, y, z}) - exact[i]));
            }
}

// Drops the highest polynomials of the first variable, as many as together stay below the tolerance.
void ChebyshevBox::trim(double tolerance) {
    const auto count = static_cast<std::size_t>(counts_[0]);
    const std::size_t lines = coefficients_.size() / count;
    std::size_t keep = count;
    double dropped = 0;
    while (keep > 1) {
        double largest = 0;
        for (std::size_t line = 0; line < lines; ++line)
            largest = std::max(largest, std::abs(coefficients_[line * count + keep - 1]));
        dropped += largest * static_cast<double>(std::min<std::size_t>(lines, 4));
        if (dropped > tolerance) break;
        --keep;
    }
    std::vector<double> kept;
    kept.reserve(lines * keep);
    for (std::size_t line = 0; line < lines; ++line)
        kept.insert(kept.end(), coefficients_.begin() + static_cast<std::ptrdiff_t>(line * count),
                    coefficients_.begin() + static_cast<std::ptrdiff_t>(line * count + keep));
    coefficients_ = std::move(kept);
    counts_[0] = static_cast<int>(keep);
}

double ChebyshevBox::scaled(std::size_t variable, double value) const {
    const Interval& range = box_[variable];
    if (range.is_point()) return 0;
    const double t = (value - 0.5 * (range.low + range.high)) * (2 / (range.high - range.low));
    return std::clamp(t, -1.0, 1.0);
}

void ChebyshevBox::contract(const Place& place, std::span<double> out) const {
    std::fill(out.begin(), out.end(), 0.0);
    std::array<std::array<double, 25>, most_variables> t{};
    for (std::size_t v = 1; v < most_variables; ++v) {
        const double x = scaled(v, place[v]);
        t[v][0] = 1;
        t[v][1] = x;
        for (std::size_t k = 2; k < static_cast<std::size_t>(counts_[v]); ++k)
            t[v][k] = 2 * x * t[v][k - 1] - t[v][k - 2];
    }
    const double* c = coefficients_.data();
    for (std::size_t k = 0; k < static_cast<std::size_t>(counts_[3]); ++k)
        for (std::size_t j = 0; j < static_cast<std::size_t>(counts_[2]); ++j)
            for (std::size_t i = 0; i < static_cast<std::size_t>(counts_[1]); ++i, c += counts_[0]) {
                const double weight = t[1][i] * t[2][j] * t[3][k];
                for (std::size_t m = 0; m < out.size(); ++m)
                    out[m] += weight * c[m];
            }
}

double ChebyshevBox::value(const Place& place) const {
    return value_and_slope(place).value;
}

ChebyshevBox::ValueAndSlope ChebyshevBox::value_and_slope(const Place& place) const {
    std::array<double, highest_count> buffer{};
    const std::span<double> c(buffer.data(), static_cast<std::size_t>(counts_[0]));
    contract(place, c);
    const double t = scaled(0, place[0]);
    // Clenshaw's sums of T_k and of T_k' = k U_(k-1).
    double a = 0;
    double b = 0;
    double da = 0;
    double db = 0;
    for (std::size_t k = c.size() - 1; k > 0; --k) {
        const double next = 2 * t * a - b + c[k];
        b = a;
        a = next;
        const double slope = 2 * t * da - db + static_cast<double>(k) * c[k];
        db = da;
        da = slope;
    }
    const double width = box_[0].high - box_[0].low;
    return {t * a - b + c[0], width > 0 ? da * 2 / width : 0};
}

void ChebyshevBox::evaluate_first(std::span<const double> first, std::span<double> out) const {
    FOREGLOW_EXPECTS(is_curve());
    const Interval& range = box_[0];
    const double scale = range.is_point() ? 0 : 2 / (range.high - range.low);
    sum_series(coefficients_, 0.5 * (range.low + range.high), scale, first, out);
}

}  // namespace foreglow
