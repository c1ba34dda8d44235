// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <memory>
#include <optional>
#include <span>
#include <string>
#include <vector>

#include "base/progress.h"
#include "model/detail_draw.h"
#include "model/detail_spectrum.h"
#include "model/model_spec.h"
#include "model/sky_model.h"

namespace foreglow {

/// What a draw met in the pixels.
struct DetailCounts {
    std::int64_t not_positive = 0;   ///< of a lognormal sky: template <= 0, detail added instead
    std::int64_t too_polarized = 0;  ///< P > 0.75 I with I > 0 at the polarization's reference frequency
};

/// What the detail of a sky is, for the report and the manifest.
struct DetailReport {
    int lmax = 0;  ///< of what is drawn
    DetailForm form = DetailForm::Additive;
    Angle intensity_beam, polarization_beam;
    SkySpectra sky;  ///< of the true sky; empty where only indices scatter
    DetailSpectra added;
    std::optional<SpectrumFit> intensity_fit, polarization_fit;
    double rms_added = 0;     ///< of the added intensity, over the region, K_RJ
    double relative_rms = 0;  ///< over the template's rms there
    double overlap = 1;       ///< <w w_P> over the region, by which T and E are drawn more correlated
    double floored = 0;       ///< share of the sky where the floor of the modulation holds
    double clipped = 0;       ///< power that the lognormal inversion lost, as a share of the variance
    double steepest = 0;      ///< lognormal with modulation other than 1: largest rms of ln I asked for;
                              ///< above 1 it was cut to 1
};

class DetailIntensity;

/// The parts of a sky with detail that close-ups are made of; they live as long as the DetailedSky.
struct DetailParts {
    const SkyModel* base = nullptr;                 ///< the template
    std::shared_ptr<const SkyMap> intensity_map;    ///< of the template, on the grid
    std::shared_ptr<const StokesMaps> stokes_maps;  ///< where there is polarization
    const DetailIntensity* intensity = nullptr;     ///< where there is detail
    std::span<const float> polarized_weights;       ///< w_P [npix]
    std::uint64_t seed = 0;
};

/// A template and the random structure that a seed adds to it: amplitude below the beam, scatter of index and
/// curvature. Each realization shares what is not random.
class DetailedSky {
  public:
    /// Prepares the draws: fits, spectra, modulation.
    /// @param base       of load_sky()
    /// @param polarized  whether Q and U are wanted
    /// @throws InputError, DataError, NumericError as the parts do
    DetailedSky(const ModelSpec& model, SkyModel base, std::uint64_t seed, bool polarized,
                Progress& progress);
    ~DetailedSky();
    DetailedSky(DetailedSky&&) noexcept;
    DetailedSky& operator=(DetailedSky&&) noexcept;

    /// Tells whether realizations differ.
    [[nodiscard]] bool varies() const;
    /// Tells whether amplitudes do; else only index or curvature.
    [[nodiscard]] bool has_detail() const;
    /// Returns the sky of one realization; the template itself where nothing is random.
    [[nodiscard]] SkyModel realize(int realization, DetailCounts* counts = nullptr) const;
    [[nodiscard]] const DetailReport& report() const;
    [[nodiscard]] DetailParts parts() const;
    /// Returns the spectra of the true sky further up than the report has them.
    [[nodiscard]] SkySpectra spectra_up_to(int lmax) const;

  private:
    class Impl;
    std::unique_ptr<Impl> impl_;
};

/// Returns the largest l at which detail may be drawn on a grid: 2.5 nside, beyond which a pixelized map
/// cannot tell a wave from a longer one.
[[nodiscard]] int largest_detail_lmax(const HealpixGrid& grid);

/// Returns how many numbers stay in memory for the random parts, beside the template's own.
[[nodiscard]] std::int64_t detail_held_values(const ModelSpec& model, const HealpixGrid& grid,
                                              bool polarized);

}  // namespace foreglow
