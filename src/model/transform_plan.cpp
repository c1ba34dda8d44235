// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/transform_plan.h"

#include <algorithm>
#include <cmath>

namespace foreglow {
namespace {

BeamWindow unit_window(int lmax) {
    return make_gaussian_beam(Angle(), lmax);
}

}  // namespace

BeamWindow channel_window(const Channel& channel, const HarmonicOptions& options) {
    BeamWindow window = channel.beam ? *channel.beam : unit_window(options.lmax);
    if (options.pixel_window) window = product(window, *options.pixel_window);
    return window;
}

BeamWindow widest_window(std::span<const Channel> channels, const HarmonicOptions& options) {
    const auto rows = static_cast<std::size_t>(options.lmax) + 1;
    BeamWindow widest{std::vector<double>(rows, 0.0), std::vector<double>(rows, 0.0)};
    for (const Channel& channel : channels) {
        const BeamWindow window = channel_window(channel, options);
        for (std::size_t l = 0; l < widest.temperature.size(); ++l) {
            widest.temperature[l] = std::max(widest.temperature[l], std::abs(window.temperature[l]));
            widest.polarization[l] = std::max(widest.polarization[l], std::abs(window.polarization[l]));
        }
    }
    return widest;
}

TransformPlan::TransformPlan(const HealpixGrid& grid_in, int lmax_in, double tolerance_in,
                             std::vector<double> temperature_window, std::vector<double> polarization_window)
    : grid(grid_in),
      lmax(lmax_in),
      tolerance(tolerance_in),
      windows{std::move(temperature_window), std::move(polarization_window)},
      weights(make_ring_weights(grid.nside(), std::min(2 * lmax, 3 * grid.nside() - 1))) {}

}  // namespace foreglow
