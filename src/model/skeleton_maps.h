// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <span>
#include <vector>

#include "model/joint_rank.h"
#include "sphere/alm.h"

namespace foreglow {

/// The maps of the skeleton channels on one strip, and which of its pixels are undefined.
struct SkeletonStrip {
    std::size_t first_channel = 0;             ///< of the group that this strip serves
    std::vector<std::vector<double>> i, q, u;  ///< [skeletons][pixels]
    std::vector<std::vector<std::uint8_t>> undefined_i,
        undefined_p;  ///< [channels of the group][pixels]; empty where none is
};

/// Writes out[p] = sum over r of coefficients(channel, r) maps[r][begin + p]; where the rank is plain, the
/// channel's own map.
/// @param maps  [R], or [channels of the group] where the rank is plain
void combine_skeletons(const JointRank& rank, const std::vector<std::vector<double>>& maps,
                       std::size_t channel, std::size_t first_channel, std::size_t begin,
                       std::span<double> out);

/// Makes out[p] undefined where marks[begin + p] is set.
void undefine_marked(const std::vector<std::uint8_t>& marks, std::size_t begin, std::span<double> out);

/// Returns sum over k of weights(channel, k) terms[k], read in one pass with threads.
[[nodiscard]] Alm combine_alms(std::span<const Alm* const> terms, const Matrix& weights, std::size_t channel);

}  // namespace foreglow
