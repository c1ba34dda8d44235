// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/fill.h"

#include <cmath>
#include <utility>
#include <vector>

#include "base/error.h"
#include "base/parallel.h"
#include "sphere/regrid.h"
#include "sphere/sky_map.h"

namespace foreglow {
namespace {

constexpr std::int64_t block = 4096;
constexpr int sweeps_per_level =
    8;  // enough to take the coarser level's pixels out of sight; the rest is for that level

std::vector<std::int64_t> list_undefined(std::span<const double> values) {
    std::vector<std::int64_t> out;
    for (std::size_t i = 0; i < values.size(); ++i)
        if (!is_defined(values[i])) out.push_back(static_cast<std::int64_t>(i));
    return out;
}

double mean_of_defined(std::span<const double> values) {
    double sum = 0;
    std::int64_t count = 0;
    for (const double value : values)
        if (is_defined(value)) {
            sum += value;
            ++count;
        }
    return sum / static_cast<double>(count);
}

/// Replaces the holes by the means of their neighbours, a few times; all from the values of the sweep before.
void smooth_holes(const HealpixGrid& grid, std::span<double> values, const std::vector<std::int64_t>& holes) {
    std::vector<double> next(holes.size());
    const auto count = static_cast<std::int64_t>(holes.size());
    for (int sweep = 0; sweep < sweeps_per_level; ++sweep) {
        parallel_for_blocks(count, block, [&](std::int64_t begin, std::int64_t end) {
            for (auto i = static_cast<std::size_t>(begin); i < static_cast<std::size_t>(end); ++i) {
                double sum = 0;
                int found = 0;
                for (const std::int64_t neighbour : grid.neighbours(holes[i]))
                    if (neighbour >= 0) {
                        sum += values[static_cast<std::size_t>(neighbour)];
                        ++found;
                    }
                next[i] = sum / found;
            }
        });
        for (std::size_t i = 0; i < holes.size(); ++i)
            values[static_cast<std::size_t>(holes[i])] = next[i];
    }
}

/// Fills from a coarser map that has no holes any more.
void fill_from_coarser(const HealpixGrid& grid, std::span<double> values,
                       const std::vector<std::int64_t>& holes, const HealpixGrid& coarse_grid,
                       std::span<const double> coarse) {
    parallel_for_blocks(
        static_cast<std::int64_t>(holes.size()), block, [&](std::int64_t begin, std::int64_t end) {
            for (auto i = static_cast<std::size_t>(begin); i < static_cast<std::size_t>(end); ++i) {
                const auto stencil = coarse_grid.interpolation(grid.direction(holes[i]));
                double value = 0;
                for (std::size_t k = 0; k < 4; ++k)
                    value += stencil.weights[k] * coarse[static_cast<std::size_t>(stencil.pixels[k])];
                values[static_cast<std::size_t>(holes[i])] = value;
            }
        });
    smooth_holes(grid, values, holes);
}

}  // namespace

std::int64_t count_undefined(std::span<const double> values) {
    return static_cast<std::int64_t>(
        parallel_sum(static_cast<std::int64_t>(values.size()), std::int64_t{1} << 18,
                     [&](std::int64_t begin, std::int64_t end) {
                         std::int64_t count = 0;
                         for (std::int64_t i = begin; i < end; ++i)
                             count += !is_defined(values[static_cast<std::size_t>(i)]);
                         return static_cast<double>(count);
                     }));
}

void fill_undefined(const HealpixGrid& grid, std::span<double> values) {
    FOREGLOW_EXPECTS(static_cast<std::int64_t>(values.size()) == grid.npix());
    const std::int64_t undefined = count_undefined(values);
    if (undefined == 0) return;
    if (undefined == grid.npix())
        throw DataError("a map holds no defined pixel, so there is nothing to fill it from");
    const auto holes = list_undefined(values);
    if (grid.nside() == 1) {
        const double mean = mean_of_defined(values);
        for (const std::int64_t hole : holes)
            values[static_cast<std::size_t>(hole)] = mean;
        return;
    }
    const HealpixGrid coarse_grid(grid.nside() / 2);
    std::vector<double> coarse = degrade(grid, values, coarse_grid);
    fill_undefined(coarse_grid, coarse);
    fill_from_coarser(grid, values, holes, coarse_grid, coarse);
}

}  // namespace foreglow
