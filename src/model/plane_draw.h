// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <span>
#include <string>
#include <vector>

#include "base/quantity.h"
#include "model/detail_spectrum.h"
#include "sphere/harmonics.h"

namespace foreglow {

/// Whose draw on a plane: the study's seed, a realization, and the patch's name.
struct PlaneKey {
    std::uint64_t seed = 0;
    int realization = 0;
    std::string patch;
};

/// Draws Gaussian fields on a flat square of pixels, by the Fourier transform of white noise on a torus at
/// least 1.5 times as wide, of which a corner is kept: nothing comes back at the opposite edge.
///
/// A mode of wave number |k| has the variance of C_l at l = |k| - 1/2, interpolated linearly, where |k| is
/// above the first one's; up to the corner of the Fourier plane, so that nothing is aliased. White noise is a
/// function of (seed, realization, patch, field, i, j).
class PlaneDraw {
  public:
    /// @param pixels  a side of what is kept
    PlaneDraw(int pixels, Angle pixel);

    /// Returns the highest l of the Fourier plane, at its corner.
    [[nodiscard]] int highest_l() const;
    /// Returns the variance of what intensity() draws.
    [[nodiscard]] double variance(std::span<const double> cl) const;
    /// @param cl  [l], l = 0..highest_l() or shorter; 0 where nothing shall be drawn
    /// @return    [pixels][pixels], x running fastest
    [[nodiscard]] std::vector<double> intensity(std::span<const double> cl, const PlaneKey& key) const;
    /// Returns Q and U against the plane's own axes, COSMO with south down and east to the left: with phi the
    /// angle of k from south towards east, Q = E cos 2 phi - B sin 2 phi, U = E sin 2 phi + B cos 2 phi. E
    /// shares the noise of intensity() by spectra.correlation.
    [[nodiscard]] StokesValues polarization(const DetailSpectra& spectra, const PlaneKey& key) const;

  private:
    [[nodiscard]] std::vector<double> white_noise(const PlaneKey& key, std::uint32_t field) const;
    [[nodiscard]] std::vector<double> cut(const std::vector<double>& torus) const;

    int pixels_, torus_;
    double side_;  // of a pixel [rad]
};

}  // namespace foreglow
