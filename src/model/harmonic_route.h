// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <optional>
#include <vector>

#include "base/progress.h"
#include "model/channel.h"
#include "model/filled_share.h"
#include "model/sky_model.h"
#include "model/spectral_basis.h"
#include "model/transform_plan.h"
#include "sphere/alm.h"
#include "sphere/beam.h"
#include "sphere/frame.h"

namespace foreglow {

/// How a harmonic route got its accuracy.
struct HarmonicReport {
    std::size_t intensity_components = 0, polarized_components = 0;
    int iterations = 0;  ///< of each forward transform after the first, weighted one
    double transform_error =
        0;  ///< relative rms, estimated from the last correction, the larger of I and (Q, U)
    double worst_cl_ratio = 0;  ///< of the error's C_l to the map's, where B_l^2 > 1e-3
    bool converged = true;

    void add(const TransformState& state);
};

/// The full-sky maps of one channel, RING order, COSMO; q and u empty without polarization.
struct ChannelMaps {
    std::vector<double> i, q, u;
};

/// Makes channels with beams (or a pixel window, or in another frame): K component maps are transformed once,
/// and each channel is a weighted sum of their a_lm times its beam, transformed back.
class HarmonicRoute {
  public:
    /// @throws NumericError, DataError as the law and the sky do
    HarmonicRoute(const SkyModel& sky, std::vector<Channel> channels, const HarmonicOptions& options,
                  Progress& progress);

    [[nodiscard]] std::size_t channel_count() const { return channels_.size(); }
    /// Returns rms(error)/rms(map) of a channel, the larger of I and (Q, U): the basis against the exact law
    /// on a sample of the sky's pixels, and the transforms' remaining error, added in quadrature.
    [[nodiscard]] double error_of(std::size_t channel) const { return errors_[channel]; }
    [[nodiscard]] const HarmonicReport& report() const { return report_; }

    /// Makes the maps of one channel in the study's unit.
    [[nodiscard]] ChannelMaps make_channel(std::size_t channel) const;

  private:
    void make_bases(const SkyModel& sky, double tolerance);
    void transform_components(const SkyModel& sky, Progress& progress);
    void turn_components(Progress& progress);
    [[nodiscard]] Angle narrowest_beam() const;
    void undefine(const BeamWindow& window, ChannelMaps& maps) const;

    HealpixGrid grid_{1};
    Frame sky_frame_ = Frame::Galactic;
    std::vector<Channel> channels_;
    HarmonicOptions options_;
    SpectralBasis intensity_basis_, polarized_basis_;
    std::vector<Alm> intensity_alms_;
    std::vector<AlmEB> polarized_alms_;
    std::optional<FilledShare> filled_intensity_, filled_polarization_;
    std::vector<double> errors_;
    HarmonicReport report_;
};

}  // namespace foreglow
