// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <bit>
#include <cstdint>

#include "base/vector_width.h"

namespace foreglow {

/// The sine and the cosine of one angle.
struct SinCos {
    double sin = 0, cos = 0;
};

/// Returns sin x and cos x for |x| < 1e6 in a form that compilers turn into vector code.
///
/// x = n pi/2 + r with pi/2 in three parts (Cody & Waite 1980), then Taylor polynomials of degrees 15 and 16
/// on |r| <= pi/4, whose remainders are below 2e-17. Error below 3e-16 + 1e-17 |x|.
[[nodiscard]] FOREGLOW_INLINE SinCos vector_sin_cos(double x) {
    constexpr double two_over_pi = 0.636619772367581343076;
    constexpr double part_1 = 1.57079632673412561417;  // 33 bits, so that n part_1 is exact
    constexpr double part_2 = 6.07710050630396597660e-11;
    constexpr double part_3 = 2.02226624879595063154e-21;
    constexpr double shift = 6755399441055744.0;  // 1.5 * 2^52: adding it rounds to an integer
    const double shifted = x * two_over_pi + shift;
    const double n = shifted - shift;
    const double r = ((x - n * part_1) - n * part_2) - n * part_3;
    const double z = r * r;
    double s = -1.0 / 1307674368000.0;
    s = s * z + 1.0 / 6227020800.0;
    s = s * z - 1.0 / 39916800.0;
    s = s * z + 1.0 / 362880.0;
    s = s * z - 1.0 / 5040.0;
    s = s * z + 1.0 / 120.0;
    s = s * z - 1.0 / 6.0;
    const double sine = r + r * z * s;
    double c = 1.0 / 20922789888000.0;
    c = c * z - 1.0 / 87178291200.0;
    c = c * z + 1.0 / 479001600.0;
    c = c * z - 1.0 / 3628800.0;
    c = c * z + 1.0 / 40320.0;
    c = c * z - 1.0 / 720.0;
    c = c * z + 1.0 / 24.0;
    const double cosine = (1.0 - 0.5 * z) + z * z * c;
    // The quadrant n mod 4 stands in the low bits: an odd one swaps the two, the second bit turns signs.
    const std::uint64_t quadrant = std::bit_cast<std::uint64_t>(shifted);
    const std::uint64_t odd = 0U - (quadrant & 1U);
    const std::uint64_t sine_bits = std::bit_cast<std::uint64_t>(sine);
    const std::uint64_t cosine_bits = std::bit_cast<std::uint64_t>(cosine);
    const std::uint64_t swapped_sine = (sine_bits & ~odd) | (cosine_bits & odd);
    const std::uint64_t swapped_cosine = (cosine_bits & ~odd) | (sine_bits & odd);
    const std::uint64_t sine_sign = (quadrant & 2U) << 62U;
    const std::uint64_t cosine_sign = ((quadrant + 1U) & 2U) << 62U;
    return {std::bit_cast<double>(swapped_sine ^ sine_sign),
            std::bit_cast<double>(swapped_cosine ^ cosine_sign)};
}

}  // namespace foreglow
