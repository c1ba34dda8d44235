// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <span>

#include "model/detail_spec.h"
#include "model/detail_spectrum.h"
#include "sphere/alm.h"

namespace foreglow {

/// The fields that a study's seed draws; their numbers are part of what a seed means and never change.
enum class DrawnField : std::uint32_t {
    Intensity = 0x100,
    PolarizationE = 0x101,
    PolarizationB = 0x102,
    Index = 0x103,
    Curvature = 0x104,
    PatchIntensity = 0x110,
    PatchE = 0x111,
    PatchB = 0x112
};

/// Whose draw: the study's seed and a realization's number.
struct DrawKey {
    std::uint64_t seed = 0;
    int realization = 0;
};

/// Draws the a_lm of the intensity's Gaussian, a function of (seed, realization, l, m) times sqrt(C_l).
[[nodiscard]] Alm draw_intensity(std::span<const double> tt, int lmax, const DrawKey& key);

/// Draws E and B: a_E = sqrt(C_EE) (rho_l eta_T + sqrt(1 - rho_l^2) eta_E), a_B = sqrt(C_BB) eta_B, where
/// eta_T are the unit deviates of draw_intensity().
[[nodiscard]] AlmEB draw_polarization(const DetailSpectra& spectra, int lmax, const DrawKey& key);

/// Draws the field of a scatter, correlated with draw_intensity() as it says, up to the smaller of lmax and
/// its range.
[[nodiscard]] Alm draw_scatter(const ScatterSpec& scatter, DrawnField field, int lmax, const DrawKey& key);

/// Returns the spectrum of a scatter over its whole range: sum (2l+1) C_l / 4 pi = rms^2; [last + 1].
[[nodiscard]] std::vector<double> scatter_spectrum(const ScatterSpec& scatter);

}  // namespace foreglow
