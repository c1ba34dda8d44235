// SPDX-License-Identifier: GPL-2.0-or-later
#include "picture/sky_raster.h"

#include <algorithm>
#include <cmath>
#include <numbers>

#include "base/error.h"
#include "base/parallel.h"
#include "picture/sky_lattice.h"
#include "sphere/projection.h"

namespace foreglow {
namespace {

constexpr double pi = std::numbers::pi;
constexpr std::int64_t rows_a_block = 8;

/// What has fallen into one picture pixel so far.
struct Heap {
    double sum = 0;
    int defined = 0, undefined = 0;

    void add(double value) {
        if (is_defined(value)) {
            sum += value;
            ++defined;
        } else {
            ++undefined;
        }
    }
    [[nodiscard]] bool is_empty() const { return defined + undefined == 0; }
    void write_to(SkyRaster& raster, std::size_t index) const {
        if (is_empty()) return;
        if (defined > 0) raster.values[index] = sum / defined;
        raster.undefined_shares[index] =
            static_cast<float>(undefined) / static_cast<float>(defined + undefined);
    }
};

double value_at(const SkyMap& map, const Vector3& direction) {
    return map.values[static_cast<std::size_t>(map.grid.pixel_at(direction))];
}

/// Calls visit(x, y) for side * side places spread over the picture pixel (i, j).
template <typename Visit>
void for_each_place(int i, int j, int side, const Visit& visit) {
    for (int b = 0; b < side; ++b)
        for (int a = 0; a < side; ++a)
            visit(i + (a + 0.5) / side, j + (b + 0.5) / side);
}

/// Puts every map pixel of one ring into the heaps of its picture row: on this projection a ring is a level
/// line.
void add_ring(const SkyMap& map, const HealpixGrid::Ring& ring, double height, std::vector<Heap>& row) {
    const double cos_t = std::sqrt(std::max(0.0, 1 - height * height));
    const auto width = static_cast<double>(row.size());
    const double* const values = map.values.data() + ring.first_pixel;
    for (int i = 0; i < ring.pixels; ++i) {
        double turns = ring.phi0 / (2 * pi) + static_cast<double>(i) / ring.pixels;
        if (turns > 0.5) turns -= 1;
        const double x = (0.5 - turns * cos_t) * width;
        row[static_cast<std::size_t>(std::clamp(x, 0.0, width - 1))].add(values[i]);
    }
}

/// Returns the height of a ring on the ellipse, 1 at the north pole and -1 at the south pole.
double height_of(const HealpixGrid::Ring& ring) {
    return Mollweide().position_of({ring.sin_theta, 0, ring.cos_theta}).y;
}

Heap sample_ellipse(const SkyMap& map, int i, int j, const SkyRaster& raster, int side) {
    const Mollweide projection;
    Heap heap;
    for_each_place(i, j, side, [&](double x, double y) {
        const auto direction = projection.direction_at(4 * x / raster.width - 2, 1 - 2 * y / raster.height);
        if (direction) heap.add(value_at(map, *direction));
    });
    return heap;
}

void fill_row_by_rings(const SkyMap& map, const std::vector<double>& heights, int j, SkyRaster& raster) {
    std::vector<Heap> row(static_cast<std::size_t>(raster.width));
    const double top = 1 - 2.0 * j / raster.height, bottom = 1 - 2.0 * (j + 1) / raster.height;
    const auto begin =
        std::partition_point(heights.begin(), heights.end(), [&](double h) { return h > top; });
    const auto end = std::partition_point(begin, heights.end(), [&](double h) { return h > bottom; });
    for (auto it = begin; it != end; ++it)
        add_ring(map, map.grid.ring(static_cast<int>(it - heights.begin())), *it, row);
    for (int i = 0; i < raster.width; ++i) {
        Heap& heap = row[static_cast<std::size_t>(i)];
        if (heap.is_empty()) heap = sample_ellipse(map, i, j, raster, 2);
        heap.write_to(raster, static_cast<std::size_t>(j) * static_cast<std::size_t>(raster.width) + i);
    }
}

}  // namespace

SkyRaster make_empty_raster(int width, int height) {
    const auto count = static_cast<std::size_t>(width) * static_cast<std::size_t>(height);
    return {width, height, std::vector<double>(count, undefined_pixel), std::vector<float>(count, 0.0F)};
}

bool is_finer_than_picture(const HealpixGrid& grid, int width, int height) {
    // At 1.5 map pixels a picture pixel along the equator every picture pixel inside gets two or more.
    return 4.0 * grid.nside() >= 1.5 * width && grid.ring_count() >= 3 * height;
}

SkyRaster make_all_sky_raster(const SkyMap& map, int width, int height) {
    FOREGLOW_EXPECTS(width > 0 && height > 0);
    FOREGLOW_EXPECTS(static_cast<std::int64_t>(map.values.size()) == map.grid.npix());
    SkyRaster raster = make_empty_raster(width, height);
    const bool is_fine = is_finer_than_picture(map.grid, width, height);
    std::vector<double> heights;
    if (is_fine) {
        heights.resize(static_cast<std::size_t>(map.grid.ring_count()));
        parallel_for_blocks(map.grid.ring_count(), 256, [&](std::int64_t begin, std::int64_t end) {
            for (std::int64_t r = begin; r < end; ++r)
                heights[static_cast<std::size_t>(r)] = height_of(map.grid.ring(static_cast<int>(r)));
        });
    }
    parallel_for_blocks(height, rows_a_block, [&](std::int64_t begin, std::int64_t end) {
        std::vector<std::int32_t> places(is_fine ? 0 : 4 * static_cast<std::size_t>(width));
        for (auto j = static_cast<int>(begin); j < end; ++j) {
            if (is_fine) {
                fill_row_by_rings(map, heights, j, raster);
                continue;
            }
            SkyLattice::locate_row(map.grid, width, height, j, places);
            SkyLattice::sample_row(map, places, j, raster);
        }
    });
    return raster;
}

SkyRaster make_close_up_raster(const SkyMap& map, Angle longitude, Angle latitude, Angle size, int width) {
    FOREGLOW_EXPECTS(width > 0 && size.degrees() > 0 && size.degrees() <= 120);
    FOREGLOW_EXPECTS(static_cast<std::int64_t>(map.values.size()) == map.grid.npix());
    SkyRaster raster = make_empty_raster(width, width);
    const Gnomonic plane(longitude, latitude);
    const double across = 2 * std::tan(size.radians() / 2), step = across / width;
    // Enough places that no map pixel is missed where the picture's pixels are the larger ones.
    const int side =
        std::clamp(static_cast<int>(std::ceil(step / std::sqrt(map.grid.pixel_area()))) + 1, 2, 8);
    parallel_for_blocks(width, rows_a_block, [&](std::int64_t begin, std::int64_t end) {
        for (auto j = static_cast<int>(begin); j < end; ++j)
            for (int i = 0; i < width; ++i) {
                Heap heap;
                for_each_place(i, j, side, [&](double x, double y) {
                    heap.add(value_at(
                        map, plane.direction_at(x * step - across / 2, across / 2 - y * step).value()));
                });
                heap.write_to(raster, static_cast<std::size_t>(j) * static_cast<std::size_t>(width) + i);
            }
    });
    return raster;
}

}  // namespace foreglow
