// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/filled_share.h"

#include <algorithm>
#include <cmath>

#include "base/parallel.h"
#include "sphere/harmonics.h"
#include "sphere/rotation.h"
#include "sphere/sky_map.h"

namespace foreglow {
namespace {

constexpr double negligible =
    1e-3;  // of the window; what lies above that l cannot move a share by a threshold of 1 %

double sigma_of(Angle fwhm) {
    return fwhm.radians() / std::sqrt(8 * std::log(2.0));
}

int last_useful_l(Angle fwhm) {
    return static_cast<int>(std::ceil(std::sqrt(-2 * std::log(negligible)) / sigma_of(fwhm)));
}

}  // namespace

Angle equivalent_fwhm(const BeamWindow& window, const HealpixGrid& grid) {
    const Angle pixel = Angle::from_radians(std::sqrt(grid.pixel_area()));
    std::size_t l = 1;
    while (l < window.temperature.size() &&
           std::abs(window.temperature[l]) > 0.5 * std::abs(window.temperature[0]))
        ++l;
    if (l == window.temperature.size()) {
        // The window has not fallen to 1/2 by lmax: continue it as a Gaussian.
        const double ell = static_cast<double>(l - 1);
        const double fall =
            -std::log(std::min(std::abs(window.temperature[l - 1] / window.temperature[0]), 1.0 - 1e-12));
        const double sigma = std::sqrt(2 * fall / std::max(ell * (ell + 1), 1.0));
        return std::max(pixel, Angle::from_radians(sigma * std::sqrt(8 * std::log(2.0))));
    }
    const double ell = static_cast<double>(l);
    const double sigma = std::sqrt(2 * std::log(2.0) / (ell * (ell + 1)));
    return std::max(pixel, Angle::from_radians(sigma * std::sqrt(8 * std::log(2.0))));
}

FilledShare::FilledShare(const HealpixGrid& grid, Frame frame, std::span<const double> values,
                         Angle narrowest)
    : grid_(grid), frame_(frame) {
    if (std::all_of(values.begin(), values.end(), is_defined)) return;
    const int wanted = last_useful_l(narrowest);
    int nside = grid.nside();
    while (2 * nside < wanted && nside < 4 * grid.nside() && nside < HealpixGrid::max_nside)
        nside *= 2;
    const HealpixGrid fine(nside);
    std::vector<double> mask(static_cast<std::size_t>(fine.npix()));
    // In nested numbers the children of pixel n are family n, family n + 1, ...
    const std::int64_t family = fine.npix() / grid.npix(), parents = 4096 / family;
    parallel_for_blocks(grid.npix(), parents, [&](std::int64_t begin, std::int64_t end) {
        std::vector<std::int64_t> parent(static_cast<std::size_t>(end - begin));
        std::vector<std::int64_t> children(parent.size() * static_cast<std::size_t>(family));
        grid.ring_numbers(begin, parent);
        fine.ring_numbers(begin * family, children);
        for (std::size_t n = 0; n < children.size(); ++n) {
            const auto p = static_cast<std::size_t>(parent[n / static_cast<std::size_t>(family)]);
            mask[static_cast<std::size_t>(children[n])] = is_defined(values[p]) ? 0.0 : 1.0;
        }
    });
    alm_ = analyse(fine, mask, std::max(2, std::min(wanted, 2 * nside)));
}

Alm FilledShare::smoothed(Angle fwhm, Frame frame) const {
    Alm alm = *alm_;
    multiply_by_l(alm, make_gaussian_beam(fwhm, alm.lmax()).temperature);
    if (frame != frame_) rotate_alm(alm, frame_, frame);
    return alm;
}

std::vector<double> FilledShare::under_beam(Angle fwhm, Frame frame) const {
    return synthesize(smoothed(fwhm, frame), grid_);
}

std::vector<double> FilledShare::on_strip(Angle fwhm, Frame frame, const RingStrip& strip) const {
    std::vector<double> shares(static_cast<std::size_t>(pixel_count(grid_, strip)));
    synthesize_strip(smoothed(fwhm, frame), grid_, strip, shares);
    return shares;
}

}  // namespace foreglow
