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

/// Returns the largest window of any channel at each l.
[[nodiscard]] BeamWindow widest_window(std::span<const Channel> channels, const HarmonicOptions& options);

/// The grid, weights and tolerance that all component maps of a study are analysed with.
struct TransformPlan {
    TransformPlan(const HealpixGrid& grid, int lmax, double tolerance, std::vector<double> temperature_window,
                  std::vector<double> polarization_window);

    HealpixGrid grid;
    int lmax;
    double tolerance;
    std::array<std::vector<double>, 2> windows;  ///< of the widest beam: intensity, polarization
    RingWeights weights;
};

}  // namespace foreglow
