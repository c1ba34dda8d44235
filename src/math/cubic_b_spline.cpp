// SPDX-License-Identifier: GPL-2.0-or-later
#include "math/cubic_b_spline.h"

#include <vector>

#include "base/error.h"

namespace foreglow {

void make_b_spline_coefficients(std::span<double> values, std::size_t stride) {
    FOREGLOW_EXPECTS(stride >= 1 && values.size() % stride == 0 && values.size() / stride >= 3);
    const std::size_t n = values.size() / stride;
    // At the ends c_{-1} = 2 c_0 - c_1 makes the second derivative zero, and then c_0 is the value itself.
    std::vector<double> pivot(n, 0.0);
    const auto row = [&](std::size_t i) { return values.subspan(i * stride, stride); };
    for (std::size_t i = 1; i + 1 < n; ++i) {
        pivot[i] = 1 / (4 - pivot[i - 1]);
        const auto before = row(i - 1);
        const auto here = row(i);
        for (std::size_t j = 0; j < stride; ++j)
            here[j] = (6 * here[j] - before[j]) * pivot[i];
    }
    for (std::size_t i = n - 2; i >= 1; --i) {
        const auto after = row(i + 1);
        const auto here = row(i);
        for (std::size_t j = 0; j < stride; ++j)
            here[j] -= pivot[i] * after[j];
    }
}

}  // namespace foreglow
