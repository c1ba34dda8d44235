// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/skeleton_maps.h"

#include <algorithm>

#include "base/parallel.h"
#include "base/vector_width.h"
#include "sphere/sky_map.h"

namespace foreglow {
namespace {

// out = sum over r of coefficients[r] maps[r]; four maps at a time keep the sums in registers.
FOREGLOW_WIDE
void combine_pixels(const double* const* maps, const double* coefficients, std::size_t count, double* out,
                    std::size_t n) {
    std::fill_n(out, n, 0.0);
    std::size_t r = 0;
    for (; r + 4 <= count; r += 4) {
        const double *a = maps[r], *b = maps[r + 1], *c = maps[r + 2], *d = maps[r + 3];
        const double ca = coefficients[r], cb = coefficients[r + 1], cc = coefficients[r + 2],
                     cd = coefficients[r + 3];
        for (std::size_t i = 0; i < n; ++i)
            out[i] += (ca * a[i] + cb * b[i]) + (cc * c[i] + cd * d[i]);
    }
    for (; r < count; ++r) {
        const double* a = maps[r];
        const double ca = coefficients[r];
        for (std::size_t i = 0; i < n; ++i)
            out[i] += ca * a[i];
    }
}

constexpr std::size_t pixel_block = 1024;  // a block of every skeleton stays in the second-level cache
struct Terms {
    std::vector<const double*> maps;
    std::vector<double> coefficients;
};

Terms terms_of(const JointRank& rank, const std::vector<std::vector<double>>& maps, std::size_t channel,
               std::size_t first_channel) {
    Terms terms;
    if (rank.is_plain) {
        terms.maps.push_back(maps[channel - first_channel].data());
        terms.coefficients.push_back(1.0);
        return terms;
    }
    for (std::size_t r = 0; r < rank.skeletons.size(); ++r) {
        if (rank.coefficients(channel, r) == 0) continue;
        terms.maps.push_back(maps[r].data());
        terms.coefficients.push_back(rank.coefficients(channel, r));
    }
    return terms;
}

}  // namespace

void combine_skeletons(const JointRank& rank, const std::vector<std::vector<double>>& all,
                       std::size_t channel, std::size_t first_channel, std::size_t begin,
                       std::span<double> out) {
    const Terms terms = terms_of(rank, all, channel, first_channel);
    std::vector<const double*> maps(terms.maps.size());
    for (std::size_t first = 0; first < out.size(); first += pixel_block) {
        const std::size_t n = std::min(pixel_block, out.size() - first);
        for (std::size_t r = 0; r < maps.size(); ++r)
            maps[r] = terms.maps[r] + begin + first;
        combine_pixels(maps.data(), terms.coefficients.data(), maps.size(), out.data() + first, n);
    }
}

void undefine_marked(const std::vector<std::uint8_t>& marks, std::size_t begin, std::span<double> out) {
    for (std::size_t i = 0; i < out.size(); ++i)
        if (marks[begin + i] != 0) out[i] = undefined_pixel;
}

Alm combine_alms(std::span<const Alm* const> terms, const Matrix& weights, std::size_t channel) {
    constexpr std::int64_t block = 8192;
    Alm sum(terms.front()->lmax());
    const auto out = sum.values();
    parallel_for_blocks(
        static_cast<std::int64_t>(out.size()), block, [&](std::int64_t begin, std::int64_t end) {
            for (std::size_t k = 0; k < terms.size(); ++k) {
                const double weight = weights(channel, k);
                if (weight == 0) continue;
                const auto term = terms[k]->values();
                for (auto i = static_cast<std::size_t>(begin); i < static_cast<std::size_t>(end); ++i)
                    out[i] += weight * term[i];
            }
        });
    return sum;
}

}  // namespace foreglow
