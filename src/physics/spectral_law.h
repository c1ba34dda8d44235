// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include "base/quantity.h"

namespace foreglow {

/// What the law of one pixel is made of.
struct SpectralParameters {
    double index = 0;      ///< beta, the local index of brightness temperature AT the reference frequency
    double curvature = 0;  ///< c, half the second derivative of ln T in ln nu
};

/// Returns ln(T(nu)/T(nu0)) of the curved power law T = A (nu/nu0)^(beta + c ln(nu/nu0)) (common practice in
/// the field).
/// @param log_ratio  ln(nu/nu0)
[[nodiscard]] constexpr double log_brightness_ratio(const SpectralParameters& parameters, double log_ratio) {
    return (parameters.index + parameters.curvature * log_ratio) * log_ratio;
}

/// Returns d ln T/d ln nu = beta + 2 c ln(nu/nu0), the local index at another frequency.
[[nodiscard]] constexpr double local_index(const SpectralParameters& parameters, double log_ratio) {
    return parameters.index + 2 * parameters.curvature * log_ratio;
}

/// Returns the index at nu0 of a law whose local index at nu1 is known: beta(nu0) = beta(nu1) - 2 c
/// ln(nu1/nu0).
[[nodiscard]] constexpr double index_at_reference(double index_measured, double curvature, double log_ratio) {
    return index_measured - 2 * curvature * log_ratio;
}

/// Returns ln(a/b).
[[nodiscard]] double log_frequency_ratio(Frequency a, Frequency b);

/// Returns alpha = beta + 2, the index of flux density and of specific intensity (Rybicki & Lightman ch. 1,
/// Rayleigh-Jeans law).
[[nodiscard]] constexpr double flux_index(double brightness_index) {
    return brightness_index + 2;
}

/// Returns s = 1 - 2 alpha = -3 - 2 beta of the electrons N(E) ~ E^-s that radiate this index (Rybicki &
/// Lightman eq. 6.22a).
[[nodiscard]] constexpr double electron_slope(double brightness_index) {
    return -3 - 2 * brightness_index;
}

}  // namespace foreglow
