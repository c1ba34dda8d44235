// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/point_values.h"

#include <algorithm>
#include <cmath>

#include "base/error.h"
#include "base/parallel.h"
#include "base/vector_width.h"
#include "math/vector_exp.h"
#include "physics/spectral_law.h"
#include "sphere/sky_map.h"

namespace foreglow {
namespace {

constexpr std::int64_t block = 8192;

using Span = std::span<double>;
using ConstSpan = std::span<const double>;

// The number of a pixel of unit amplitude at one frequency, exp((beta + c L) L) times the weight.
FOREGLOW_WIDE void evaluate_frequency(double log_ratio, double weight, ConstSpan index, ConstSpan curvature,
                                      Span out) {
    for (std::size_t i = 0; i < out.size(); ++i)
        out[i] = weight * vector_exp((index[i] + curvature[i] * log_ratio) * log_ratio);
}

FOREGLOW_WIDE void add_frequency(double log_ratio, double weight, ConstSpan index, ConstSpan curvature,
                                 Span out) {
    for (std::size_t i = 0; i < out.size(); ++i)
        out[i] += weight * vector_exp((index[i] + curvature[i] * log_ratio) * log_ratio);
}

FOREGLOW_WIDE void multiply(ConstSpan amplitude, ConstSpan factor, Span out) {
    for (std::size_t i = 0; i < out.size(); ++i)
        out[i] = amplitude[i] * factor[i];
}

FOREGLOW_WIDE void derive(double log_ratio, ConstSpan reference, ConstSpan curvature, Span index,
                          Span slope) {
    for (std::size_t i = 0; i < index.size(); ++i) {
        index[i] = reference[i] + 2 * curvature[i] * log_ratio;
        slope[i] = -3 - 2 * index[i];
    }
}

void evaluate_band(const BandSum& band, Frequency reference, ConstSpan index, ConstSpan curvature, Span out) {
    for (std::size_t k = 0; k < band.hz.size(); ++k)
        (k == 0 ? evaluate_frequency : add_frequency)(std::log(band.hz[k] / reference.hz()), band.weights[k],
                                                      index, curvature, out);
}

/// Works on pixels begin..end of all columns.
class Piece {
  public:
    Piece(std::int64_t begin, std::int64_t end)
        : first_(static_cast<std::size_t>(begin)), count_(static_cast<std::size_t>(end - begin)) {}
    [[nodiscard]] ConstSpan of(const std::vector<double>& column) const {
        return ConstSpan(column).subspan(first_, count_);
    }
    [[nodiscard]] Span of(std::vector<double>& column) const { return Span(column).subspan(first_, count_); }
    [[nodiscard]] std::size_t size() const { return count_; }

  private:
    std::size_t first_, count_;
};

/// Sums of one group.
struct Sums {
    double origin = 0;  // the first value: sums of differences from it lose fewer digits
    double weight = 0, brightness = 0, squares = 0;
    double by_brightness = 0, index = 0, second = 0, slope = 0;
    double amplitude = 0, reference = 0;
    double stokes_weight = 0, q = 0, u = 0;
    std::int64_t defined = 0;
};

double value_of(const std::vector<double>& column, std::size_t i, double otherwise) {
    return column.empty() ? otherwise : column[i];
}

void add_pixel(Sums& sums, const PointValues& values, std::size_t i, double w) {
    const bool has_brightness = !values.brightness.empty();
    const double main = has_brightness ? values.brightness[i] : value_of(values.index, i, undefined_pixel);
    if (!is_defined(main)) return;
    if (sums.defined == 0) sums.origin = main;
    ++sums.defined;
    const double difference = main - sums.origin;
    sums.weight += w;
    sums.brightness += w * difference;
    sums.squares += w * difference * difference;
    const double t = has_brightness ? w * main : w;
    if (!values.index.empty() && is_defined(values.index[i])) {
        const double beta = values.index[i];
        sums.by_brightness += t;
        sums.index += t * beta;
        sums.slope += t * value_of(values.electron_slope, i, 0);
        sums.second += t * (value_of(values.curvature, i, 0) + (has_brightness ? 0.5 * beta * beta : 0.0));
    }
    if (!values.index_reference.empty() && is_defined(values.index_reference[i])) {
        const double a = w * value_of(values.amplitude, i, 1);
        sums.amplitude += a;
        sums.reference += a * values.index_reference[i];
    }
    if (!values.q.empty() && is_defined(values.q[i]) && is_defined(values.u[i])) {
        sums.stokes_weight += w;
        sums.q += w * values.q[i];
        sums.u += w * values.u[i];
    }
}

void set(std::vector<double>& column, std::size_t row, double value) {
    if (!column.empty()) column[row] = value;
}

void finish_row(const Sums& sums, std::size_t row, GroupedValues& out) {
    PointValues& values = out.values;
    out.defined[row] = sums.defined;
    const bool any = sums.weight > 0;
    const double offset = any ? sums.brightness / sums.weight : undefined_pixel;
    out.scatter[row] =
        any ? std::sqrt(std::max(0.0, sums.squares / sums.weight - offset * offset)) : undefined_pixel;
    const bool has_brightness = !values.brightness.empty();
    set(values.brightness, row, sums.origin + offset);
    const bool has_index = sums.by_brightness > 0;
    const double index = has_index ? sums.index / sums.by_brightness : undefined_pixel;
    const double square = has_brightness ? 0.5 * index * index : 0.0;
    set(values.index, row, index);
    set(values.curvature, row, has_index ? sums.second / sums.by_brightness - square : undefined_pixel);
    set(values.electron_slope, row, has_index ? sums.slope / sums.by_brightness : undefined_pixel);
    set(values.index_reference, row, sums.amplitude > 0 ? sums.reference / sums.amplitude : undefined_pixel);
    set(values.q, row, sums.stokes_weight > 0 ? sums.q / sums.stokes_weight : undefined_pixel);
    set(values.u, row, sums.stokes_weight > 0 ? sums.u / sums.stokes_weight : undefined_pixel);
}

GroupedValues make_empty(const PointValues& values, std::size_t rows) {
    GroupedValues out;
    const auto like = [rows](const std::vector<double>& column) {
        return std::vector<double>(column.empty() ? 0 : rows);
    };
    out.values = {
        like(values.brightness),      like(values.amplitude),      like(values.index), like(values.curvature),
        like(values.index_reference), like(values.electron_slope), like(values.q),     like(values.u)};
    out.scatter.resize(rows);
    out.defined.resize(rows);
    return out;
}

}  // namespace

PointValues make_point_values(const SkyStrip& strip, Frequency reference, Frequency polarized_reference,
                              const BandSum& band, Frequency at) {
    const std::size_t n = strip.intensity.size();
    const bool polarized = !strip.q.empty();
    const bool shares = strip.polarized_index.empty();
    const double log_ratio = log_frequency_ratio(at, reference);
    PointValues out;
    for (auto* column : {&out.brightness, &out.index, &out.electron_slope})
        column->resize(n);
    out.amplitude = strip.intensity;
    out.curvature = strip.curvature;
    out.index_reference = strip.index;
    out.q.resize(polarized ? n : 0);
    out.u.resize(polarized ? n : 0);
    parallel_for_blocks(static_cast<std::int64_t>(n), block, [&](std::int64_t begin, std::int64_t end) {
        const Piece piece(begin, end);
        std::vector<double> factor(piece.size());
        evaluate_band(band, reference, piece.of(strip.index), piece.of(strip.curvature), factor);
        multiply(piece.of(strip.intensity), factor, piece.of(out.brightness));
        derive(log_ratio, piece.of(strip.index), piece.of(strip.curvature), piece.of(out.index),
               piece.of(out.electron_slope));
        if (!polarized) return;
        if (!shares)
            evaluate_band(band, polarized_reference, piece.of(strip.index_of_polarization()),
                          piece.of(strip.curvature_of_polarization()), factor);
        multiply(piece.of(strip.q), factor, piece.of(out.q));
        multiply(piece.of(strip.u), factor, piece.of(out.u));
    });
    return out;
}

std::vector<double> make_curved_factors(ConstSpan index, ConstSpan curvature, Frequency reference,
                                        const BandSum& band) {
    std::vector<double> factors(index.size());
    evaluate_band(band, reference, index, curvature, factors);
    return factors;
}

GroupedValues take_means(PointValues values, const PixelGroups& groups) {
    const std::size_t rows = groups.rows();
    if (groups.first.empty()) {
        GroupedValues out;
        out.values = std::move(values);
        return out;
    }
    GroupedValues out = make_empty(values, rows);
    for (std::size_t row = 0; row < rows; ++row) {
        Sums sums;
        for (std::size_t i = groups.first[row]; i < groups.first[row + 1]; ++i)
            add_pixel(sums, values, i, groups.weights.empty() ? 1.0 : groups.weights[i]);
        finish_row(sums, row, out);
    }
    return out;
}

void turn_stokes(PointValues& values, std::span<const StokesTurn> turns) {
    FOREGLOW_EXPECTS(values.q.empty() || values.q.size() == turns.size());
    for (std::size_t i = 0; i < values.q.size(); ++i)
        apply(turns[i], values.q[i], values.u[i]);
}

}  // namespace foreglow
