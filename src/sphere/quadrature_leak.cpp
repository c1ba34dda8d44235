// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/quadrature_leak.h"

#include <algorithm>
#include <array>
#include <cmath>

#include "base/error.h"

namespace foreglow {
namespace {

constexpr std::size_t rows = 8, columns = 16;  // of l and of l', each nside/4 wide
using Table = std::array<std::array<double, columns>, rows>;

// log10 of the error's mean C_l for C_l' = 1 in the band; spin 0, then spin 2.
constexpr std::array<Table, 2> log_leak{
    {{{{{-15.0, -12.9, -11.3, -10.2, -9.2, -8.8, -8.6, -7.3, -6.4, -6.2, -6.5, -6.3, -5.9, -5.9, -5.9, -5.5}},
       {{-13.4, -11.8, -10.6, -9.8, -8.9, -8.4, -8.1, -7.2, -6.4, -6.2, -6.5, -6.3, -5.9, -5.8, -5.6, -5.6}},
       {{-12.1, -10.8, -9.9, -9.3, -8.6, -8.1, -7.6, -7.1, -6.4, -6.2, -6.5, -6.3, -5.9, -5.6, -5.5, -5.7}},
       {{-11.2, -10.1, -9.3, -8.9, -8.2, -7.7, -7.2, -6.8, -6.4, -6.2, -6.4, -6.1, -5.6, -5.5, -5.6, -5.7}},
       {{-10.4, -9.5, -8.9, -8.5, -7.8, -7.4, -6.9, -6.5, -6.3, -6.2, -6.0, -5.7, -5.5, -5.5, -5.7, -5.7}},
       {{-9.7, -9.0, -8.5, -8.2, -7.5, -7.2, -6.6, -6.3, -6.3, -6.2, -5.8, -5.7, -5.6, -5.6, -5.7, -5.7}},
       {{-9.2, -8.5, -8.1, -7.8, -7.2, -6.9, -6.3, -6.0, -6.3, -6.0, -5.8, -5.8, -5.7, -5.6, -5.7, -5.6}},
       {{-8.8, -8.1, -7.8, -7.5, -6.9, -6.6, -6.0, -5.7, -6.0, -5.9, -5.9, -5.8, -5.7, -5.6, -5.7, -5.6}}}},
     {{{{-15.1, -13.0, -11.3, -10.3, -9.4, -8.9, -7.8, -7.6, -6.5, -6.0, -6.0, -6.2, -5.9, -6.0, -6.0, -5.4}},
       {{-13.3, -11.9, -10.7, -9.8, -8.9, -8.5, -7.7, -7.4, -6.5, -6.0, -6.0, -6.2, -5.9, -5.7, -5.6, -5.4}},
       {{-12.1, -10.9, -10.0, -9.3, -8.5, -8.1, -7.6, -7.2, -6.5, -6.0, -6.0, -6.2, -5.9, -5.4, -5.5, -5.6}},
       {{-11.1, -10.2, -9.4, -8.8, -8.0, -7.7, -7.3, -6.9, -6.4, -6.0, -6.0, -6.0, -5.7, -5.4, -5.6, -5.7}},
       {{-10.4, -9.5, -8.9, -8.4, -7.7, -7.4, -7.1, -6.7, -6.4, -6.0, -6.0, -5.7, -5.6, -5.5, -5.7, -5.7}},
       {{-9.7, -9.0, -8.4, -8.0, -7.3, -7.1, -6.8, -6.4, -6.3, -6.1, -5.8, -5.6, -5.7, -5.6, -5.7, -5.7}},
       {{-9.2, -8.5, -8.0, -7.7, -7.0, -6.8, -6.5, -6.1, -6.2, -6.0, -5.8, -5.7, -5.7, -5.6, -5.6, -5.6}},
       {{-8.8, -8.1, -7.7, -7.3, -6.8, -6.5, -6.2, -5.7, -6.0, -5.9, -5.8, -5.8, -5.7, -5.6, -5.6, -5.6}}}}}};

// Sum of 2 l + 1 over a band of l'.
double modes_of(std::size_t band, int nside) {
    const double low = static_cast<double>(band) * nside / 4;
    const double high = low + nside / 4.0;
    return high * high - low * low;
}

// What one mode of l' adds to the error's C_l, by interpolation of its logarithm between the middles of
// bands: within a band it grows by a factor of ten or a hundred, so that the band's mean is more than its
// middle has.
double leak_of_mode(const std::array<double, columns>& row, int l, int nside) {
    const auto value = [&](std::size_t c) { return row[c] - std::log10(modes_of(c, nside)); };
    const double place = 4.0 * l / nside - 0.5;
    const auto c =
        static_cast<std::size_t>(std::clamp(std::floor(place), 0.0, static_cast<double>(rows) - 2));
    const double slope = value(c + 1) - value(c);
    return std::pow(10.0, value(c) + slope * (place - static_cast<double>(c)));
}

}  // namespace

std::vector<double> predict_leak(std::span<const double> cl, double power_above, int nside, int spin) {
    FOREGLOW_EXPECTS(!cl.empty() && cl.size() <= 2 * static_cast<std::size_t>(nside) + 1);
    FOREGLOW_EXPECTS((spin == 0 || spin == 2) && power_above >= 0);
    const Table& table = log_leak[spin == 0 ? 0 : 1];
    std::array<double, rows> error{};
    for (std::size_t r = 0; r < rows; ++r) {
        double worst_above = 0;
        for (std::size_t c = rows; c < columns; ++c)
            worst_above = std::max(worst_above, std::pow(10.0, table[r][c]) / modes_of(c, nside));
        error[r] = worst_above * power_above;
        for (std::size_t l = 1; l < cl.size(); ++l)
            error[r] +=
                leak_of_mode(table[r], static_cast<int>(l), nside) * (2 * static_cast<double>(l) + 1) * cl[l];
    }
    std::vector<double> out(cl.size(), 0.0);
    for (std::size_t l = 2; l < out.size(); ++l)
        out[l] = error[std::min(rows - 1, 4 * l / static_cast<std::size_t>(nside))];
    return out;
}

}  // namespace foreglow
