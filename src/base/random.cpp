// SPDX-License-Identifier: GPL-2.0-or-later
#include "base/random.h"

#include <Random123/philox.h>

#include "base/error.h"
#include "base/normal_kernel.h"

namespace foreglow {
namespace {

FOREGLOW_WIDE
void fill_normal_pairs(std::uint32_t key0, std::uint32_t key1, std::uint32_t first_a, std::uint64_t b,
                       std::uint64_t field, std::uint64_t realization, double* first, double* second,
                       std::size_t count) {
    for (std::size_t i = 0; i < count; ++i) {
        const std::uint64_t a = (first_a + i) & 0xffffffffU;
        const auto words = kernel::philox_4x32_10({a, b, field, realization}, key0, key1);
        const auto pair = kernel::box_muller(words);
        first[i] = pair.first;
        second[i] = pair.second;
    }
}

}  // namespace

std::array<std::uint32_t, 4> random_words(const RandomKey& key, std::uint32_t a, std::uint32_t b) {
    const r123::Philox4x32::ctr_type counter = {{a, b, key.field, key.realization}};
    const r123::Philox4x32::key_type philox_key = {
        {static_cast<std::uint32_t>(key.seed), static_cast<std::uint32_t>(key.seed >> 32U)}};
    const auto words = r123::Philox4x32()(counter, philox_key);
    return {words[0], words[1], words[2], words[3]};
}

std::array<double, 2> normal_pair(const RandomKey& key, std::uint32_t a, std::uint32_t b) {
    const auto words = random_words(key, a, b);
    const auto pair = kernel::box_muller({words[0], words[1], words[2], words[3]});
    return {pair.first, pair.second};
}

void normal_pairs(const RandomKey& key, std::uint32_t first_a, std::uint32_t b, std::span<double> first,
                  std::span<double> second) {
    FOREGLOW_EXPECTS(first.size() == second.size());
    fill_normal_pairs(static_cast<std::uint32_t>(key.seed), static_cast<std::uint32_t>(key.seed >> 32U),
                      first_a, b, key.field, key.realization, first.data(), second.data(), first.size());
}

}  // namespace foreglow
