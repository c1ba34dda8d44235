// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <memory>
#include <optional>
#include <string>
#include <variant>
#include <vector>

#include "base/quantity.h"
#include "model/node_sky.h"
#include "model/pixel_field.h"
#include "model/sky_law.h"
#include "model/spectrum_fit.h"
#include "sphere/alm.h"

namespace foreglow {

/// Q and U at one frequency: maps on the grid, or coefficients.
struct StokesField {
    std::variant<std::shared_ptr<const StokesMaps>, AlmEB> source;
    std::shared_ptr<const SkyMap> filled;  ///< of the coefficients: 1 where the survey had no value
};

/// The polarized part of a sky.
struct PolarizedSky {
    StokesField stokes;  ///< K_RJ at `reference`; with `fraction`: the direction only, any length
    std::optional<PixelField> fraction;  ///< P = fraction times the intensity at `reference`
    Frequency reference;
    std::optional<PixelField> index;  ///< own power law from `reference`; else the intensity's own curve
    std::optional<Angle> beam_fwhm;
};

/// The electrons behind a sky's indices.
struct ElectronSky {
    ElectronLaw law;
    IndexDefinition definition;                                    ///< where the sky's index was measured
    PixelField slope = PixelField::uniform(2.5);                   ///< within slope_limits
    std::optional<PixelField> field, break_energy, cutoff_energy;  ///< maps, uG and GeV, instead of the law's
    std::shared_ptr<const ElectronShape> shape;                    ///< at the sky's reference frequency
    std::int64_t clamped_pixels = 0;  ///< whose index no slope within slope_limits has
};

/// What one strip of a sky is made of; each [pixel_count], NaN where undefined; those of polarization and of
/// electrons are empty without.
struct SkyStrip {
    std::vector<double> intensity;         ///< K_RJ at the reference frequency
    std::vector<double> index, curvature;  ///< at the reference frequency; empty with electrons
    std::vector<double> slope, field, break_energy, cutoff_energy;  ///< the last three empty where uniform
    std::vector<double> q, u;  ///< K_RJ at the polarization's reference frequency, COSMO
    /// Of Q and U, at the polarization's reference frequency; empty where they are the intensity's own.
    std::vector<double> polarized_index, polarized_curvature;
    /// Of a sky given at nodes: maps at the nodes, and of Q and U in the channels where these are their own.
    std::vector<std::vector<double>> node_i, node_q, node_u;

    [[nodiscard]] const std::vector<double>& index_of_polarization() const {
        return polarized_index.empty() ? index : polarized_index;
    }
    [[nodiscard]] const std::vector<double>& curvature_of_polarization() const {
        return polarized_curvature.empty() ? curvature : polarized_curvature;
    }
    /// What the law of intensity, and that of Q and U, reads.
    [[nodiscard]] LawColumns intensity_columns() const { return {index, curvature, electrons()}; }
    [[nodiscard]] LawColumns polarized_columns() const {
        if (!slope.empty() && polarized_index.empty()) return {{}, {}, electrons()};
        return {index_of_polarization(), curvature_of_polarization(), {}};
    }
    [[nodiscard]] ElectronColumns electrons() const { return {slope, field, break_energy, cutoff_energy}; }
};

/// A sky on one grid: what each pixel's spectrum is made of.
struct SkyModel {
    HealpixGrid grid{1};
    Frame frame = Frame::Galactic;  ///< of the intensity map; the law acts in it
    Frequency reference;
    PixelField intensity = PixelField::uniform(0);
    PixelField index = PixelField::uniform(-3);  ///< where it was measured
    double index_log_ratio = 0;                  ///< ln(nu1/nu0) of that frequency
    PixelField curvature = PixelField::uniform(0);
    std::optional<ElectronSky> electrons;  ///< instead of index and curvature
    std::optional<PolarizedSky> polarization;
    std::optional<Angle> beam_fwhm;  ///< the template's own
    /// The template's spectra, measured at its own nside, where the model's detail continues them.
    std::optional<SpectrumFit> intensity_fit, polarization_fit;
    /// Where the sky follows no law but is given at node frequencies; intensity, index, curvature and
    /// polarization above are then what it is at the reference frequency.
    std::shared_ptr<const NodeSky> nodes;
    std::vector<std::string>
        labels;  ///< sentences a reader of the maps must see, e.g. that the sky is invented
};

/// Makes one strip; indices are carried to the reference frequencies: beta(nu0) = beta(nu1) - 2 c
/// ln(nu1/nu0).
[[nodiscard]] SkyStrip make_sky_strip(const SkyModel& sky, const RingStrip& strip, bool with_polarization);

/// Fills index and curvature of a strip with the law's local ones at the reference frequency; those of a
/// curved law are there already.
void add_local_spectrum(const SkyModel& sky, SkyStrip& strip);

/// Returns T(nu)/T(nu0) of each pixel of a strip of intensity, NaN where undefined.
[[nodiscard]] std::vector<double> make_brightness_ratios(const SkyModel& sky, const SkyStrip& strip,
                                                         Frequency frequency);

/// Makes a strip of a sky given at nodes, with its node maps.
[[nodiscard]] SkyStrip make_node_strip(const SkyModel& sky, const RingStrip& strip, bool with_polarization);

/// Returns bounds of index and curvature at the reference frequency over the sky's pixels.
/// @throws DataError where no pixel of a map is defined
[[nodiscard]] ParameterRange parameter_range(const SkyModel& sky);
/// Returns the bounds of what Q and U follow, at the polarization's reference frequency.
[[nodiscard]] ParameterRange polarized_parameter_range(const SkyModel& sky);
/// Returns the law of intensity, and that of Q and U, with the bounds of their parameters over the sky.
/// @throws DataError where no pixel of a map is defined
[[nodiscard]] SkyLaw intensity_law(const SkyModel& sky);
[[nodiscard]] SkyLaw polarized_law(const SkyModel& sky);
/// Tells whether Q and U share the intensity's reference frequency and curve, so that one factor serves all
/// three.
[[nodiscard]] bool polarization_shares_law(const SkyModel& sky);

}  // namespace foreglow
