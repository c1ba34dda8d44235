// SPDX-License-Identifier: GPL-2.0-or-later
#include "physics/electron_band.h"

#include <algorithm>
#include <array>
#include <cmath>

#include "base/constants.h"
#include "base/error.h"
#include "physics/spectral_law.h"

namespace foreglow {
namespace {

constexpr double faintest = -60;  // ln of values that no map can show
constexpr double never = -1e300;

Interval log_of(const Interval& range) {
    if (!(range.low > 0)) return {0, 0};
    return {std::log(range.low), std::log(range.high)};
}

FOREGLOW_WIDE void exponentiate(std::span<double> values) {
    for (double& value : values) {
        const double bounded = value < -690 ? -690 : value;
        value = vector_exp(bounded > 690 ? 690 : bounded);
    }
}
FOREGLOW_WIDE void exponentiate_single(std::span<double> values) {
    for (double& value : values) {
        const double bounded = value < -690 ? -690 : value;
        value = vector_exp<ExpPrecision::Single>(bounded > 690 ? 690 : bounded);
    }
}

/// ln of a band's sum of T ~ j/nu^2 as a function of slope, from integrals at Chebyshev points in ln nu.
class BandIntegral {
  public:
    BandIntegral(const ElectronLaw& law, const BandSum& band, EmissionPart part) {
        const auto [low, high] = std::minmax_element(band.hz.begin(), band.hz.end());
        const double width = std::log(*high / *low);
        const std::size_t points = width < 0.3 ? 8 : width < 0.8 ? 12 : 20;
        if (band.hz.size() <= points || width > 3) {
            for (std::size_t b = 0; b < band.hz.size(); ++b)
                integrals_.emplace_back(law, Frequency::from_hz(band.hz[b]), part);
        } else {
            std::vector<double> nodes;
            nodes.reserve(points);
            for (std::size_t k = 0; k < points; ++k) {
                const double t =
                    std::cos(constants::pi * (static_cast<double>(k) + 0.5) / static_cast<double>(points));
                nodes.push_back(std::log(*low) + 0.5 * width * (1 + t));
                integrals_.emplace_back(law, Frequency::from_hz(std::exp(nodes.back())), part);
            }
            for (const double hz : band.hz)
                for (std::size_t k = 0; k < points; ++k) {
                    double weight = 1;
                    for (std::size_t j = 0; j < points; ++j)
                        if (j != k) weight *= (std::log(hz) - nodes[j]) / (nodes[k] - nodes[j]);
                    interpolation_.push_back(weight);
                }
        }
        for (std::size_t b = 0; b < band.hz.size(); ++b)
            weights_.push_back(band.weights[b] / (band.hz[b] * band.hz[b]));
    }

    [[nodiscard]] double log_value(double slope) const {
        std::vector<double> logs;
        logs.reserve(integrals_.size());
        for (const ElectronIntegral& integral : integrals_)
            logs.push_back(integral.log_value(slope));
        const double highest = *std::max_element(logs.begin(), logs.end());
        double sum = 0;
        for (std::size_t b = 0; b < weights_.size(); ++b) {
            double log = interpolation_.empty() ? logs[b] : 0;
            if (!interpolation_.empty())
                for (std::size_t k = 0; k < logs.size(); ++k)
                    log += interpolation_[b * logs.size() + k] * logs[k];
            sum += weights_[b] * std::exp(log - highest);
        }
        return std::log(sum) + highest;
    }

  private:
    std::vector<ElectronIntegral> integrals_;
    std::vector<double> interpolation_, weights_;  // [band][points], [band]
};

}  // namespace

ElectronLaw with_pixel(const ElectronLaw& law, const ElectronPixel& pixel) {
    ElectronLaw own = law;
    own.field_uG = pixel.field_uG;
    if (own.energy_break) own.energy_break->energy_GeV = pixel.break_GeV;
    if (own.cutoff) own.cutoff->energy_GeV = pixel.cutoff_GeV;
    return own;
}

double exact_electron_band_value(const ElectronLaw& law, double slope, const BandSum& band,
                                 Frequency reference, EmissionPart part) {
    double sum = 0;
    for (std::size_t b = 0; b < band.hz.size(); ++b)
        sum += band.weights[b] *
               std::exp(log_electron_ratio(law, slope, Frequency::from_hz(band.hz[b]), reference, part));
    return sum;
}

ElectronBox::ElectronBox(const ElectronLaw& law, const ElectronRange& range, const Row& row, double tolerance,
                         double lowest)
    : box_(
          {range.slope, log_of(range.field_uG), log_of(range.break_GeV), log_of(range.cutoff_GeV)},
          [&](const ChebyshevBox::Place& place, std::span<const double> slopes, std::span<double> out) {
              row(with_pixel(law, {0, std::exp(place[1]), std::exp(place[2]), std::exp(place[3])}), slopes,
                  out);
          },
          tolerance, lowest) {}

ChebyshevBox::Place ElectronBox::place(const ElectronColumns& columns, std::size_t i) const {
    const auto log_at = [i](std::span<const double> column) {
        return column.empty() ? 0.0 : std::log(column[i]);
    };
    return {columns.slope.empty() ? 0 : columns.slope[i], log_at(columns.field_uG), log_at(columns.break_GeV),
            log_at(columns.cutoff_GeV)};
}

void ElectronBox::evaluate(const ElectronColumns& columns, std::span<double> out) const {
    if (box_.is_curve()) {
        box_.evaluate_first(columns.slope, out);
        return;
    }
    for (std::size_t i = 0; i < out.size(); ++i) {
        const ChebyshevBox::Place where = place(columns, i);
        out[i] = box_.value(where) + 0 * (where[0] + where[1] + where[2] + where[3]);
    }
}

ElectronBandLaw::ElectronBandLaw(const ElectronLaw& law, const BandSum& band, Frequency reference,
                                 const ElectronRange& range, EmissionPart part, double tolerance)
    : logarithm_(
          law, range,
          [&](const ElectronLaw& own, std::span<const double> slopes, std::span<double> out) {
              const BandIntegral above(own, band, part);
              const ElectronIntegral below(own, reference, part);
              const double square = 2 * std::log(reference.hz());
              for (std::size_t i = 0; i < slopes.size(); ++i)
                  out[i] = above.log_value(slopes[i]) - below.log_value(slopes[i]) + square;
          },
          tolerance, faintest) {}

void ElectronBandLaw::evaluate(const ElectronColumns& columns, std::span<double> out,
                               ExpPrecision precision) const {
    logarithm_.evaluate(columns, out);
    if (precision == ExpPrecision::Single)
        exponentiate_single(out);
    else
        exponentiate(out);
}

ElectronShape::ElectronShape(const ElectronLaw& law, ElectronRange range, const Interval& indices,
                             const IndexDefinition& definition, Frequency reference)
    : range_(range), limits_(slope_limits(law)) {
    // The slopes of the lowest and highest index, where field, break and cut-off are at their ends and
    // middle.
    Interval slopes{limits_.high, limits_.low};
    const auto three = [](const Interval& values) {
        return values.is_point()
                   ? std::vector<double>{values.low}
                   : std::vector<double>{values.low, std::sqrt(values.low * values.high), values.high};
    };
    for (const double field : three(range.field_uG))
        for (const double energy_break : three(range.break_GeV))
            for (const double cutoff : three(range.cutoff_GeV)) {
                const IndexOfSlope map(with_pixel(law, {0, field, energy_break, cutoff}), definition);
                slopes.low = std::min(slopes.low, map.find(indices.high).value);
                slopes.high = std::max(slopes.high, map.find(indices.low).value);
            }
    // A little wider, so that rounding at the ends does not clamp; more where the middle may bulge.
    const bool uniform =
        range.field_uG.is_point() && range.break_GeV.is_point() && range.cutoff_GeV.is_point();
    const double margin = uniform ? (indices.is_point() ? 0 : 1e-9) : 0.05;
    range_.slope = {std::max(limits_.low, slopes.low - margin), std::min(limits_.high, slopes.high + margin)};
    constexpr double tolerance = 1e-9;
    defined_index_ = ElectronBox(
        law, range_,
        [&](const ElectronLaw& own, std::span<const double> s, std::span<double> out) {
            const IndexOfSlope map(own, definition);
            for (std::size_t i = 0; i < s.size(); ++i)
                out[i] = map.value(s[i]);
        },
        tolerance, never);
    const auto local = [&](bool curvature) {
        return
            [reference, curvature](const ElectronLaw& own, std::span<const double> s, std::span<double> out) {
                const ElectronIntegral total(own, reference, EmissionPart::Total);
                const ElectronIntegral first(own, reference, EmissionPart::TotalFirst);
                const ElectronIntegral second(own, reference, EmissionPart::TotalSecond);
                for (std::size_t i = 0; i < s.size(); ++i) {
                    const double t = total.value(s[i]);
                    const double d = first.value(s[i]) / t;
                    out[i] = curvature ? 0.5 * (second.value(s[i]) / t - d * d) : d - 2;
                }
            };
    };
    index_ = ElectronBox(law, range_, local(false), tolerance, never);
    curvature_ = ElectronBox(law, range_, local(true), tolerance, never);
}

std::int64_t ElectronShape::find_slopes(std::span<double> indices, const ElectronColumns& columns) const {
    const ChebyshevBox& box = defined_index_.box();
    const Interval& slopes = box.interval(0);
    std::int64_t clamped = 0;
    for (std::size_t i = 0; i < indices.size(); ++i) {
        ChebyshevBox::Place place =
            defined_index_.place({{}, columns.field_uG, columns.break_GeV, columns.cutoff_GeV}, i);
        const double index = indices[i] + 0 * (place[1] + place[2] + place[3]);
        if (std::isnan(index)) {
            indices[i] = index;
            continue;
        }
        double low = slopes.low;
        double high = slopes.high;
        double s = std::clamp(-3 - 2 * index, low, high);
        bool converged = low == high;
        for (int step = 0; step < 60 && !converged; ++step) {
            place[0] = s;
            const auto [value, slope] = box.value_and_slope(place);
            const double miss = value - index;  // falls with s
            (miss > 0 ? low : high) = s;
            double next = s - miss / slope;
            if (!(next > low && next < high)) next = 0.5 * (low + high);
            converged = std::abs(next - s) < 1e-13 * s || high - low < 1e-13;
            s = next;
        }
        const auto beyond = [&](double end, double sign) {
            place[0] = end;
            return s == end || std::abs(s - end) < 1e-6 ? sign * (index - box.value(place)) > 1e-7 : false;
        };
        if ((slopes.low <= limits_.low && beyond(limits_.low, 1)) ||
            (slopes.high >= limits_.high && beyond(limits_.high, -1))) {
            ++clamped;
            s = s < 0.5 * (limits_.low + limits_.high) ? limits_.low : limits_.high;
        }
        indices[i] = s;
    }
    return clamped;
}

void ElectronShape::write_local(const ElectronColumns& columns, std::span<double> index,
                                std::span<double> curvature) const {
    index_.evaluate(columns, index);
    curvature_.evaluate(columns, curvature);
}

}  // namespace foreglow
