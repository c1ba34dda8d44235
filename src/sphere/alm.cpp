// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/alm.h"

#include <algorithm>

#include "base/error.h"
#include "base/parallel.h"

namespace foreglow {
namespace {

constexpr std::int64_t columns_at_once = 16;

std::size_t alm_size(int lmax) {
    FOREGLOW_EXPECTS(lmax >= 0);
    const auto n = static_cast<std::size_t>(lmax);
    return (n + 1) * (n + 2) / 2;
}

}  // namespace

Alm::Alm(int lmax) : lmax_(lmax), values_(alm_size(lmax)) {}

std::span<const Alm::Value> Alm::column(int m) const {
    return values().subspan(index(m, m), static_cast<std::size_t>(lmax_) + 1 - static_cast<std::size_t>(m));
}

std::span<Alm::Value> Alm::column(int m) {
    return values().subspan(index(m, m), static_cast<std::size_t>(lmax_) + 1 - static_cast<std::size_t>(m));
}

Alm with_lmax(const Alm& alm, int lmax) {
    Alm out(lmax);
    for (int m = 0; m <= std::min(lmax, alm.lmax()); ++m) {
        const auto from = alm.column(m);
        const auto to = out.column(m);
        std::copy_n(from.begin(), std::min(from.size(), to.size()), to.begin());
    }
    return out;
}

void add_scaled(Alm& alm, double factor, const Alm& other) {
    const int lmax = std::min(alm.lmax(), other.lmax());
    parallel_for_blocks(lmax + 1, columns_at_once, [&](std::int64_t begin, std::int64_t end) {
        for (int m = static_cast<int>(begin); m < static_cast<int>(end); ++m) {
            const auto to = alm.column(m);
            const auto from = other.column(m);
            for (std::size_t i = 0; i <= static_cast<std::size_t>(lmax - m); ++i)
                to[i] += factor * from[i];
        }
    });
}

void multiply_by_l(Alm& alm, std::span<const double> factors) {
    parallel_for_blocks(alm.lmax() + 1, columns_at_once, [&](std::int64_t begin, std::int64_t end) {
        for (int m = static_cast<int>(begin); m < static_cast<int>(end); ++m) {
            const auto column = alm.column(m);
            for (std::size_t i = 0; i < column.size(); ++i) {
                const std::size_t l = i + static_cast<std::size_t>(m);
                column[i] *= l < factors.size() ? factors[l] : 0.0;
            }
        }
    });
}

}  // namespace foreglow
