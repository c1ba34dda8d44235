// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/electron_sky.h"

#include <array>

#include "base/error.h"
#include "base/parallel.h"
#include "base/text.h"

namespace foreglow {
namespace {

constexpr std::int64_t strip_pixels = std::int64_t{1} << 22;
constexpr std::int64_t block = 4096;

Interval range_of(const std::optional<PixelField>& map, double value, const char* name) {
    if (!map) return {value, value};
    const auto range = map->range();
    if (!range) throw DataError(std::string("the ") + name + " has no defined pixel: give another map");
    if (!(range->low > 0))
        throw DataError(std::string("the ") + name + " has the value " + format_number(range->low, 6) +
                        ", but every pixel must be above 0: mark pixels without one as undefined");
    return {range->low, range->high};
}

ElectronRange range_of_maps(const ElectronSky& electrons) {
    const ElectronLaw& law = electrons.law;
    ElectronRange range;
    range.field_uG = range_of(electrons.field, law.field_uG, "field_map");
    if (law.energy_break)
        range.break_GeV = range_of(electrons.break_energy, law.energy_break->energy_GeV, "break_energy_map");
    if (law.cutoff)
        range.cutoff_GeV = range_of(electrons.cutoff_energy, law.cutoff->energy_GeV, "cutoff_energy_map");
    return range;
}

// The indices of a strip become slopes.
std::int64_t turn_strip(const SkyModel& sky, const RingStrip& strip, std::span<double> indices) {
    const ElectronSky& electrons = *sky.electrons;
    sky.index.evaluate(sky.grid, strip, indices);
    std::array<std::vector<double>, 3> columns;
    const std::array<const std::optional<PixelField>*, 3> maps{&electrons.field, &electrons.break_energy,
                                                               &electrons.cutoff_energy};
    for (std::size_t m = 0; m < maps.size(); ++m) {
        if (!*maps[m]) continue;
        columns[m].resize(indices.size());
        (*maps[m])->evaluate(sky.grid, strip, columns[m]);
    }
    const LawColumns all{{}, {}, {{}, columns[0], columns[1], columns[2]}};
    return static_cast<std::int64_t>(parallel_sum(
        static_cast<std::int64_t>(indices.size()), block, [&](std::int64_t begin, std::int64_t end) {
            const auto first = static_cast<std::size_t>(begin);
            const auto count = static_cast<std::size_t>(end - begin);
            return static_cast<double>(electrons.shape->find_slopes(indices.subspan(first, count),
                                                                    all.part(first, count).electrons));
        }));
}

}  // namespace

void find_electron_slopes(SkyModel& sky) {
    FOREGLOW_EXPECTS(sky.electrons.has_value());
    ElectronSky& electrons = *sky.electrons;
    const auto indices = sky.index.range();
    if (!indices) throw DataError("the index map has no defined pixel: give another map");
    electrons.shape = std::make_shared<const ElectronShape>(electrons.law, range_of_maps(electrons),
                                                            Interval{indices->low, indices->high},
                                                            electrons.definition, sky.reference);
    electrons.clamped_pixels = 0;
    if (sky.index.is_uniform() && !electrons.field && !electrons.break_energy && !electrons.cutoff_energy) {
        std::vector<double> one{indices->low};
        if (electrons.shape->find_slopes(one, {}) > 0) electrons.clamped_pixels = sky.grid.npix();
        electrons.slope = PixelField::uniform(one.front());
        return;
    }
    auto map = std::make_shared<SkyMap>();
    map->grid = sky.grid;
    map->frame = sky.frame;
    map->values.resize(static_cast<std::size_t>(sky.grid.npix()));
    for (const RingStrip& strip : cut_into_strips(sky.grid, strip_pixels)) {
        std::vector<double> values(static_cast<std::size_t>(pixel_count(sky.grid, strip)));
        electrons.clamped_pixels += turn_strip(sky, strip, values);
        for (const PixelRange& range : pixel_ranges(sky.grid, strip))
            std::copy_n(values.begin() + range.offset, range.count, map->values.begin() + range.first_pixel);
    }
    electrons.slope = PixelField::of_map(std::move(map));
}

std::string describe_clamped_pixels(const SkyModel& sky) {
    if (!sky.electrons || sky.electrons->clamped_pixels == 0) return "";
    const SlopeLimits limits = slope_limits(sky.electrons->law);
    return std::to_string(sky.electrons->clamped_pixels) + " of " + std::to_string(sky.grid.npix()) +
           " pixels have an index that the electrons of this model cannot have with a slope from " +
           format_number(limits.low, 4) + " to " + format_number(limits.high, 4) +
           ": they took the nearest slope";
}

}  // namespace foreglow
