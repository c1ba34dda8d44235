// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <array>
#include <optional>
#include <span>
#include <vector>

#include "model/channel.h"
#include "sphere/alm.h"
#include "sphere/beam.h"
#include "sphere/ring_weights.h"

namespace foreglow {

/// What the channels of a harmonic route share.
struct HarmonicOptions {
    bool polarized = false;
    int lmax = 0;
    double accuracy = 1e-5;                  ///< rms(error)/rms(map) of each map, monopole and dipole removed
    std::optional<BeamWindow> pixel_window;  ///< multiplied in where there
    Frame frame = Frame::Galactic;           ///< of the maps that come out
};

/// Returns the beam times the pixel window of a channel, 1 where it has neither; [lmax + 1].
[[nodiscard]] BeamWindow channel_window(const Channel& channel, const HarmonicOptions& options);

/// The windows of a study's channels, of intensity or of polarization.
struct WindowSet {
    std::vector<std::vector<double>> all;  ///< [windows][lmax + 1]: each different one, or 32 of more
    std::vector<double> widest;            ///< the largest of any at each l, [lmax + 1]
};

/// Returns the windows of some channels: intensity, polarization.
[[nodiscard]] std::array<WindowSet, 2> collect_windows(std::span<const BeamWindow> windows);

/// The grid, weights and tolerance that all component maps of a study are analysed with.
struct TransformPlan {
    TransformPlan(const HealpixGrid& grid, int lmax, double tolerance, std::array<WindowSet, 2> windows);

    HealpixGrid grid;
    int lmax;
    double tolerance;
    std::array<WindowSet, 2> windows;  ///< intensity, polarization
    RingWeights weights;
};

}  // namespace foreglow
