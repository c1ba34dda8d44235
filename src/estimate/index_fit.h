// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <array>
#include <cstddef>
#include <cstdint>
#include <span>
#include <vector>

#include "estimate/survey_file.h"
#include "math/least_squares.h"

namespace foreglow {

/// What the pixels of a set of surveys have in common.
struct IndexFitSetup {
    std::vector<double> log_ratios;          ///< ln(nu_i/nu0), [surveys]
    std::vector<double> calibration_errors;  ///< relative, [surveys]
    Matrix zero_level_covariance;            ///< K_RJ^2, [surveys][surveys]
    bool curvature = false;
    bool common_errors = true;  ///< quoted errors include calibration and zero levels
};

/// Why a pixel has no answer.
enum class IndexVerdict : std::uint8_t { Good, TooFew, NotPositive, Undecided, NotConverged };
inline constexpr std::size_t index_verdicts = 5;

/// One pixel's answer; errors are marginal, one sigma.
struct IndexFit {
    IndexVerdict verdict = IndexVerdict::TooFew;
    bool in_linear_space = false;               ///< else in log space
    std::size_t surveys = 0;                    ///< that were defined here
    double amplitude = 0, amplitude_error = 0;  ///< K_RJ at nu0
    double index = 0, index_error = 0;          ///< local at nu0
    double curvature = 0, curvature_error = 0;
};

/// Brightness over its noise and zero-level error below which a pixel is fitted in linear space.
inline constexpr double log_space_signal_to_noise = 10;
/// Largest error of ln T at any of the frequencies of a fit that still says something.
inline constexpr double largest_log_error = 0.5;

/// Fits T_i = A (nu_i/nu0)^(beta + c ln(nu_i/nu0)) to a pixel of several surveys.
///
/// Weights are the inverse of the full covariance across surveys, C = noise + zero levels + calibration
/// (g_i T_i)^2, T_i of the fit. Where every T_i exceeds 10 times its noise and zero-level error: generalised
/// least squares of ln T_i + N_i/(2 T_i^2) (the second term is the bias of a logarithm, to second order).
/// Elsewhere: the largest Gaussian likelihood in T_i itself, by Levenberg's method in (ln A, beta, c), less
/// the second-order bias of a nonlinear fit (Box 1971, J. R. Stat. Soc. B 33, 171). Errors: the linear
/// propagation of C, or of the noise alone, through that fit; the values do not depend on which. Undefined:
/// fewer defined surveys than parameters, fewer positive ones, or an error of ln T above 0.5 at one of the
/// frequencies.
/// @param values     K_RJ, [surveys], NaN where undefined
/// @param variances  of the noise, K_RJ^2, [surveys]
[[nodiscard]] IndexFit fit_index(const IndexFitSetup& setup, std::span<const double> values,
                                 std::span<const double> variances);

}  // namespace foreglow
