// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

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

/// What the first component taught: how many refinements the others need, and what error remains.
struct TransformState {
    bool measured = false;
    int iterations = 0;
    double relative_error = 0;
    double worst_cl_ratio = 0;
    bool converged = true;
};

/// Chooses how component maps are analysed, so that what the transforms leave stays below a tolerance.
///
/// Each analysis begins with ring weights. The first component is refined until the estimated error, weighted
/// with the widest beam, is below the tolerance and the error's C_l is below 1e-4 of the map's wherever B_l^2
/// > 1e-3; since all components are the same sky under nearby spectra and the transforms are linear, the
/// others get as many refinements as it needed.
class TransformPlan {
  public:
    TransformPlan(const HealpixGrid& grid, int lmax, double tolerance, std::vector<double> temperature_window,
                  std::vector<double> polarization_window);

    [[nodiscard]] Alm analyse(std::span<const double> map, TransformState& state) const;
    [[nodiscard]] AlmEB analyse_spin2(std::span<const double> q, std::span<const double> u,
                                      TransformState& state) const;

  private:
    HealpixGrid grid_;
    int lmax_;
    double tolerance_;
    std::vector<double> temperature_window_, polarization_window_;
    RingWeights weights_;
};

}  // namespace foreglow
