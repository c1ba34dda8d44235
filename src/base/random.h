// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <array>
#include <cstdint>
#include <span>

namespace foreglow {

/// Names one stream of random numbers: every deviate is a pure function of this key and a counter.
struct RandomKey {
    std::uint64_t seed = 0;
    std::uint32_t realization = 0;
    std::uint32_t field = 0;
};

/// Returns four 32-bit words of Philox4x32-10 (Salmon et al. 2011, "Parallel random numbers: as easy as 1, 2,
/// 3").
///
/// The Philox key is the seed; the counter is (a, b, field, realization).
[[nodiscard]] std::array<std::uint32_t, 4> random_words(const RandomKey& key, std::uint32_t a,
                                                        std::uint32_t b);

/// Returns two independent standard normal deviates for a counter such as (l, m) or (pixel's low word, high
/// word).
///
/// Box-Muller on two 64-bit uniforms in (0, 1]: exact in the tails down to 2^-64 (8.6 sigma and beyond have
/// the right odds). The same bits on every processor.
/// @return deviates with mean 0 and variance 1, [2]
[[nodiscard]] std::array<double, 2> normal_pair(const RandomKey& key, std::uint32_t a, std::uint32_t b);

/// Writes the pairs of the counters (first_a, b), (first_a + 1, b), ...: the bits of normal_pair(), several
/// at once (docs/performance.md: 6 ns a deviate on one busy core).
/// @param first, second  [n]
void normal_pairs(const RandomKey& key, std::uint32_t first_a, std::uint32_t b, std::span<double> first,
                  std::span<double> second);

}  // namespace foreglow
