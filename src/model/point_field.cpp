// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/point_field.h"

#include <algorithm>
#include <cmath>
#include <vector>

#include "base/error.h"
#include "sphere/sky_map.h"

namespace foreglow {
namespace {

constexpr std::size_t most_children = std::size_t{1} << 20;  // read at a time

double mean_over_children(std::span<const double> values, std::span<const double> weights) {
    double sum = 0, weight = 0, plain = 0;
    int defined = 0;
    for (std::size_t i = 0; i < values.size(); ++i) {
        if (!is_defined(values[i])) continue;
        plain += values[i];
        ++defined;
        if (weights.empty() || !is_defined(weights[i])) continue;
        sum += std::abs(weights[i]) * values[i];
        weight += std::abs(weights[i]);
    }
    if (weight > 0) return sum / weight;
    return defined > 0 ? plain / defined : undefined_pixel;
}

// Reads a map bilinearly at pixels of another grid and frame.
template <class Read>
void interpolate_at(const BilinearSampler& sampler, Frame map_frame, const HealpixGrid& grid, Frame frame,
                    std::span<const std::int64_t> pixels, std::span<double> out, const Read& read) {
    std::vector<std::int64_t> corners(4 * pixels.size());
    std::vector<double> weights(corners.size());
    std::vector<double> values(corners.size());
    make_stencils(sampler, map_frame, grid, frame, pixels, corners, weights);
    read(corners, values);
    for (std::size_t i = 0; i < pixels.size(); ++i)
        out[i] = mean_of_four(std::span(values).subspan(4 * i, 4), std::span(weights).subspan(4 * i, 4));
}

}  // namespace

double mean_of_four(std::span<const double> values, std::span<const double> weights) {
    double sum = 0, weight = 0;
    for (std::size_t k = 0; k < 4; ++k) {
        if (!is_defined(values[k])) continue;
        sum += weights[k] * values[k];
        weight += weights[k];
    }
    return weight > 0 ? sum / weight : undefined_pixel;
}

void make_stencils(const BilinearSampler& sampler, Frame map_frame, const HealpixGrid& to_grid,
                   Frame to_frame, std::span<const std::int64_t> to_pixels, std::span<std::int64_t> pixels,
                   std::span<double> weights) {
    const Matrix3 back = rotation_between(to_frame, map_frame);
    for (std::size_t i = 0; i < to_pixels.size(); ++i) {
        HealpixGrid::Stencil stencil;
        if (map_frame == to_frame) {
            const int ring = to_grid.ring_of(to_pixels[i]);
            stencil = sampler.stencil_at(to_grid, ring, to_pixels[i] - to_grid.ring(ring).first_pixel);
        } else {
            stencil = sampler.stencil(rotate(back, to_grid.direction(to_pixels[i])));
        }
        std::copy(stencil.pixels.begin(), stencil.pixels.end(),
                  pixels.begin() + static_cast<std::ptrdiff_t>(4 * i));
        std::copy(stencil.weights.begin(), stencil.weights.end(),
                  weights.begin() + static_cast<std::ptrdiff_t>(4 * i));
    }
}

PointField PointField::of_map(std::shared_ptr<const PointMap> map, std::shared_ptr<const PointMap> weights,
                              const HealpixGrid& grid, Frame frame) {
    Map source;
    source.between = HealpixGrid(std::min(map->grid().nside(), grid.nside()));
    source.grid = grid;
    source.frame = frame;
    if (!(source.between == grid) || map->frame() != frame) source.sampler.emplace(source.between);
    source.map = std::move(map);
    source.weights = std::move(weights);
    return PointField(std::move(source));
}

bool PointField::is_pixel_for_pixel() const {
    const Map* source = std::get_if<Map>(&source_);
    return source != nullptr && source->map->grid() == source->grid && source->map->frame() == source->frame;
}

void PointField::evaluate(std::span<const std::int64_t> pixels, std::span<double> out) const {
    FOREGLOW_EXPECTS(pixels.size() == out.size());
    if (const double* value = std::get_if<double>(&source_))
        std::fill(out.begin(), out.end(), *value);
    else
        std::get<Map>(source_).evaluate(pixels, out);
}

void PointField::Map::evaluate(std::span<const std::int64_t> pixels, std::span<double> out) const {
    if (!sampler) return read_coarsened(pixels, out);
    interpolate_at(*sampler, map->frame(), grid, frame, pixels, out,
                   [this](std::span<const std::int64_t> corners, std::span<double> values) {
                       read_coarsened(corners, values);
                   });
}

// The values of the grid between, which is the map's own unless the map is finer than what is asked.
void PointField::Map::read_coarsened(std::span<const std::int64_t> pixels, std::span<double> out) const {
    if (between == map->grid()) return map->read(pixels, out);
    const auto family = static_cast<std::size_t>(map->grid().npix() / between.npix());
    const std::size_t parents = std::max<std::size_t>(1, most_children / family);
    std::vector<std::int64_t> children;
    std::vector<double> values, shares;
    for (std::size_t first = 0; first < pixels.size(); first += parents) {
        const std::size_t count = std::min(parents, pixels.size() - first);
        children.resize(count * family);
        values.resize(children.size());
        shares.resize(weights ? children.size() : 0);
        for (std::size_t i = 0; i < count; ++i)
            map->grid().ring_numbers(
                between.ring_to_nested(pixels[first + i]) * static_cast<std::int64_t>(family),
                std::span(children).subspan(i * family, family));
        map->read(children, values);
        if (weights) read_weights(children, shares);
        for (std::size_t i = 0; i < count; ++i)
            out[first + i] =
                mean_over_children(std::span(values).subspan(i * family, family),
                                   weights ? std::span<const double>(shares).subspan(i * family, family)
                                           : std::span<const double>());
    }
}

// The brightness at pixels of the map's own grid.
void PointField::Map::read_weights(std::span<const std::int64_t> pixels, std::span<double> out) const {
    if (weights->grid() == map->grid() && weights->frame() == map->frame()) return weights->read(pixels, out);
    interpolate_at(BilinearSampler(weights->grid()), weights->frame(), map->grid(), map->frame(), pixels, out,
                   [this](std::span<const std::int64_t> corners, std::span<double> values) {
                       weights->read(corners, values);
                   });
}

}  // namespace foreglow
