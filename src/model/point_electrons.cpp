// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/point_electrons.h"

#include <algorithm>
#include <cmath>

#include "base/parallel.h"
#include "model/spectral_stencil.h"
#include "sphere/sky_map.h"

namespace foreglow {
namespace {

constexpr std::int64_t block = 4096;
constexpr double tolerance = 1e-10;
constexpr double stencil_step = 0.05;

// The bounds of a column's defined values; of an empty one its single value.
Interval bounds(const std::vector<double>& column, double otherwise) {
    Interval range{otherwise, otherwise};
    bool any = false;
    for (const double value : column) {
        if (!is_defined(value)) continue;
        range =
            any ? Interval{std::min(range.low, value), std::max(range.high, value)} : Interval{value, value};
        any = true;
    }
    return range;
}

ElectronRange range_of(const ElectronLaw& law, const SkyStrip& strip) {
    ElectronRange range;
    range.slope = bounds(strip.slope, slope_limits(law).low);
    range.field_uG = bounds(strip.field, law.field_uG);
    if (law.energy_break) range.break_GeV = bounds(strip.break_energy, law.energy_break->energy_GeV);
    if (law.cutoff) range.cutoff_GeV = bounds(strip.cutoff_energy, law.cutoff->energy_GeV);
    return range;
}

// Calls work(first, count) for parts of n pixels, with threads.
template <class Work>
void for_each_part(std::size_t n, const Work& work) {
    parallel_for_blocks(static_cast<std::int64_t>(n), block, [&](std::int64_t begin, std::int64_t end) {
        work(static_cast<std::size_t>(begin), static_cast<std::size_t>(end - begin));
    });
}

}  // namespace

void find_point_slopes(const ElectronLaw& law, const IndexDefinition& definition, Frequency reference,
                       SkyStrip& strip) {
    strip.slope = std::move(strip.index);
    strip.index.clear();
    strip.curvature.clear();
    const bool any = std::any_of(strip.slope.begin(), strip.slope.end(), is_defined);
    if (!any) return;
    const ElectronShape shape(law, range_of(law, strip), bounds(strip.slope, 0), definition, reference);
    const LawColumns all{{}, {}, {{}, strip.field, strip.break_energy, strip.cutoff_energy}};
    for_each_part(strip.slope.size(), [&](std::size_t first, std::size_t count) {
        static_cast<void>(shape.find_slopes(std::span(strip.slope).subspan(first, count),
                                            all.part(first, count).electrons));
    });
}

std::vector<double> make_electron_factors(const ElectronLaw& law, EmissionPart part, const SkyStrip& strip,
                                          Frequency reference, const BandSum& band) {
    std::vector<double> factors(strip.slope.size());
    const BandFactor factor(ElectronSkyLaw{reference, law, range_of(law, strip), part}, band, tolerance);
    const LawColumns columns{{}, {}, strip.electrons()};
    for_each_part(factors.size(), [&](std::size_t first, std::size_t count) {
        factor.evaluate(columns.part(first, count), std::span(factors).subspan(first, count));
    });
    return factors;
}

LocalColumns make_local_electron_columns(const ElectronLaw& law, const SkyStrip& strip, Frequency at) {
    const SpectralStencil stencil(at, stencil_step);
    std::array<std::vector<double>, SpectralStencil::count> ratios;
    for (std::size_t k = 0; k < ratios.size(); ++k)
        ratios[k] =
            make_electron_factors(law, EmissionPart::Total, strip, at, {{stencil.frequency(k).hz()}, {1.0}});
    LocalColumns out;
    out.index.reserve(strip.slope.size());
    out.curvature.reserve(strip.slope.size());
    for (std::size_t i = 0; i < strip.slope.size(); ++i) {
        std::array<double, SpectralStencil::count> log_t{};
        for (std::size_t k = 0; k < log_t.size(); ++k)
            log_t[k] = std::log(ratios[k][i]);
        const bool good = std::all_of(log_t.begin(), log_t.end(), [](double y) { return std::isfinite(y); });
        out.index.push_back(good ? stencil.index(log_t) : undefined_pixel);
        out.curvature.push_back(good ? stencil.curvature(log_t) : undefined_pixel);
    }
    return out;
}

PointValues make_electron_values(const ElectronLaw& law, const SkyStrip& strip,
                                 const std::vector<double>& reference_index, Frequency reference,
                                 Frequency polarized_reference, const BandSum& band, Frequency at) {
    const auto product = [](const std::vector<double>& amplitude, const std::vector<double>& factors) {
        std::vector<double> out(amplitude.size());
        for (std::size_t i = 0; i < out.size(); ++i)
            out[i] = amplitude[i] * factors[i];
        return out;
    };
    PointValues out;
    out.amplitude = strip.intensity;
    out.brightness =
        product(strip.intensity, make_electron_factors(law, EmissionPart::Total, strip, reference, band));
    LocalColumns local = make_local_electron_columns(law, strip, at);
    out.index = std::move(local.index);
    out.curvature = std::move(local.curvature);
    out.index_reference = reference_index;
    out.electron_slope = strip.slope;
    if (strip.q.empty()) return out;
    const std::vector<double> factors =
        strip.polarized_index.empty()
            ? make_electron_factors(law, EmissionPart::Polarized, strip, polarized_reference, band)
            : make_curved_factors(strip.polarized_index, strip.polarized_curvature, polarized_reference,
                                  band);
    out.q = product(strip.q, factors);
    out.u = product(strip.u, factors);
    return out;
}

}  // namespace foreglow
