// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/transform_plan.h"

#include <algorithm>
#include <cmath>
#include <numeric>

namespace foreglow {
namespace {

constexpr std::size_t most_windows = 32;

BeamWindow unit_window(int lmax) {
    return make_gaussian_beam(Angle(), lmax);
}

}  // namespace

BeamWindow channel_window(const Channel& channel, const HarmonicOptions& options) {
    BeamWindow window = channel.beam ? *channel.beam : unit_window(options.lmax);
    if (options.pixel_window) window = product(window, *options.pixel_window);
    return window;
}

std::array<WindowSet, 2> collect_windows(std::span<const BeamWindow> windows) {
    std::array<WindowSet, 2> sets;
    for (std::size_t kind = 0; kind < sets.size(); ++kind) {
        WindowSet& set = sets[kind];
        for (const BeamWindow& window : windows) {
            const auto& values = kind == 0 ? window.temperature : window.polarization;
            set.widest.resize(values.size(), 0.0);
            for (std::size_t l = 0; l < values.size(); ++l)
                set.widest[l] = std::max(set.widest[l], std::abs(values[l]));
            set.all.push_back(values);
        }
        // Narrow beams after wide ones, so that every n-th keeps both ends.
        std::sort(set.all.begin(), set.all.end(), [](const auto& a, const auto& b) {
            const double in_a = std::inner_product(a.begin(), a.end(), a.begin(), 0.0);
            const double in_b = std::inner_product(b.begin(), b.end(), b.begin(), 0.0);
            return in_a != in_b ? in_a < in_b : a < b;
        });
        set.all.erase(std::unique(set.all.begin(), set.all.end()), set.all.end());
        if (set.all.size() <= most_windows) continue;
        std::vector<std::vector<double>> some;
        some.reserve(most_windows);
        for (std::size_t k = 0; k < most_windows; ++k)
            some.push_back(set.all[k * (set.all.size() - 1) / (most_windows - 1)]);
        set.all = std::move(some);
    }
    return sets;
}

TransformPlan::TransformPlan(const HealpixGrid& grid_in, int lmax_in, double tolerance_in,
                             std::array<WindowSet, 2> windows_in)
    : grid(grid_in),
      lmax(lmax_in),
      tolerance(tolerance_in),
      windows(std::move(windows_in)),
      weights(make_ring_weights(grid.nside(), std::min(2 * lmax, 3 * grid.nside() - 1))) {}

}  // namespace foreglow
