// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <span>
#include <vector>

#include "sphere/frame.h"
#include "sphere/grid.h"
#include "sphere/ring_weights.h"

namespace foreglow {

/// Which pixels count, [npix]; empty: all.
using PixelSelection = std::vector<std::uint8_t>;

/// Selects pixels beyond a galactic latitude, |b| >= cut.
[[nodiscard]] PixelSelection select_latitudes(const HealpixGrid& grid, Frame frame, double cut_degrees);

/// Numbers of a map over the selected, defined pixels; zero where there are none.
struct ResidualStatistics {
    std::int64_t pixels = 0;
    double mean = 0;
    double rms = 0;                   ///< about zero
    double p5 = 0, p50 = 0, p95 = 0;  ///< quantiles, linear between the nearest ranks
    double p95_of_size = 0;           ///< of the absolute value
};
[[nodiscard]] ResidualStatistics make_residual_statistics(std::span<const double> values,
                                                          const PixelSelection& selection = {});

/// Makes pseudo-spectra of maps on one grid.
class MaskedSpectra {
  public:
    /// @param lmax  at most 2.5 nside is trustworthy
    MaskedSpectra(const HealpixGrid& grid, int lmax);

    /// Returns the pseudo-spectrum of a map: its mean over the selected, defined pixels subtracted, the
    /// others put to zero, C_l divided by the share of the sky that is left; [lmax + 1].
    ///
    /// Analysed with ring weights and one refinement: within 1e-3 of converged a_lm at every l from 1 to 2
    /// nside. Leakage between l by the mask's edge is not undone.
    [[nodiscard]] std::vector<double> of(std::span<const double> values,
                                         const PixelSelection& selection) const;

  private:
    HealpixGrid grid_;
    int lmax_;
    RingWeights weights_;
};

/// A range of l.
struct LBand {
    int low = 0, high = 0;  ///< both included
};
/// Returns bands about half a decade wide: 2-10, 11-30, 31-100, 101-300, ... up to lmax.
[[nodiscard]] std::vector<LBand> make_l_bands(int lmax);

/// Returns the rms that a band of a spectrum stands for: sqrt(sum over l of (2 l + 1) C_l/4 pi).
[[nodiscard]] double rms_in_band(std::span<const double> cl, const LBand& band);

}  // namespace foreglow
