// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/sky_region.h"

#include <algorithm>
#include <cmath>

#include "base/constants.h"
#include "base/error.h"
#include "base/parallel.h"
#include "sphere/sky_map.h"

namespace foreglow {
namespace {

constexpr double edge_width = 10 * constants::pi / 180;

double soft_edge(double sine_of_latitude, double cut) {
    const double beyond = std::asin(std::min(1.0, std::abs(sine_of_latitude))) - cut;
    if (beyond <= 0) return 0;
    return beyond >= edge_width ? 1.0 : 0.5 * (1 - std::cos(constants::pi * beyond / edge_width));
}

}  // namespace

std::vector<double> make_latitude_weights(const HealpixGrid& grid, Frame frame, Angle latitude_cut) {
    std::vector<double> weights(static_cast<std::size_t>(grid.npix()), 1.0);
    if (latitude_cut.radians() <= 0) return weights;
    const Vector3 pole = rotation_between(frame, Frame::Galactic)[2];
    parallel_for_blocks(grid.ring_count(), 16, [&](std::int64_t begin, std::int64_t end) {
        for (int r = static_cast<int>(begin); r < static_cast<int>(end); ++r) {
            const auto ring = grid.ring(r);
            const auto values = std::span(weights).subspan(static_cast<std::size_t>(ring.first_pixel),
                                                           static_cast<std::size_t>(ring.pixels));
            if (frame == Frame::Galactic) {
                std::fill(values.begin(), values.end(), soft_edge(ring.cos_theta, latitude_cut.radians()));
                continue;
            }
            std::vector<Vector3> directions(values.size());
            grid.directions(ring.first_pixel, directions);
            for (std::size_t i = 0; i < values.size(); ++i)
                values[i] = soft_edge(
                    directions[i][0] * pole[0] + directions[i][1] * pole[1] + directions[i][2] * pole[2],
                    latitude_cut.radians());
        }
    });
    return weights;
}

void exclude_undefined(std::span<double> weights, std::span<const double> values) {
    FOREGLOW_EXPECTS(weights.size() == values.size());
    for (std::size_t i = 0; i < values.size(); ++i)
        if (!is_defined(values[i])) weights[i] = 0;
}

RegionMoments region_moments(std::span<const double> weights) {
    RegionMoments moments;
    for (const double w : weights) {
        moments.mean_square += w * w;
        moments.mean_fourth += w * w * w * w;
    }
    moments.mean_square /= static_cast<double>(weights.size());
    moments.mean_fourth /= static_cast<double>(weights.size());
    return moments;
}

}  // namespace foreglow
