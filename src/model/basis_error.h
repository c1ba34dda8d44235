// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <vector>

#include "model/channel.h"
#include "model/sky_model.h"
#include "model/spectral_basis.h"

namespace foreglow {

/// What the low-rank form leaves of each channel: rms(error)/rms(map), the larger of I and (Q, U); monopole
/// and dipole of I removed.
struct BasisErrors {
    std::vector<double> relative;  ///< [channels]
};

/// Compares weighted component maps with the exact band sums on pixels taken evenly over the sky (65536 at
/// most; fewer where there are many channels, so that the check costs about a second).
/// @param polarized  null where there is no polarization
[[nodiscard]] BasisErrors measure_basis_errors(const SkyModel& sky, const std::vector<Channel>& channels,
                                               const SpectralBasis& intensity,
                                               const SpectralBasis* polarized);

}  // namespace foreglow
