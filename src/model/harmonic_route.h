// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <optional>
#include <span>
#include <vector>

#include "base/progress.h"
#include "model/channel.h"
#include "model/component_transforms.h"
#include "model/filled_share.h"
#include "model/joint_rank.h"
#include "model/skeleton_maps.h"
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
    int iterations = 0;       ///< refinements of each refined component after its first, weighted transform
    std::size_t refined = 0;  ///< components that were refined
    double transform_error = 0;  ///< relative rms, the larger of I and (Q, U); see ComponentTransforms
    double worst_cl_ratio = 0;   ///< of the error's C_l to the map's, where B_l^2 > 1e-3
    bool converged = true;
    std::size_t intensity_skeletons = 0, polarized_skeletons = 0;  ///< inverse transforms of each kind
    double rank_error = 0;  ///< of the worst channel's combination of skeletons, relative rms

    void add(const TransformState& state);
};

/// The full-sky maps of one channel, RING order, COSMO; q and u empty without polarization.
struct ChannelMaps {
    std::vector<double> i, q, u;
};

/// Makes channels with beams (or a pixel window, or in another frame): K component maps are transformed once,
/// R skeleton channels are weighted sums of their a_lm times a beam, transformed back strip by strip, and
/// every channel is a combination of the skeletons in each pixel.
class HarmonicRoute {
  public:
    /// @throws NumericError, DataError as the law and the sky do
    HarmonicRoute(const SkyModel& sky, std::vector<Channel> channels, const HarmonicOptions& options,
                  Progress& progress);

    [[nodiscard]] std::size_t channel_count() const { return channels_.size(); }
    /// Returns rms(error)/rms(map) of a channel, the larger of I and (Q, U): the basis against the exact law
    /// on a sample of the sky's pixels, the transforms' remaining error, and that of the combination of
    /// skeletons, added in quadrature.
    [[nodiscard]] double error_of(std::size_t channel) const { return errors_[channel]; }
    [[nodiscard]] const HarmonicReport& report() const { return report_; }

    /// Returns how many channels one set of strips should serve, and how many pixels a strip should have, so
    /// that the skeletons of a strip take about half a GiB.
    [[nodiscard]] std::size_t group_size() const;
    [[nodiscard]] std::int64_t strip_pixels() const;

    /// Makes the skeleton maps of a strip for channels first to first + count.
    [[nodiscard]] SkeletonStrip make_strip(const RingStrip& strip, std::size_t first,
                                           std::size_t count) const;
    /// Writes pixels begin..end of a strip as a channel sees them, in the study's unit.
    /// @param out  [1 or 3][end - begin]: I, or I, Q, U (COSMO)
    void make_pixels(const SkeletonStrip& strip, std::size_t channel, std::size_t begin, std::size_t end,
                     std::span<const std::span<double>> out) const;

    /// Makes the whole maps of one channel.
    [[nodiscard]] ChannelMaps make_channel(std::size_t channel) const;

  private:
    void make_bases(const SkyModel& sky, double tolerance);
    void transform_components(const SkyModel& sky, Progress& progress);
    template <class Coefficients, class MakeMaps>
    std::vector<Coefficients> analyse_components(const TransformPlan& plan, const SpectralBasis& basis,
                                                 const MakeMaps& make_maps);
    void turn_components(Progress& progress);
    void find_skeletons(double tolerance);
    [[nodiscard]] Angle narrowest_beam() const;
    [[nodiscard]] Alm intensity_alm(std::size_t channel) const;
    [[nodiscard]] AlmEB polarized_alm(std::size_t channel) const;
    void mark_undefined(const RingStrip& strip, std::size_t first, std::size_t count,
                        SkeletonStrip& out) const;

    HealpixGrid grid_{1};
    Frame sky_frame_ = Frame::Galactic;
    std::vector<Channel> channels_;
    HarmonicOptions options_;
    std::vector<BeamWindow> windows_;  ///< [channels]
    SpectralBasis intensity_basis_, polarized_basis_;
    std::vector<Alm>
        intensity_alms_;  ///< of components; of skeletons once these are found to be fewer than the channels
    std::vector<AlmEB> polarized_alms_;
    JointRank intensity_rank_, polarized_rank_;
    std::optional<FilledShare> filled_intensity_, filled_polarization_;
    std::vector<double> errors_;
    HarmonicReport report_;
};

}  // namespace foreglow
