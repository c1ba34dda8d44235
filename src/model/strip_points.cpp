// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/strip_points.h"

#include <algorithm>
#include <array>
#include <numeric>

namespace foreglow {
namespace {

using Column = std::vector<double> SkyStrip::*;

constexpr std::array<Column, 7> columns{
    &SkyStrip::intensity, &SkyStrip::index,           &SkyStrip::curvature,          &SkyStrip::q,
    &SkyStrip::u,         &SkyStrip::polarized_index, &SkyStrip::polarized_curvature};

}  // namespace

std::vector<RingPlaces> sort_by_ring(const HealpixGrid& grid, std::span<const std::int64_t> pixels) {
    std::vector<int> rings(pixels.size());
    for (std::size_t i = 0; i < pixels.size(); ++i)
        rings[i] = grid.ring_of(pixels[i]);
    std::vector<std::size_t> order(pixels.size());
    std::iota(order.begin(), order.end(), std::size_t{0});
    std::stable_sort(order.begin(), order.end(),
                     [&](std::size_t a, std::size_t b) { return rings[a] < rings[b]; });
    std::vector<RingPlaces> out;
    for (const std::size_t place : order) {
        if (out.empty() || out.back().ring != rings[place]) out.push_back({rings[place], {}});
        out.back().places.push_back(place);
    }
    return out;
}

SkyStrip make_sky_points(const SkyModel& sky, std::span<const std::int64_t> pixels, bool with_polarization) {
    SkyStrip out;
    for (const RingPlaces& group : sort_by_ring(sky.grid, pixels)) {
        const std::int64_t first = sky.grid.ring(group.ring).first_pixel;
        const SkyStrip strip = make_sky_strip(sky, {group.ring, 1, false}, with_polarization);
        for (const Column column : columns) {
            if ((strip.*column).empty()) continue;
            (out.*column).resize(pixels.size());
            for (const std::size_t place : group.places)
                (out.*column)[place] = (strip.*column)[static_cast<std::size_t>(pixels[place] - first)];
        }
    }
    return out;
}

}  // namespace foreglow
