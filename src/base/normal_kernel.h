// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <bit>
#include <cmath>
#include <cstdint>

#include "base/vector_width.h"

// The arithmetic behind base/random.h in a form that compilers turn into vector code: integers, and sums,
// products, quotients and roots that every processor rounds alike. The C library's log, sin and cos are not
// used, since it chooses among variants by processor.
namespace foreglow::kernel {

/// Four 32-bit words, each in the low half of a 64-bit lane.
struct WideWords {
    std::uint64_t a, b, c, d;
};

/// Runs the ten rounds of Philox4x32 (Salmon et al. 2011) on one counter.
[[nodiscard]] FOREGLOW_INLINE WideWords philox_4x32_10(WideWords x, std::uint32_t key0, std::uint32_t key1) {
    constexpr std::uint64_t multiplier0 = 0xD2511F53, multiplier1 = 0xCD9E8D57;
    constexpr std::uint32_t weyl0 = 0x9E3779B9, weyl1 = 0xBB67AE85;
    for (int round = 0; round < 10; ++round) {
        // The masks tell the compiler that one 32 x 32 -> 64 bit product is enough.
        const std::uint64_t p0 = multiplier0 * (x.a & 0xffffffffU);
        const std::uint64_t p1 = multiplier1 * (x.c & 0xffffffffU);
        x = {(p1 >> 32U) ^ x.b ^ key0, p1 & 0xffffffffU, (p0 >> 32U) ^ x.d ^ key1, p0 & 0xffffffffU};
        key0 += weyl0;
        key1 += weyl1;
    }
    return x;
}

/// Turns an integer below 2^52 into a double; exact.
[[nodiscard]] FOREGLOW_INLINE double to_double(std::uint64_t n) {
    return std::bit_cast<double>(n | 0x4330000000000000U) - 0x1p52;
}

/// Returns ln x for a normal x > 0, error below 1 unit in the last place (the scheme of Sun's fdlibm, 1993).
[[nodiscard]] FOREGLOW_INLINE double natural_log(double x) {
    constexpr double ln2_high = 6.93147180369123816490e-01, ln2_low = 1.90821492927058770002e-10;
    constexpr std::uint64_t root_half = 0x3fe6a09e667f3bcdU;  // sqrt(1/2)
    const auto bits = std::bit_cast<std::uint64_t>(x);
    // x = 2^k (1 + f) with sqrt(1/2) <= 1 + f < sqrt 2.
    const std::uint64_t biased = (bits - root_half + (std::uint64_t{1023} << 52U)) >> 52U;
    const double k = to_double(biased) - 1023.0;
    const double f = std::bit_cast<double>(bits - ((biased - 1023U) << 52U)) - 1.0;
    const double half_square = 0.5 * f * f;
    const double s = f / (2.0 + f);
    const double z = s * s;
    double r = 1.479819860511658591e-01;
    r = r * z + 1.531383769920937332e-01;
    r = r * z + 1.818357216161805012e-01;
    r = r * z + 2.222219843214978396e-01;
    r = r * z + 2.857142874366239149e-01;
    r = r * z + 3.999999999940941908e-01;
    r = r * z + 6.666666666666735130e-01;
    r = r * z;
    return k * ln2_high - ((half_square - (s * (half_square + r) + k * ln2_low)) - f);
}

struct SinCos {
    double sin, cos;
};

/// Returns sin and cos of 2 pi t for 0 <= t < 1, error below 1e-16 (fdlibm's polynomials on [-pi/4, pi/4]).
[[nodiscard]] FOREGLOW_INLINE SinCos sin_cos_of_turn(double t) {
    constexpr double half_pi = 1.57079632679489661923;
    constexpr double shift = 6755399441055744.0;  // 1.5 * 2^52: adding it rounds to an integer
    const double shifted = 4.0 * t + shift;
    const double x = (4.0 * t - (shifted - shift)) * half_pi;
    const std::uint64_t quadrant = std::bit_cast<std::uint64_t>(shifted);
    const double z = x * x;
    double s = 1.58969099521155010221e-10;
    s = s * z - 2.50507602534068634195e-08;
    s = s * z + 2.75573137070700676789e-06;
    s = s * z - 1.98412698298579493134e-04;
    s = s * z + 8.33333333332248946124e-03;
    s = s * z - 1.66666666666666324348e-01;
    const double sine = x + (x * z) * s;
    double c = -1.13596475577881948265e-11;
    c = c * z + 2.08757232129817482790e-09;
    c = c * z - 2.75573143513906633035e-07;
    c = c * z + 2.48015872894767294178e-05;
    c = c * z - 1.38888888888741095749e-03;
    c = c * z + 4.16666666666666019037e-02;
    const double cosine = 1.0 - (0.5 * z - (z * z) * c);
    // Quadrant q: sin and cos change places where q is odd; sin is negative in 2 and 3, cos in 1 and 2.
    const std::uint64_t swap = 0U - (quadrant & 1U);
    const auto sine_bits = std::bit_cast<std::uint64_t>(sine),
               cosine_bits = std::bit_cast<std::uint64_t>(cosine);
    const std::uint64_t sine_sign = (quadrant & 2U) << 62U, cosine_sign = ((quadrant + 1U) & 2U) << 62U;
    return {std::bit_cast<double>(((sine_bits & ~swap) | (cosine_bits & swap)) ^ sine_sign),
            std::bit_cast<double>(((cosine_bits & ~swap) | (sine_bits & swap)) ^ cosine_sign)};
}

struct NormalPair {
    double first, second;
};

/// Turns four words into two normal deviates (Box & Muller 1958) on the uniforms (w0 2^32 + w1 + 1/2) / 2^64
/// and (w2 2^32 + w3) / 2^64.
[[nodiscard]] FOREGLOW_INLINE NormalPair box_muller(const WideWords& w) {
    const double radial = to_double(w.a) * 0x1p-32 + (to_double(w.b) + 0.5) * 0x1p-64;
    double turn = to_double(w.c) * 0x1p-32 + to_double(w.d) * 0x1p-64;
    turn = turn < 1.0 ? turn : 0.0;  // rounding may reach 1
    const double radius = std::sqrt(-2.0 * natural_log(radial));
    const SinCos direction = sin_cos_of_turn(turn);
    return {radius * direction.cos, radius * direction.sin};
}

}  // namespace foreglow::kernel
