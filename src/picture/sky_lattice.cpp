// SPDX-License-Identifier: GPL-2.0-or-later
#include "picture/sky_lattice.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>

#include "base/error.h"
#include "base/parallel.h"

namespace foreglow {
namespace {

constexpr double pi = std::numbers::pi;
constexpr std::int64_t rows_a_block = 8;

/// Writes the pixels under places half a picture pixel apart on a level line of the ellipse.
void locate_line(const HealpixGrid& grid, double height, std::span<std::int32_t> pixels) {
    std::fill(pixels.begin(), pixels.end(), SkyLattice::outside);
    // Mollweide::direction_at along a row: the latitude is one, and longitude runs evenly.
    const double cos_t = std::sqrt((1 - height) * (1 + height));
    const double sin_latitude = 2 * (std::asin(height) + height * cos_t) / pi;
    const double cos_latitude = std::sqrt(std::max(0.0, (1 - sin_latitude) * (1 + sin_latitude)));
    const auto count = static_cast<double>(pixels.size());
    const auto x_at = [count](std::size_t k) { return (static_cast<double>(k) + 0.5) * 2 / count - 1; };
    std::size_t begin = 0;
    while (begin < pixels.size() / 2 && x_at(begin) * x_at(begin) + height * height > 1)
        ++begin;
    std::vector<double> turns;
    turns.reserve(pixels.size());
    for (std::size_t k = begin; k < pixels.size() - begin; ++k) {
        const double turn = -0.5 * x_at(k) / cos_t;
        turns.push_back(turn < 0 ? turn + 1 : turn);
    }
    grid.pixels_on_parallel(sin_latitude, cos_latitude, turns, pixels.subspan(begin, turns.size()));
}

/// Counts the places of a pixel at the rim or near undefined sky one by one.
void sample_carefully(const SkyMap& map, const std::array<std::int32_t, 4>& places, std::size_t index,
                      SkyRaster& raster) {
    double sum = 0;
    int defined = 0, undefined = 0;
    for (const std::int32_t place : places) {
        if (place == SkyLattice::outside) continue;
        const double value = map.values[static_cast<std::size_t>(place)];
        if (is_defined(value)) {
            sum += value;
            ++defined;
        } else {
            ++undefined;
        }
    }
    if (defined > 0) raster.values[index] = sum / defined;
    if (undefined > 0)
        raster.undefined_shares[index] =
            static_cast<float>(undefined) / static_cast<float>(defined + undefined);
}

}  // namespace

void SkyLattice::locate_row(const HealpixGrid& grid, int width, int height, int row,
                            std::span<std::int32_t> pixels) {
    const std::size_t line = 2 * static_cast<std::size_t>(width);
    FOREGLOW_EXPECTS(pixels.size() == 2 * line);
    for (std::size_t b = 0; b < 2; ++b)
        locate_line(grid, 1 - 2 * (row + (static_cast<double>(b) + 0.5) / 2) / height,
                    pixels.subspan(b * line, line));
}

void SkyLattice::sample_row(const SkyMap& map, std::span<const std::int32_t> pixels, int row,
                            SkyRaster& raster) {
    const auto width = static_cast<std::size_t>(raster.width), line = 2 * width;
    const double* const values = map.values.data();
    for (std::size_t i = 0; i < width; ++i) {
        const std::array<std::int32_t, 4> places{pixels[2 * i], pixels[2 * i + 1], pixels[line + 2 * i],
                                                 pixels[line + 2 * i + 1]};
        const std::size_t index = static_cast<std::size_t>(row) * width + i;
        if ((places[0] | places[1] | places[2] | places[3]) >= 0) {
            const double mean =
                (values[places[0]] + values[places[1]] + values[places[2]] + values[places[3]]) / 4;
            if (is_defined(mean)) {
                raster.values[index] = mean;
                continue;
            }
        }
        sample_carefully(map, places, index, raster);
    }
}

SkyLattice::SkyLattice(const HealpixGrid& grid, int width, int height)
    : grid_(grid),
      width_(width),
      height_(height),
      pixels_(4 * static_cast<std::size_t>(width) * static_cast<std::size_t>(height)) {
    FOREGLOW_EXPECTS(width > 0 && height > 0);
    const std::size_t row_size = 4 * static_cast<std::size_t>(width);
    parallel_for_blocks(height, rows_a_block, [&](std::int64_t begin, std::int64_t end) {
        for (auto j = static_cast<int>(begin); j < end; ++j)
            locate_row(grid, width, height, j,
                       std::span(pixels_).subspan(static_cast<std::size_t>(j) * row_size, row_size));
    });
}

SkyRaster SkyLattice::sample(const SkyMap& map) const {
    FOREGLOW_EXPECTS(map.grid == grid_ && static_cast<std::int64_t>(map.values.size()) == grid_.npix());
    SkyRaster raster = make_empty_raster(width_, height_);
    const std::size_t row_size = 4 * static_cast<std::size_t>(width_);
    parallel_for_blocks(height_, rows_a_block, [&](std::int64_t begin, std::int64_t end) {
        for (auto j = static_cast<int>(begin); j < end; ++j)
            sample_row(map, std::span(pixels_).subspan(static_cast<std::size_t>(j) * row_size, row_size), j,
                       raster);
    });
    return raster;
}

}  // namespace foreglow
