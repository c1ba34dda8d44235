// SPDX-License-Identifier: GPL-2.0-or-later
#include "base/random.h"

#include <Random123/philox.h>

#include <cmath>

#include "base/constants.h"

namespace foreglow {

std::array<std::uint32_t, 4> random_words(const RandomKey& key, std::uint32_t a, std::uint32_t b) {
    const r123::Philox4x32::ctr_type counter = {{a, b, key.field, key.realization}};
    const r123::Philox4x32::key_type philox_key = {
        {static_cast<std::uint32_t>(key.seed), static_cast<std::uint32_t>(key.seed >> 32U)}};
    const auto words = r123::Philox4x32()(counter, philox_key);
    return {words[0], words[1], words[2], words[3]};
}

std::array<double, 2> normal_pair(const RandomKey& key, std::uint32_t a, std::uint32_t b) {
    const auto words = random_words(key, a, b);
    const auto join = [](std::uint32_t high, std::uint32_t low) {
        return (static_cast<std::uint64_t>(high) << 32U) | low;
    };
    constexpr double step = 0x1p-64;
    const double radial = (static_cast<double>(join(words[0], words[1])) + 0.5) * step;
    const double turn = static_cast<double>(join(words[2], words[3])) * step;
    const double radius = std::sqrt(-2.0 * std::log(radial));
    return {radius * std::cos(2.0 * constants::pi * turn), radius * std::sin(2.0 * constants::pi * turn)};
}

}  // namespace foreglow
