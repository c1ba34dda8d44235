// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>
#include <optional>
#include <string>

#include "base/quantity.h"
#include "physics/brightness_unit.h"

namespace foreglow {

/// A range of multipoles, both ends included.
struct LRange {
    int first = 2, last = 256;
};

/// A Gaussian random field to be added to an index or a curvature: C_l ~ l^slope over a range and 0 outside,
/// so that sum (2l+1) C_l / 4 pi over the range is rms^2.
struct ScatterSpec {
    double rms = 0;
    double slope = -2.6;
    LRange lrange;
    double correlation = 0;  ///< of its a_lm with those of the intensity's detail
};

/// A variance per ln l such as "0.01 K_RJ^2".
struct SquaredBrightness {
    double value = 0;
    BrightnessUnit unit;  ///< to be squared
};

/// C_l ~ l^slope with D_l = l (l + 1) C_l / 2 pi = amplitude at the pivot, at a reference frequency.
struct PowerLawSpec {
    double slope = 0;
    SquaredBrightness amplitude;
    double pivot = 80;
};

enum class DetailForm { Additive, Lognormal };
enum class ModulationSource { Polarized, Intensity };

/// Gaussian random structure below a template's beam, as a model asks for it.
struct DetailSpec {
    std::string place;                         ///< FILE:LINE:COLUMN of the section
    std::optional<LRange> fit_lrange;          ///< nothing: a range from the beam, where a fit is wanted
    std::optional<PowerLawSpec> intensity;     ///< else fitted
    std::optional<PowerLawSpec> polarization;  ///< EE, at the polarization's reference frequency; else fitted
    std::optional<std::filesystem::path> spectrum;  ///< instead of all of these
    std::optional<int> lmax;                        ///< else 2.5 nside
    double modulation = 1.0;
    double modulation_floor = 0.1;  ///< of the brightness's mean over the region
    ModulationSource polarization_modulation = ModulationSource::Polarized;
    Angle envelope_fwhm = Angle::from_degrees(4.0);
    Angle latitude_cut = Angle::from_degrees(20.0);
    DetailForm form = DetailForm::Additive;
    double b_to_e = 0.35;
    double te_correlation = 0.2;
    bool cap_polarization = false;  ///< scale Q and U back where P > 0.75 I
};

}  // namespace foreglow
