// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <bit>
#include <cstdint>

#include "base/vector_width.h"

namespace foreglow {

/// How exact an exponential must be.
enum class ExpPrecision {
    Double,  ///< relative error below 4e-16
    Single   ///< relative error below 3e-10: a tenth of the steps less, for values that will be stored as
             ///< float32
};

/// Returns e^x for |x| < 700 in a form that compilers turn into vector code.
///
/// x = n ln 2 + r with |r| <= ln 2/2 (Cody & Waite 1980), then the Taylor polynomial of degree 13 or 8, whose
/// remainder is below 1e-17 or 3e-10. Every step is exact or rounded alike on every processor, so that
/// results do not depend on the vector width. NaN stays NaN.
template <ExpPrecision precision = ExpPrecision::Double>
[[nodiscard]] FOREGLOW_INLINE double vector_exp(double x) {
    constexpr double log2_e = 1.44269504088896340736;
    constexpr double ln2_high = 6.93145751953125e-1;  // 20 bits, so that n ln2_high is exact
    constexpr double ln2_low = 1.42860682030941723212e-6;
    constexpr double shift = 6755399441055744.0;  // 1.5 * 2^52: adding it rounds to an integer
    const double shifted = x * log2_e + shift;
    const double n = shifted - shift;
    const double r = (x - n * ln2_high) - n * ln2_low;
    double p = 1.0 / 40320.0;
    if constexpr (precision == ExpPrecision::Double) {
        p = 1.0 / 6227020800.0;
        p = p * r + 1.0 / 479001600.0;
        p = p * r + 1.0 / 39916800.0;
        p = p * r + 1.0 / 3628800.0;
        p = p * r + 1.0 / 362880.0;
        p = p * r + 1.0 / 40320.0;
    }
    p = p * r + 1.0 / 5040.0;
    p = p * r + 1.0 / 720.0;
    p = p * r + 1.0 / 120.0;
    p = p * r + 1.0 / 24.0;
    p = p * r + 1.0 / 6.0;
    p = p * r + 0.5;
    const double e_r = r + (r * r) * p;
    const std::uint64_t bits = (std::bit_cast<std::uint64_t>(shifted) + 1023U) << 52U;
    const double two_n = std::bit_cast<double>(bits);
    return two_n + two_n * e_r;
}

}  // namespace foreglow
