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
        std::vector<double> re(static_cast<std::size_t>(last) + 1), im(re.size());
        for (int m = static_cast<int>(begin); m < static_cast<int>(end); ++m) {
            const std::size_t n = static_cast<std::size_t>(last) + 1 - static_cast<std::size_t>(m);
            normal_pairs(key, static_cast<std::uint32_t>(m), static_cast<std::uint32_t>(m),
                         std::span(re).first(n), std::span(im).first(n));
            const auto column = out.column(m);
            const std::span<const double> s = std::span(sigma).subspan(static_cast<std::size_t>(m), n);
            if (m == 0)
                for (std::size_t i = 0; i < n; ++i)
                    column[i] = {s[i] * re[i], 0.0};
            else
                for (std::size_t i = 0; i < n; ++i) {
                    const double share = s[i] * std::sqrt(0.5);
                    column[i] = {share * re[i], share * im[i]};
                }
        }
    });
    return out;
}

}  // namespace foreglow
