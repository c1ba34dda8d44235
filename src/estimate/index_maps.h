// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <array>
#include <cstdint>
#include <span>
#include <vector>

#include "estimate/index_fit.h"
#include "estimate/smoothed_survey.h"

namespace foreglow {

/// Maps of a fit, [npix] each, NaN where undefined; the last two are empty without curvature.
struct IndexMaps {
    std::vector<double> amplitude, amplitude_error;  ///< K_RJ
    std::vector<double> index, index_error;
    std::vector<double> curvature, curvature_error;
    std::array<std::int64_t, index_verdicts> verdicts{};  ///< pixels of each IndexVerdict
    std::int64_t in_linear_space = 0;                     ///< of the good ones
    std::int64_t with_fewer_surveys = 0;                  ///< good ones that lack one or more surveys
};

/// Fits every pixel (fit_index), with threads.
[[nodiscard]] IndexMaps make_index_maps(const IndexFitSetup& setup, std::span<const SmoothedSurvey> surveys);

}  // namespace foreglow
