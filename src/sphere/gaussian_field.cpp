// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/gaussian_field.h"

#include <algorithm>
#include <cmath>
#include <cstdint>
#include <vector>

#include "base/error.h"
#include "base/parallel.h"

namespace foreglow {

Alm make_gaussian_alm(std::span<const double> cl, int lmax, const RandomKey& key) {
    Alm out(lmax);
    std::vector<double> sigma(cl.size());
    for (std::size_t l = 0; l < cl.size(); ++l) {
        FOREGLOW_EXPECTS(cl[l] >= 0 && std::isfinite(cl[l]));
        sigma[l] = std::sqrt(cl[l]);
    }
    const int last = std::min(lmax, static_cast<int>(cl.size()) - 1);
    parallel_for_blocks(last + 1, 8, [&](std::int64_t begin, std::int64_t end) {
        for (int m = static_cast<int>(begin); m < static_cast<int>(end); ++m)
            for (int l = m; l <= last; ++l) {
                const auto pair =
                    normal_pair(key, static_cast<std::uint32_t>(l), static_cast<std::uint32_t>(m));
                const double s = sigma[static_cast<std::size_t>(l)];
                out(l, m) = m == 0 ? Alm::Value(s * pair[0], 0.0)
                                   : Alm::Value(s * std::sqrt(0.5) * pair[0], s * std::sqrt(0.5) * pair[1]);
            }
    });
    return out;
}

}  // namespace foreglow
