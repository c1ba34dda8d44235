// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/regrid.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <utility>

#include "base/error.h"
#include "base/parallel.h"
#include "sphere/fill.h"
#include "sphere/rotation.h"

namespace foreglow {
namespace {

constexpr std::int64_t block = 4096;
constexpr double weight_from_filled_allowed = 0.01;

/// What lies above is aliased by the pixels beyond recovery (common practice).
int trusted_lmax(const HealpixGrid& grid, int lmax) {
    return std::min(lmax, 5 * grid.nside() / 2);
}

/// Calls work(index of the output pixel, stencil on the input) for a range of output pixels.
template <typename Work>
void for_each_stencil(const HealpixGrid& from_grid, Frame from, const HealpixGrid& to_grid, Frame to,
                      std::int64_t first, std::int64_t count, const Work& work) {
    const Matrix3 back = rotation_between(to, from);
    parallel_for_blocks(count, block, [&](std::int64_t begin, std::int64_t end) {
        std::vector<Vector3> directions(static_cast<std::size_t>(end - begin));
        to_grid.directions(first + begin, directions);
        for (std::size_t i = 0; i < directions.size(); ++i)
            work(static_cast<std::size_t>(begin) + i, from_grid.interpolation(rotate(back, directions[i])));
    });
}

double weighted_mean(std::span<const double> values, const HealpixGrid::Stencil& stencil) {
    double sum = 0, weight = 0;
    for (std::size_t k = 0; k < 4; ++k) {
        const double value = values[static_cast<std::size_t>(stencil.pixels[k])];
        // A weight of 0 must not bring a pixel in, nor an undefined one down.
        if (!is_defined(value) || !(stencil.weights[k] > 0)) continue;
        sum += stencil.weights[k] * value;
        weight += stencil.weights[k];
    }
    return weight > 0 ? sum / weight : undefined_pixel;
}

void undefine_near_filled(std::span<const double> original, const HealpixGrid& from_grid, Frame from,
                          const HealpixGrid& to_grid, Frame to, std::span<double> out) {
    for_each_stencil(from_grid, from, to_grid, to, 0, to_grid.npix(),
                     [&](std::size_t i, const HealpixGrid::Stencil& stencil) {
                         double filled = 0;
                         for (std::size_t k = 0; k < 4; ++k)
                             if (!is_defined(original[static_cast<std::size_t>(stencil.pixels[k])]))
                                 filled += stencil.weights[k];
                         if (filled > weight_from_filled_allowed) out[i] = undefined_pixel;
                     });
}

std::vector<double> filled_copy(const HealpixGrid& grid, std::span<const double> values) {
    std::vector<double> out(values.begin(), values.end());
    fill_undefined(grid, out);
    return out;
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
    for_each_stencil(map.grid, map.frame, to_grid, to_frame, first, count,
                     [&](std::size_t i, const HealpixGrid::Stencil& stencil) {
                         out[i] = weighted_mean(map.values, stencil);
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

RegriddedMap harmonic_regrid(const SkyMap& map, const HealpixGrid& to_grid, Frame to_frame, int lmax,
                             double tolerance) {
    RegriddedMap out{{to_grid, to_frame, map.unit, {}}, {}};
    out.report.lmax = trusted_lmax(map.grid, lmax);
    out.report.filled = count_undefined(map.values);
    ConvergenceOptions options;
    options.tolerance = tolerance;
    const bool complete = out.report.filled == 0;
    const std::vector<double> filled = complete ? std::vector<double>() : filled_copy(map.grid, map.values);
    auto analysed = analyse_converged(map.grid, complete ? map.values : filled, out.report.lmax, options);
    out.report.convergence = std::move(analysed.report);
    rotate_alm(analysed.alm, map.frame, to_frame);
    out.map.values = synthesize(analysed.alm, to_grid);
    if (!complete) undefine_near_filled(map.values, map.grid, map.frame, to_grid, to_frame, out.map.values);
    out.report.undefined = count_undefined(out.map.values);
    return out;
}

RegriddedStokes harmonic_regrid(const StokesMaps& maps, const HealpixGrid& to_grid, Frame to_frame, int lmax,
                                double tolerance) {
    RegriddedStokes out{{to_grid, to_frame, maps.unit, {}, {}}, {}};
    out.report.lmax = trusted_lmax(maps.grid, lmax);
    // A pixel that lacks one of Q and U has no polarization.
    std::vector<double> q = maps.q, u = maps.u;
    for (std::size_t i = 0; i < q.size(); ++i)
        if (!is_defined(q[i]) || !is_defined(u[i])) q[i] = u[i] = undefined_pixel;
    out.report.filled = count_undefined(q);
    const std::vector<double> original = out.report.filled > 0 ? q : std::vector<double>();
    fill_undefined(maps.grid, q);
    fill_undefined(maps.grid, u);
    ConvergenceOptions options;
    options.tolerance = tolerance;
    auto analysed = analyse_converged_spin2(maps.grid, q, u, out.report.lmax, options);
    out.report.convergence = std::move(analysed.report);
    rotate_alm(analysed.alm, maps.frame, to_frame);
    auto values = synthesize_spin2(analysed.alm, to_grid);
    out.maps.q = std::move(values.q);
    out.maps.u = std::move(values.u);
    if (!original.empty()) {
        undefine_near_filled(original, maps.grid, maps.frame, to_grid, to_frame, out.maps.q);
        undefine_near_filled(original, maps.grid, maps.frame, to_grid, to_frame, out.maps.u);
    }
    out.report.undefined = count_undefined(out.maps.q);
    return out;
}

std::vector<double> fraction_from_undefined(const SkyMap& map, std::span<const double> window,
                                            const HealpixGrid& to_grid, Frame to_frame) {
    FOREGLOW_EXPECTS(!window.empty() && window[0] != 0);
    std::vector<double> mask(map.values.size());
    for (std::size_t i = 0; i < mask.size(); ++i)
        mask[i] = is_defined(map.values[i]) ? 0.0 : 1.0;
    const int lmax = trusted_lmax(map.grid, static_cast<int>(window.size()) - 1);
    ConvergenceOptions once;
    once.tolerance = 0;
    once.max_iterations = 1;
    Alm alm = analyse_converged(map.grid, mask, lmax, once).alm;
    std::vector<double> normalised(window.begin(), window.end());
    for (double& b : normalised)
        b /= window[0];
    multiply_by_l(alm, normalised);
    rotate_alm(alm, map.frame, to_frame);
    auto out = synthesize(alm, to_grid);
    for (double& value : out)
        value = std::clamp(value, 0.0, 1.0);  // ringing of the mask's edge
    return out;
}

}  // namespace foreglow
