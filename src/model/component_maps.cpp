// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/component_maps.h"

#include <algorithm>

#include "base/interrupt.h"
#include "base/parallel.h"

namespace foreglow {
namespace {

constexpr std::int64_t strip_pixels = std::int64_t{1} << 22;
constexpr std::int64_t block = 4096;

// Writes amplitude times the law's factor into a full map.
void scale_into(const RingStrip& strip, const HealpixGrid& grid, const BandFactor& law,
                const LawColumns& columns, std::span<const std::span<const double>> amplitudes,
                std::span<std::vector<double>* const> maps) {
    for (const PixelRange& range : pixel_ranges(grid, strip))
        parallel_for_blocks(range.count, block, [&](std::int64_t begin, std::int64_t end) {
            const auto n = static_cast<std::size_t>(end - begin);
            const auto from = static_cast<std::size_t>(range.offset + begin);
            const auto to = static_cast<std::size_t>(range.first_pixel + begin);
            std::vector<double> factor(n);
            law.evaluate(columns.part(from, n), factor);
            for (std::size_t a = 0; a < amplitudes.size(); ++a)
                for (std::size_t i = 0; i < n; ++i)
                    (*maps[a])[to + i] = amplitudes[a][from + i] * factor[i];
        });
}

void append_every(std::vector<double>& to, const std::vector<double>& from,
                  const std::vector<std::size_t>& places) {
    if (from.empty()) return;
    for (const std::size_t place : places)
        to.push_back(from[place]);
}

}  // namespace

void for_each_sky_strip(const SkyModel& sky, bool with_polarization,
                        const std::function<void(const RingStrip&, const SkyStrip&)>& work) {
    for (const RingStrip& strip : cut_into_strips(sky.grid, strip_pixels)) {
        check_interrupt();
        work(strip, make_sky_strip(sky, strip, with_polarization));
    }
}

SpectralBasis make_intensity_basis(const SkyModel& sky, const std::vector<BandSum>& channels,
                                   double tolerance) {
    if (sky.nodes) return make_node_basis(*sky.nodes, channels);
    return make_spectral_basis(channels, intensity_law(sky), tolerance);
}

SpectralBasis make_polarized_basis(const SkyModel& sky, const std::vector<BandSum>& channels,
                                   double tolerance) {
    if (sky.nodes) return make_polarized_node_basis(*sky.nodes, channels);
    return make_spectral_basis(channels, polarized_law(sky), tolerance);
}

std::vector<double> make_intensity_component(const SkyModel& sky, const BandSum& component) {
    if (sky.nodes) return sky.nodes->i[place_of_component(*sky.nodes, component, false)];
    const BandFactor law(intensity_law(sky), component, component_tolerance);
    std::vector<double> map(static_cast<std::size_t>(sky.grid.npix()));
    for_each_sky_strip(sky, false, [&](const RingStrip& strip, const SkyStrip& values) {
        const std::span<const double> amplitude = values.intensity;
        std::vector<double>* const target = &map;
        scale_into(strip, sky.grid, law, values.intensity_columns(), {&amplitude, 1}, {&target, 1});
    });
    return map;
}

StokesComponent make_polarized_component(const SkyModel& sky, const BandSum& component) {
    if (sky.nodes) {
        const NodeSky& nodes = *sky.nodes;
        const std::size_t k = place_of_component(nodes, component, true);
        return nodes.q.empty() ? StokesComponent{nodes.band_q[k], nodes.band_u[k]}
                               : StokesComponent{nodes.q[k], nodes.u[k]};
    }
    const BandFactor law(polarized_law(sky), component, component_tolerance);
    StokesComponent maps;
    maps.q.resize(static_cast<std::size_t>(sky.grid.npix()));
    maps.u.resize(maps.q.size());
    for_each_sky_strip(sky, true, [&](const RingStrip& strip, const SkyStrip& values) {
        const std::array<std::span<const double>, 2> amplitudes{values.q, values.u};
        const std::array<std::vector<double>*, 2> targets{&maps.q, &maps.u};
        scale_into(strip, sky.grid, law, values.polarized_columns(), amplitudes, targets);
    });
    return maps;
}

SkySample make_sky_sample(const SkyModel& sky, std::int64_t count, bool with_polarization) {
    const std::int64_t step = std::max<std::int64_t>(1, sky.grid.npix() / count);
    SkySample sample;
    for_each_sky_strip(sky, with_polarization, [&](const RingStrip& strip, const SkyStrip& values) {
        std::vector<std::size_t> places;
        for (const PixelRange& range : pixel_ranges(sky.grid, strip)) {
            const std::int64_t first = (range.first_pixel + step - 1) / step * step;
            for (std::int64_t p = first; p < range.first_pixel + range.count; p += step) {
                places.push_back(static_cast<std::size_t>(range.offset + p - range.first_pixel));
                sample.directions.push_back(sky.grid.direction(p));
            }
        }
        append_every(sample.values.intensity, values.intensity, places);
        append_every(sample.values.index, values.index, places);
        append_every(sample.values.curvature, values.curvature, places);
        append_every(sample.values.slope, values.slope, places);
        append_every(sample.values.field, values.field, places);
        append_every(sample.values.break_energy, values.break_energy, places);
        append_every(sample.values.cutoff_energy, values.cutoff_energy, places);
        append_every(sample.values.q, values.q, places);
        append_every(sample.values.u, values.u, places);
        append_every(sample.values.polarized_index, values.polarized_index, places);
        append_every(sample.values.polarized_curvature, values.polarized_curvature, places);
    });
    return sample;
}

}  // namespace foreglow
