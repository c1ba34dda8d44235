// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <span>
#include <vector>

#include "model/sky_model.h"
#include "physics/response.h"

namespace foreglow {

/// Makes channels without a beam: the spectral law, averaged over the band, in each pixel by itself.
class PixelRoute {
  public:
    /// @param bands      [channels], in the study's unit
    /// @param tolerance  largest relative error of a pixel
    /// @throws NumericError where a band is too wide for the range of indices
    PixelRoute(const SkyModel& sky, std::span<const BandSum> bands, bool polarized, double tolerance);

    [[nodiscard]] std::size_t channel_count() const { return channel_count_; }
    /// Returns the largest relative error of a pixel of I, or of P, that this channel's average makes.
    [[nodiscard]] double error_of(std::size_t channel) const;

    /// Writes pixels begin..end of a strip as the channel sees them, in the study's unit.
    /// @param out        [1 or 3][end - begin]: I, or I, Q, U (COSMO)
    /// @param precision  of the exponential
    void make_pixels(const SkyStrip& strip, std::size_t channel, std::size_t begin, std::size_t end,
                     std::span<const std::span<double>> out,
                     ExpPrecision precision = ExpPrecision::Double) const;

    /// Makes the strip that make_pixels wants.
    [[nodiscard]] SkyStrip make_strip(const SkyModel& sky, const RingStrip& strip) const;

  private:
    void make_node_pixels(const SkyStrip& strip, std::size_t channel, std::size_t begin, std::size_t end,
                          std::span<const std::span<double>> out) const;

    std::size_t channel_count_;
    bool polarized_;
    Matrix node_weights_, polarized_weights_;  ///< [channels][K] of a sky given at nodes
    std::vector<double> node_errors_;          ///< [channels]
    std::vector<BandFactor> intensity_laws_;
    std::vector<BandFactor> polarized_laws_;  ///< empty where Q and U share the intensity's
};

}  // namespace foreglow
