// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <memory>
#include <span>
#include <vector>

#include "model/detail_draw.h"
#include "model/detail_modulation.h"
#include "sphere/sky_map.h"

namespace foreglow {

struct DetailReport;

/// What a draw on a plane must know to go on where the sphere's ends.
struct IntensityParts {
    bool lognormal = false;
    std::span<const double> drawn_cl;  ///< of the Gaussian that is drawn on the sphere
    std::span<const float> weights;    ///< what turns it into kelvin where it is added, [npix]
    std::span<const float> steepness;  ///< s, where it changes from pixel to pixel
    double half_variance = 0;          ///< of the Gaussian, where s does not
    double scale = 1;                  ///< turns the complement's C_l into those of the relative fluctuation
    double norm = 1;                   ///< turns these into the Gaussian's own unit
};

/// Draws intensities below a template's beam.
///
/// Additive: I = I_T + w g, g Gaussian with the complement's spectrum. Lognormal, modulation 1: I = I_T exp(G
/// - var/2), whose relative spectrum is the complement's over <I_T^2> of the region; the template itself
/// modulates. Lognormal, another modulation: I = I_T exp(s g1 - s^2/2) with s^2 = ln(1 + (w sigma_g /
/// I_T)^2), at most 1, and g1 of unit variance: approximate, with an error of order sigma^2 times the
/// gradient of s. Pixels of a lognormal sky whose template is not positive get w g instead.
class DetailIntensity {
  public:
    /// @param map     the template on the study's grid
    /// @param report  lmax and spectra
    /// @param region  apo, [npix]
    DetailIntensity(const DetailSpec& spec, std::shared_ptr<const SkyMap> map, const DetailReport& report,
                    Modulation modulation, std::span<const double> region);

    /// Returns the template with one realization's detail.
    /// @param not_positive  pixels of a lognormal sky that had to stay additive
    [[nodiscard]] std::shared_ptr<const SkyMap> realize(const DrawKey& key, std::int64_t& not_positive) const;

    /// Fills in what a report says of the intensity.
    void describe(DetailReport& report) const;
    [[nodiscard]] IntensityParts parts() const {
        return {lognormal_, drawn_cl_, weights_, steepness_, half_variance_, scale_, norm_};
    }

  private:
    void prepare_lognormal(double mean_square);
    void prepare_steepness(std::span<const double> region);

    std::shared_ptr<const SkyMap> template_;
    int lmax_;
    bool lognormal_;
    std::vector<double> drawn_cl_;  // of the Gaussian that is drawn
    std::vector<float> weights_;    // w times what turns the Gaussian into kelvin
    std::vector<float> steepness_;  // s, where it changes from pixel to pixel
    double scale_ = 1, norm_ = 1;
    double half_variance_ = 0;  // of G
    double rms_added_ = 0, relative_rms_ = 0, floored_, clipped_ = 0, steepest_ = 0;
};

}  // namespace foreglow
