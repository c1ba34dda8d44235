// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <bit>
#include <cstdint>

#include "base/vector_width.h"

namespace foreglow {

/// Returns ln x for finite x >= 2.3e-308 in a form that compilers turn into vector code.
///
/// x = 2^n m with m in [sqrt(1/2), sqrt 2), ln m = 2 atanh s = 2 (s + s^3/3 + ...), s = (m - 1)/(m + 1)
/// (Abramowitz & Stegun 1964, 4.1.27); |s| <= 0.1716, so the remainder after s^19 is below 3e-17. Error below
/// 4e-16 of max(|ln x|, 1).
[[nodiscard]] FOREGLOW_INLINE double vector_log(double x) {
    constexpr double ln2 = 0.693147180559945309417;
    constexpr std::uint64_t sqrt_half_bits = 0x3fe6a09e667f3bcdU;
    constexpr std::uint64_t one_bits = 0x3ff0000000000000U;
    constexpr double two_52 = 4503599627370496.0;
    // Adding 1 - sqrt(1/2) to the bits makes the exponent step at sqrt(1/2), not at 1.
    const std::uint64_t bits = std::bit_cast<std::uint64_t>(x) + (one_bits - sqrt_half_bits);
    const double n =
        std::bit_cast<double>((bits >> 52U) | std::bit_cast<std::uint64_t>(two_52)) - (two_52 + 1023.0);
    const double m = std::bit_cast<double>((bits & 0x000fffffffffffffU) + sqrt_half_bits);
    const double s = (m - 1.0) / (m + 1.0);
    const double z = s * s;
    double p = 2.0 / 19.0;
    p = p * z + 2.0 / 17.0;
    p = p * z + 2.0 / 15.0;
    p = p * z + 2.0 / 13.0;
    p = p * z + 2.0 / 11.0;
    p = p * z + 2.0 / 9.0;
    p = p * z + 2.0 / 7.0;
    p = p * z + 2.0 / 5.0;
    p = p * z + 2.0 / 3.0;
    return n * ln2 + (s * z * p + 2.0 * s);
}

}  // namespace foreglow
