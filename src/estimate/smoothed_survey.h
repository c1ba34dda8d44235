// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <optional>
#include <string>
#include <vector>

#include "base/progress.h"
#include "base/quantity.h"
#include "estimate/survey_file.h"
#include "sphere/grid.h"

namespace foreglow {

/// A survey at the common resolution, on the output's grid and frame.
struct SmoothedSurvey {
    std::string name;  ///< of the map's file
    Frequency frequency;
    std::vector<double> values;     ///< K_RJ, zero level subtracted, [npix]; NaN where undefined
    std::vector<double> variances;  ///< of the noise, K_RJ^2, [npix], or [1] where it is the same everywhere
    double noise_area = 0;          ///< solid angle over which the noise is correlated [sr]
    double calibration_error = 0;
    double zero_level = 0, zero_level_error = 0;  ///< K_RJ
    Angle extra_beam;                             ///< 0 where nothing was to smooth
    std::int64_t undefined = 0;                   ///< pixels of the output

    [[nodiscard]] double variance(std::size_t pixel) const {
        return variances.size() == 1 ? variances[0] : variances[pixel];
    }
};

/// How the surveys were brought to one resolution.
struct SmoothingReport {
    bool pixel_for_pixel = false;  ///< all surveys had the output's grid, frame and resolution
    int lmax = 0;                  ///< of all surveys
    double window_at_lmax = 0;     ///< common beam's B_l there: what is cut off
};

struct SmoothedSurveys {
    std::vector<SmoothedSurvey> surveys;  ///< ascending in frequency
    SmoothingReport report;
};

/// Reads the surveys in K_RJ, subtracts their zero levels and smooths them to the common beam.
///
/// Each map is analysed at its own nside, undefined pixels filled first, multiplied by the Gaussian of FWHM
/// sqrt(common^2 - own^2), turned to the output's frame, and evaluated on the output's grid. All share one
/// lmax, so that they have one resolution: where the common beam has fallen to 1e-4, and at most 2.5 nside of
/// the coarsest map. Pixel windows are part of the beams as given. An output pixel is undefined where more
/// than 1 % of its weight falls on filled pixels. Surveys that all have the output's grid, frame and
/// resolution are used pixel for pixel. White noise between the pixels of the map as given is carried along
/// exactly: variance s^2 Omega through the squared kernel (noise_window.h); a map of it by its a_lm, kept
/// within the bounds that its smallest and largest value give.
/// @throws InputError, DataError, FileError as the reader of maps, with place
[[nodiscard]] SmoothedSurveys smooth_surveys(const SurveysSpec& spec, Progress& progress);

}  // namespace foreglow
