// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/pixel_field.h"

#include <algorithm>
#include <vector>

#include "base/error.h"
#include "base/parallel.h"
#include "model/map_statistics.h"

namespace foreglow {
namespace {

constexpr std::int64_t block = 65536;

template <class... F>
struct Overloaded : F... {
    using F::operator()...;
};
template <class... F>
Overloaded(F...) -> Overloaded<F...>;

std::optional<PixelField::Range> range_of(const SkyMap& map) {
    const auto count = static_cast<std::int64_t>(map.values.size());
    std::vector<MapStatistics> parts(static_cast<std::size_t>((count + block - 1) / block));
    parallel_for_blocks(count, block, [&](std::int64_t begin, std::int64_t end) {
        parts[static_cast<std::size_t>(begin / block)].add(
            std::span(map.values)
                .subspan(static_cast<std::size_t>(begin), static_cast<std::size_t>(end - begin)));
    });
    MapStatistics all;
    for (const MapStatistics& part : parts)
        all.merge(part);
    if (all.defined == 0) return std::nullopt;
    return PixelField::Range{all.lowest, all.highest};
}

}  // namespace

void copy_range(std::span<const double> map, const PixelRange& range, std::span<double> strip) {
    parallel_for_blocks(range.count, block, [&](std::int64_t begin, std::int64_t end) {
        std::copy_n(map.begin() + range.first_pixel + begin, end - begin,
                    strip.begin() + range.offset + begin);
    });
}

void interpolate_strip(const SkyMap& map, const HealpixGrid& grid, Frame frame, const RingStrip& strip,
                       std::span<double> out) {
    for (const PixelRange& range : pixel_ranges(grid, strip))
        interpolate_pixels(
            map, grid, frame, range.first_pixel,
            out.subspan(static_cast<std::size_t>(range.offset), static_cast<std::size_t>(range.count)));
}

void undefine_filled(const SkyMap& filled, const HealpixGrid& grid, Frame frame, const RingStrip& strip,
                     std::span<double> values) {
    std::vector<double> share(values.size());
    interpolate_strip(filled, grid, frame, strip, share);
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
    return PixelField(Source(Interpolated{std::move(map), frame}));
}

PixelField PixelField::harmonic(Alm alm, Frame frame, std::shared_ptr<const SkyMap> filled) {
    return PixelField(Source(Harmonic{std::move(alm), frame, std::move(filled)}));
}

void PixelField::evaluate(const HealpixGrid& grid, const RingStrip& strip, std::span<double> out) const {
    FOREGLOW_EXPECTS(static_cast<std::int64_t>(out.size()) == pixel_count(grid, strip));
    std::visit(Overloaded{[&](double value) { std::fill(out.begin(), out.end(), value); },
                          [&](const Map& source) {
                              FOREGLOW_EXPECTS(source.map->grid == grid);
                              for (const PixelRange& range : pixel_ranges(grid, strip))
                                  copy_range(source.map->values, range, out);
                          },
                          [&](const Interpolated& source) {
                              interpolate_strip(*source.map, grid, source.frame, strip, out);
                          },
                          [&](const Harmonic& source) {
                              synthesize_strip(source.alm, grid, strip, out);
                              if (source.filled)
                                  undefine_filled(*source.filled, grid, source.frame, strip, out);
                          }},
               source_);
}

std::optional<PixelField::Range> PixelField::range() const {
    return std::visit(Overloaded{[](double value) {
                                     return std::optional<Range>(Range{value, value});
                                 },
                                 [](const Map& source) { return range_of(*source.map); },
                                 [](const Interpolated& source) { return range_of(*source.map); },
                                 [](const Harmonic&) { return std::optional<Range>(); }},
                      source_);
}

}  // namespace foreglow
