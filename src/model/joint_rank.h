// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <span>
#include <vector>

#include "math/least_squares.h"
#include "sphere/alm.h"

namespace foreglow {

/// The spectra and cross spectra of component maps: for each l the sum over m of a_lm^(k) conj(a_lm^(k')),
/// [l] of [K][K].
///
/// For E and B the two are added.
[[nodiscard]] std::vector<Matrix> component_spectra(const std::vector<Alm>& components);
[[nodiscard]] std::vector<Matrix> component_spectra(const std::vector<AlmEB>& components);

/// Channels as combinations of a few among them: map_c = sum over r of coefficients(c, r) map_(skeletons[r]).
struct JointRank {
    std::vector<std::size_t> skeletons;  ///< channels that need an inverse transform, [R]
    Matrix coefficients;                 ///< [channels][R]; a skeleton's own row is a unit vector
    std::vector<double> errors;  ///< [channels]: rms(error)/rms(map), monopole and dipole of the map left out
    double worst_cl_ratio = 0;   ///< of the error's C_l to the map's, where B_l^2 > 1e-3
    double largest_sum = 0;      ///< of |coefficients| in a row, maps scaled to unit rms
    bool is_plain = false;       ///< every channel is its own skeleton
};

/// Finds the skeletons by a pivoted QR factorisation of the channels' a_lm (an interpolative decomposition;
/// Cheng et al. 2005, Halko, Martinsson & Tropp 2011), seen through a few random projections and scaled to
/// unit rms, and then computes each channel's error from the component spectra, without a sample.
/// @param spectra    [l], l = 0..lmax
/// @param weights    [channels][K]
/// @param windows    [channels][l]
/// @param tolerance  of every channel's error
[[nodiscard]] JointRank make_joint_rank(std::span<const Matrix> spectra, const Matrix& weights,
                                        std::span<const std::vector<double>> windows, double tolerance);

}  // namespace foreglow
