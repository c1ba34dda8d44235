// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/regrid.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <utility>

#include "base/error.h"
#include "base/parallel.h"
#include "sphere/bilinear.h"
#include "sphere/fill.h"
#include "sphere/rotation.h"

namespace foreglow {
namespace {

constexpr std::int64_t block = 4096;
constexpr std::int64_t long_block = 32768;  // whole rings but for the finest grids

void undefine_near_filled(const SkyMap& filled, const HealpixGrid& to_grid, Frame to_frame,
                          std::span<double> out) {
    std::vector<double> share(out.size());
    interpolate_pixels(filled, to_grid, to_frame, 0, share);
    for (std::size_t i = 0; i < out.size(); ++i)
        if (share[i] > largest_filled_share) out[i] = undefined_pixel;
}

// Returns 1 where a value is undefined; nothing where none is.
std::vector<double> mark_undefined(std::span<const double> values) {
    if (count_undefined(values) == 0) return {};
    std::vector<double> filled(values.size());
    for (std::size_t i = 0; i < values.size(); ++i)
        filled[i] = is_defined(values[i]) ? 0.0 : 1.0;
    return filled;
}

double mean_over_children(std::span<const double> values, std::span<const double> weights,
                          std::span<const std::int64_t> children) {
    double sum = 0, weight = 0, plain = 0;
    int defined = 0;
    for (const std::int64_t child : children) {
        const double value = values[static_cast<std::size_t>(child)];
        if (!is_defined(value)) continue;
        plain += value;
        ++defined;
        if (weights.empty()) continue;
        const double w = std::abs(weights[static_cast<std::size_t>(child)]);
        if (!is_defined(w)) continue;
        sum += w * value;
        weight += w;
    }
    if (weight > 0) return sum / weight;
    return defined > 0 ? plain / defined : undefined_pixel;
}

}  // namespace

void interpolate_pixels(const SkyMap& map, const HealpixGrid& to_grid, Frame to_frame, std::int64_t first,
                        std::span<double> out) {
    const auto count = static_cast<std::int64_t>(out.size());
    FOREGLOW_EXPECTS(static_cast<std::int64_t>(map.values.size()) == map.grid.npix());
    FOREGLOW_EXPECTS(first >= 0 && first + count <= to_grid.npix());
    if (map.grid == to_grid && map.frame == to_frame) {
        std::copy_n(map.values.begin() + first, count, out.begin());
        return;
    }
    const BilinearSampler sampler(map.grid);
    const Matrix3 back = rotation_between(to_frame, map.frame);
    parallel_for_blocks(count, long_block, [&](std::int64_t begin, std::int64_t end) {
        const auto part = out.subspan(static_cast<std::size_t>(begin), static_cast<std::size_t>(end - begin));
        if (map.frame == to_frame)
            sampler.sample(map.values, to_grid, first + begin, part);
        else
            sampler.sample(map.values, back, to_grid, first + begin, part);
    });
}

SkyMap interpolate(const SkyMap& map, const HealpixGrid& to_grid, Frame to_frame) {
    SkyMap out{to_grid, to_frame, map.unit, std::vector<double>(static_cast<std::size_t>(to_grid.npix()))};
    interpolate_pixels(map, to_grid, to_frame, 0, out.values);
    return out;
}

std::vector<double> degrade(const HealpixGrid& grid, std::span<const double> values,
                            const HealpixGrid& to_grid, std::span<const double> weights) {
    FOREGLOW_EXPECTS(static_cast<std::int64_t>(values.size()) == grid.npix());
    FOREGLOW_EXPECTS(weights.empty() || weights.size() == values.size());
    FOREGLOW_EXPECTS(to_grid.nside() <= grid.nside());
    const std::int64_t family = grid.npix() / to_grid.npix();
    std::vector<double> out(static_cast<std::size_t>(to_grid.npix()));
    const std::int64_t parents = std::max<std::int64_t>(1, block / family);
    parallel_for_blocks(to_grid.npix(), parents, [&](std::int64_t begin, std::int64_t end) {
        std::vector<std::int64_t> children(static_cast<std::size_t>(family));
        for (std::int64_t nested = begin; nested < end; ++nested) {
            grid.ring_numbers(nested * family, children);
            out[static_cast<std::size_t>(to_grid.nested_to_ring(nested))] =
                mean_over_children(values, weights, children);
        }
    });
    return out;
}

int trusted_lmax(const HealpixGrid& grid, int lmax) {
    return std::min(lmax, std::max(2, 5 * grid.nside() / 2));
}

AnalysedMap analyse_filled(const SkyMap& map, int lmax, double tolerance) {
    AnalysedMap out;
    out.filled = mark_undefined(map.values);
    std::vector<double> copy;
    if (!out.filled.empty()) {
        copy = map.values;
        fill_undefined(map.grid, copy);
    }
    ConvergenceOptions options;
    options.tolerance = tolerance;
    ConvergedAlm result =
        analyse_converged(map.grid, copy.empty() ? map.values : copy, trusted_lmax(map.grid, lmax), options);
    out.alm = std::move(result.alm);
    out.convergence = std::move(result.report);
    return out;
}

AnalysedStokes analyse_filled(const StokesMaps& maps, int lmax, double tolerance) {
    AnalysedStokes out;
    // A pixel that lacks one of Q and U has no polarization.
    std::vector<double> q = maps.q, u = maps.u;
    for (std::size_t i = 0; i < q.size(); ++i)
        if (!is_defined(q[i]) || !is_defined(u[i])) q[i] = u[i] = undefined_pixel;
    out.filled = mark_undefined(q);
    if (!out.filled.empty()) {
        fill_undefined(maps.grid, q);
        fill_undefined(maps.grid, u);
    }
    ConvergenceOptions options;
    options.tolerance = tolerance;
    ConvergedAlmEB result = analyse_converged_spin2(maps.grid, q, u, trusted_lmax(maps.grid, lmax), options);
    out.alm = std::move(result.alm);
    out.convergence = std::move(result.report);
    return out;
}

SkyMap harmonic_regrid(const SkyMap& map, const HealpixGrid& to_grid, Frame to_frame, int lmax,
                       double tolerance) {
    AnalysedMap analysed = analyse_filled(map, lmax, tolerance);
    rotate_alm(analysed.alm, map.frame, to_frame);
    SkyMap out{to_grid, to_frame, map.unit, synthesize(analysed.alm, to_grid)};
    if (!analysed.filled.empty())
        undefine_near_filled({map.grid, map.frame, "", std::move(analysed.filled)}, to_grid, to_frame,
                             out.values);
    return out;
}

StokesMaps harmonic_regrid(const StokesMaps& maps, const HealpixGrid& to_grid, Frame to_frame, int lmax,
                           double tolerance) {
    AnalysedStokes analysed = analyse_filled(maps, lmax, tolerance);
    rotate_alm(analysed.alm, maps.frame, to_frame);
    StokesValues values = synthesize_spin2(analysed.alm, to_grid);
    StokesMaps out{to_grid, to_frame, maps.unit, std::move(values.q), std::move(values.u)};
    if (analysed.filled.empty()) return out;
    const SkyMap filled{maps.grid, maps.frame, "", std::move(analysed.filled)};
    undefine_near_filled(filled, to_grid, to_frame, out.q);
    undefine_near_filled(filled, to_grid, to_frame, out.u);
    return out;
}

}  // namespace foreglow
