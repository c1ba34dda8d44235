// SPDX-License-Identifier: GPL-2.0-or-later
#include "base/random.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <set>
#include <span>
#include <vector>

#include "base/normal_kernel.h"

namespace foreglow {
namespace {

using Words = std::array<std::uint32_t, 4>;

// From outside: kat_vectors of Random123 1.14.0, "philox4x32 10" (counter, key, result), as Debian's
// librandom123-doc ships it.
TEST(Philox, GivesTheKnownAnswers) {
    EXPECT_EQ(random_words({0, 0, 0}, 0, 0), (Words{0x6627e8d5, 0xe169c58d, 0xbc57ac4c, 0x9b00dbd8}));
    constexpr std::uint32_t all = 0xffffffff;
    EXPECT_EQ(random_words({0xffffffffffffffff, all, all}, all, all),
              (Words{0x408f276d, 0x41c83b0e, 0xa20bc7c6, 0x6d5451fd}));
    // counter 243f6a88 85a308d3 13198a2e 03707344 is (a, b, field, realization); key a4093822 299f31d0 is the
    // seed, low word first
    EXPECT_EQ(random_words({0x299f31d0a4093822, 0x03707344, 0x13198a2e}, 0x243f6a88, 0x85a308d3),
              (Words{0xd16cfe09, 0x94fdcceb, 0x5001e420, 0x24126ea1}));
}

TEST(Philox, EachPartOfKeyAndCounterMatters) {
    std::set<Words> seen;
    for (const RandomKey& key : {RandomKey{1, 2, 3}, {1ULL << 32U, 2, 3}, {1, 3, 2}, {1, 0, 3}, {1, 2, 0}})
        for (const auto& [a, b] : {std::pair{5U, 6U}, {6U, 5U}, {5U, 0U}})
            seen.insert(random_words(key, a, b));
    EXPECT_EQ(seen.size(), 15U);
}

TEST(NormalPair, IsAPureFunctionOfItsArguments) {
    const RandomKey key{42, 7, 3};
    const auto first = normal_pair(key, 10, 20);
    static_cast<void>(normal_pair(key, 11, 20));
    EXPECT_EQ(normal_pair(key, 10, 20), first);
}

// From outside: Box & Muller 1958, on the words of the test above taken as two 64-bit fractions, high word
// first.
TEST(NormalPair, IsBoxMullerOfTheWords) {
    const double radial = std::ldexp(0xd16cfe0994fdccebULL, -64);
    const double turn = std::ldexp(0x5001e42024126ea1ULL, -64);
    const double radius = std::sqrt(-2 * std::log(radial));
    const auto pair = normal_pair({0x299f31d0a4093822, 0x03707344, 0x13198a2e}, 0x243f6a88, 0x85a308d3);
    EXPECT_NEAR(pair[0], radius * std::cos(2 * 3.14159265358979323846 * turn),
                1e-14);  // rounding of values below 1
    EXPECT_NEAR(pair[1], radius * std::sin(2 * 3.14159265358979323846 * turn), 1e-14);
}

// The arithmetic compiled for one vector width each, as the library compiles it for several.
#if defined(__x86_64__)
#define FOREGLOW_FILL_FOR(name, isa)                                                                       \
    __attribute__((target(isa))) void name(const RandomKey& key, std::uint32_t b, std::span<double> first, \
                                           std::span<double> second) {                                     \
        for (std::size_t i = 0; i < first.size(); ++i) {                                                   \
            const auto words = kernel::philox_4x32_10({i, b, key.field, key.realization},                  \
                                                      static_cast<std::uint32_t>(key.seed),                \
                                                      static_cast<std::uint32_t>(key.seed >> 32U));        \
            const auto pair = kernel::box_muller(words);                                                   \
            first[i] = pair.first;                                                                         \
            second[i] = pair.second;                                                                       \
        }                                                                                                  \
    }
FOREGLOW_FILL_FOR(fill_avx2, "avx2")
FOREGLOW_FILL_FOR(fill_avx512, "avx512f")
#undef FOREGLOW_FILL_FOR
#endif

TEST(NormalPairs, AreTheSameBitsAtEveryVectorWidth) {
    const RandomKey key{0x9876543210abcdefULL, 17, 4};
    constexpr std::size_t n = 4099;  // no multiple of any width
    std::vector<double> first(n), second(n);
    normal_pairs(key, 0, 77, first, second);
    for (std::uint32_t i = 0; i < n; ++i)
        ASSERT_EQ(normal_pair(key, i, 77), (std::array{first[i], second[i]})) << i;
#if defined(__x86_64__)
    std::vector<double> a(n), b(n);
    if (__builtin_cpu_supports("avx2")) {
        fill_avx2(key, 77, a, b);
        EXPECT_EQ(a, first);
        EXPECT_EQ(b, second);
    }
    if (__builtin_cpu_supports("avx512f")) {
        fill_avx512(key, 77, a, b);
        EXPECT_EQ(a, first);
        EXPECT_EQ(b, second);
    }
#endif
}

// From outside: log, sin and cos of the C library in long double.
TEST(NormalKernel, HasALogarithmAndACircleExactToRounding) {
    double worst_log = 0, worst_circle = 0;
    for (std::uint32_t i = 0; i < 20000; ++i) {
        const auto words = random_words({5, 0, 1}, i, 0);
        const double x = std::ldexp(words[0] + 1.0, -32 - static_cast<int>(words[1] % 33));
        const long double exact = std::log(static_cast<long double>(x));
        worst_log = std::max(worst_log, static_cast<double>(std::abs((kernel::natural_log(x) - exact) /
                                                                     (exact == 0 ? 1 : exact))));
        const double t = std::ldexp(words[2], -32);
        const long double angle = 2 * 3.14159265358979323846264338327950288L * t;
        const auto circle = kernel::sin_cos_of_turn(t);
        worst_circle = std::max({worst_circle, static_cast<double>(std::abs(circle.sin - std::sin(angle))),
                                 static_cast<double>(std::abs(circle.cos - std::cos(angle)))});
    }
    EXPECT_LT(worst_log, 2.3e-16);     // one unit in the last place
    EXPECT_LT(worst_circle, 2.3e-16);  // likewise, of values up to 1
    EXPECT_EQ(kernel::natural_log(1.0), 0.0);
    EXPECT_EQ(kernel::sin_cos_of_turn(0.25).cos, 0.0);
    EXPECT_EQ(kernel::sin_cos_of_turn(0.5).cos, -1.0);
    EXPECT_EQ(kernel::sin_cos_of_turn(0.75).sin, -1.0);
}

// The smallest radial word gives sqrt(-2 ln 2^-65), the largest 0: 9.4 sigma are within reach.
TEST(NormalKernel, ReachesTheTails) {
    EXPECT_NEAR(kernel::box_muller({0, 0, 0, 0}).first, std::sqrt(2 * 65 * std::log(2.0)), 1e-14);
    const std::uint64_t all = 0xffffffff;
    EXPECT_EQ(kernel::box_muller({all, all, 0, 0}).first, 0.0);
    EXPECT_TRUE(std::isfinite(kernel::box_muller({all, all, all, all}).second));
}

TEST(NormalPair, HasTheMomentsAndTailsOfANormalDistribution) {
    constexpr int n = 200000;
    double sum = 0, square = 0, fourth = 0, cross = 0, neighbour = 0, previous = 0;
    int beyond2 = 0, beyond4 = 0;
    for (std::uint32_t i = 0; i < n; ++i) {
        const auto [x, y] = normal_pair({2026, 0, 9}, i, 0);
        ASSERT_TRUE(std::isfinite(x) && std::isfinite(y));
        cross += x * y;
        neighbour += x * previous;
        previous = x;
        for (const double z : {x, y}) {
            sum += z;
            square += z * z;
            fourth += z * z * z * z;
            beyond2 += std::abs(z) > 2 ? 1 : 0;
            beyond4 += std::abs(z) > 4 ? 1 : 0;
        }
    }
    constexpr double count = 2.0 * n;
    // Five standard errors each: sd of z 1, of z^2 sqrt 2, of z^4 sqrt 96, of x y 1.
    EXPECT_NEAR(sum / count, 0, 5 / std::sqrt(count));
    EXPECT_NEAR(square / count, 1, 5 * std::sqrt(2 / count));
    EXPECT_NEAR(fourth / count, 3, 5 * std::sqrt(96 / count));
    EXPECT_NEAR(cross / n, 0, 5 / std::sqrt(double{n}));
    EXPECT_NEAR(neighbour / n, 0, 5 / std::sqrt(double{n}));
    const double odds2 = std::erfc(2 / std::sqrt(2.0)), odds4 = std::erfc(4 / std::sqrt(2.0));
    EXPECT_NEAR(beyond2, count * odds2, 5 * std::sqrt(count * odds2));
    EXPECT_NEAR(beyond4, count * odds4, 5 * std::sqrt(count * odds4));
}

}  // namespace
}  // namespace foreglow
