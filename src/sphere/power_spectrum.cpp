// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/power_spectrum.h"

#include <algorithm>
#include <cmath>

#include "base/constants.h"
#include "base/error.h"
#include "base/parallel.h"

namespace foreglow {
namespace {

constexpr int partial_sums = 16;  // fixed, so that the order of additions does not know the number of threads

}  // namespace

std::vector<double> cross_spectrum(const Alm& a, const Alm& b) {
    const int lmax = std::min(a.lmax(), b.lmax());
    const auto length = static_cast<std::size_t>(lmax) + 1;
    std::vector<std::vector<double>> partial(partial_sums, std::vector<double>(length));
    parallel_for_blocks(partial_sums, 1, [&](std::int64_t part, std::int64_t) {
        auto& sum = partial[static_cast<std::size_t>(part)];
        for (int m = static_cast<int>(part); m <= lmax; m += partial_sums) {
            const auto ca = a.column(m), cb = b.column(m);
            const double weight = m == 0 ? 1.0 : 2.0;
            for (std::size_t i = 0; i <= static_cast<std::size_t>(lmax - m); ++i)
                sum[i + static_cast<std::size_t>(m)] +=
                    weight * (ca[i].real() * cb[i].real() + ca[i].imag() * cb[i].imag());
        }
    });
    std::vector<double> out(length);
    for (std::size_t l = 0; l < length; ++l) {
        for (const auto& sum : partial)
            out[l] += sum[l];
        out[l] /= 2.0 * static_cast<double>(l) + 1.0;
    }
    return out;
}

std::vector<double> power_spectrum(const Alm& alm) {
    return cross_spectrum(alm, alm);
}

double rms_of_spectrum(std::span<const double> cl, std::span<const double> window, int first_l) {
    FOREGLOW_EXPECTS(first_l >= 0);
    const std::size_t end = window.empty() ? cl.size() : std::min(cl.size(), window.size());
    double sum = 0;
    for (std::size_t l = static_cast<std::size_t>(first_l); l < end; ++l) {
        const double b = window.empty() ? 1.0 : window[l];
        sum += (2.0 * static_cast<double>(l) + 1.0) * cl[l] * b * b;
    }
    return std::sqrt(sum / (4.0 * constants::pi));
}

double relative_rms(std::span<const double> error_cl, std::span<const double> map_cl,
                    std::span<const std::vector<double>> windows) {
    const auto ratio = [&](std::span<const double> window) {
        const double map = rms_of_spectrum(map_cl, window);
        return map > 0 ? rms_of_spectrum(error_cl, window) / map : 0.0;
    };
    double worst = windows.empty() ? ratio({}) : 0.0;
    for (const std::vector<double>& window : windows)
        worst = std::max(worst, ratio(window));
    return worst;
}

}  // namespace foreglow
