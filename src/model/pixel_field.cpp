// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/pixel_field.h"

#include <algorithm>
#include <vector>

#include "base/error.h"
#include "base/parallel.h"

namespace foreglow {
namespace {

constexpr std::int64_t block = 4096;

template <class... F>
struct Overloaded : F... {
    using F::operator()...;
};
template <class... F>
Overloaded(F...) -> Overloaded<F...>;

double interpolate_at(const SkyMap& map, const Vector3& direction) {
    const HealpixGrid::Stencil stencil = map.grid.interpolation(direction);
    double sum = 0;
    double weight = 0;
    for (std::size_t i = 0; i < 4; ++i) {
        const double value = map.values[static_cast<std::size_t>(stencil.pixels[i])];
        if (!is_defined(value)) continue;
        sum += stencil.weights[i] * value;
        weight += stencil.weights[i];
    }
    return weight > 1e-12 ? sum / weight : undefined_pixel;
}

std::optional<PixelField::Range> range_of(const SkyMap& map) {
    std::optional<PixelField::Range> range;
    for (const double value : map.values) {
        if (!is_defined(value)) continue;
        if (!range) range = PixelField::Range{value, value};
        range->low = std::min(range->low, value);
        range->high = std::max(range->high, value);
    }
    return range;
}

}  // namespace

void interpolate_strip(const SkyMap& map, const Matrix3& to_map, const HealpixGrid& grid, const RingStrip& strip,
                       std::span<double> out) {
    for (const PixelRange& range : pixel_ranges(grid, strip))
        parallel_for_blocks(range.count, block, [&](std::int64_t begin, std::int64_t end) {
            for (std::int64_t i = begin; i < end; ++i)
                out[static_cast<std::size_t>(range.offset + i)] =
                    interpolate_at(map, rotate(to_map, grid.direction(range.first_pixel + i)));
        });
}

void undefine_filled(const SkyMap& filled, const Matrix3& to_filled, const HealpixGrid& grid, const RingStrip& strip,
                     std::span<double> values) {
    std::vector<double> share(values.size());
    interpolate_strip(filled, to_filled, grid, strip, share);
    for (std::size_t i = 0; i < values.size(); ++i)
        if (share[i] > largest_filled_share) values[i] = undefined_pixel;
}

PixelField PixelField::uniform(double value) {
    return PixelField(Source(value));
}

PixelField PixelField::of_map(std::shared_ptr<const SkyMap> map) {
    return PixelField(Source(Map{std::move(map)}));
}

PixelField PixelField::interpolated(std::shared_ptr<const SkyMap> map, const HealpixGrid& grid, Frame frame) {
    if (map->grid == grid && map->frame == frame) return of_map(std::move(map));
    const Matrix3 to_map = rotation_between(frame, map->frame);
    return PixelField(Source(Interpolated{std::move(map), to_map}));
}

PixelField PixelField::harmonic(Alm alm, const HealpixGrid&, Frame frame, std::shared_ptr<const SkyMap> filled) {
    const Matrix3 to_filled = rotation_between(frame, filled ? filled->frame : frame);
    return PixelField(Source(Harmonic{std::move(alm), std::move(filled), to_filled}));
}

void PixelField::evaluate(const HealpixGrid& grid, const RingStrip& strip, std::span<double> out) const {
    FOREGLOW_EXPECTS(static_cast<std::int64_t>(out.size()) == pixel_count(grid, strip));
    std::visit(Overloaded{[&](double value) { std::fill(out.begin(), out.end(), value); },
                          [&](const Map& source) {
                              FOREGLOW_EXPECTS(source.map->grid == grid);
                              for (const PixelRange& range : pixel_ranges(grid, strip))
                                  std::copy_n(source.map->values.begin() + range.first_pixel, range.count,
                                              out.begin() + range.offset);
                          },
                          [&](const Interpolated& source) {
                              interpolate_strip(*source.map, source.to_map, grid, strip, out);
                          },
                          [&](const Harmonic& source) {
                              synthesize_strip(source.alm, grid, strip, out);
                              if (source.filled) undefine_filled(*source.filled, source.to_filled, grid, strip, out);
                          }},
               source_);
}

std::optional<PixelField::Range> PixelField::range() const {
    return std::visit(Overloaded{[](double value) { return std::optional<Range>(Range{value, value}); },
                                 [](const Map& source) { return range_of(*source.map); },
                                 [](const Interpolated& source) { return range_of(*source.map); },
                                 [](const Harmonic&) { return std::optional<Range>(); }},
                      source_);
}

}  // namespace foreglow
