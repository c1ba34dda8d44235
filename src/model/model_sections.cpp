// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/model_sections.h"

#include <algorithm>
#include <cmath>
#include <limits>

#include "base/text.h"
#include "model/detail_section.h"
#include "model/typed_keys.h"

namespace foreglow {
namespace {

std::optional<ColumnRef> to_column(const TomlReader& reader, const std::string& key, const TomlValue& value) {
    if (value.type == TomlValue::Type::Integer) {
        if (value.integer < 1 || value.integer > 999)
            reader.fail(key, "must be a column's number from 1 to 999 or its name, but is " +
                                 std::to_string(value.integer));
        return static_cast<int>(value.integer);
    }
    if (value.type == TomlValue::Type::String && !trim(value.text).empty())
        return std::string(trim(value.text));
    reader.fail(key, "must be a column's number, from 1, or its name in quotes, but is " + describe(value));
}

std::vector<ColumnRef> read_column(TomlReader& reader) {
    const TomlValue* value = reader.find("column");
    if (value == nullptr) return {};
    return {*to_column(reader, "column", *value)};
}

std::vector<ColumnRef> read_columns(TomlReader& reader) {
    const TomlValue* value = reader.find("columns");
    if (value == nullptr) return {};
    if (value->type != TomlValue::Type::Array || value->items.size() != 2)
        reader.fail(
            "columns",
            "must be the two columns of Q and U, for example columns = [2, 3], but is " + describe(*value) +
                (value->type == TomlValue::Type::Array ? " of " + std::to_string(value->items.size()) : ""));
    std::vector<ColumnRef> columns;
    for (const TomlValue& item : value->items)
        columns.push_back(*to_column(reader, "columns", item));
    if (columns[0] == columns[1])
        reader.fail("columns", "names the same column for Q and for U: name two, for example [2, 3]");
    return columns;
}

/// Reads hdu, ordering and frame into a source; the keys are asked for whether or not there is a map.
void add_layout_keys(MapSource& source, TomlReader& reader) {
    if (const auto hdu = read_integer(reader, "hdu", 1, 9999, "hdu = 1")) source.hdu = static_cast<int>(*hdu);
    source.ordering =
        read_choice<Ordering>(reader, "ordering", {{"ring", Ordering::Ring}, {"nested", Ordering::Nested}});
    source.frame = read_choice<Frame>(
        reader, "frame",
        {{"galactic", Frame::Galactic}, {"icrs", Frame::Icrs}, {"ecliptic", Frame::Ecliptic}});
}

/// Refuses keys that say something about a map where there is none.
void check_no_map_keys(TomlReader& reader, std::initializer_list<const char*> keys,
                       const std::string& without) {
    for (const char* key : keys)
        if (reader.has(key))
            reader.fail(key, "says something about a map, but there is no " + without + " here: take it out");
}

/// Reads `NAME` (a number) or `NAME_map`; both together contradict each other.
std::optional<ValueOrMap> read_value_or_map(TomlReader& reader, const std::string& name, double low,
                                            double high, const std::string& example,
                                            const std::filesystem::path& folder) {
    const auto value = read_number(reader, name, low, high, name + " = " + example);
    auto map = read_named_map(reader, name + "_map", "polarization", folder);
    if (value && map) reader.fail(name + "_map", "contradicts '" + name + "': keep one of the two");
    if (map) return ValueOrMap(std::move(*map));
    if (value) return ValueOrMap(*value);
    return std::nullopt;
}

/// Reads the keys of a section that is either value = NUMBER or map = FILE.
ValueOrMap read_value_section(TomlReader& reader, const std::string& section, double low, double high,
                              const std::string& example, const std::filesystem::path& folder) {
    const auto value = read_number(reader, "value", low, high, "value = " + example);
    const auto path = read_path(reader, "map", folder);
    MapSource source;
    source.section = section;
    source.place = reader.place_of("map");
    source.columns = read_column(reader);
    add_layout_keys(source, reader);
    reader.check_no_other_keys();
    if (value && path) reader.fail("map", "contradicts 'value': keep one of the two");
    if (!value && !path)
        reader.fail_here("[" + section + "] has neither 'value' nor 'map': add value = " + example +
                         " or map = \"" + section + ".fits\"");
    if (value) {
        check_no_map_keys(reader, {"column", "hdu", "ordering", "frame"}, "'map'");
        return *value;
    }
    source.path = *path;
    return source;
}

/// Reads a brightness that must be a Rayleigh-Jeans temperature, in K_RJ.
void read_kelvin(TomlReader& reader, const std::string& key, double& kelvin) {
    const auto brightness = read_brightness(reader, key);
    if (!brightness) return;
    if (brightness->unit.kind != BrightnessUnit::Kind::RayleighJeans)
        reader.fail(key, "must be a Rayleigh-Jeans temperature, for example \"10 K_RJ\"");
    kelvin = brightness->value * brightness->unit.scale;
    if (!(kelvin >= 0 && kelvin < 1e12)) reader.fail(key, "must be at least 0 and below 1e12 K_RJ");
}

/// Reads the two frequencies of `between`, low first.
std::optional<std::pair<Frequency, Frequency>> read_between(TomlReader& reader) {
    const TomlValue* value = reader.find("between");
    if (value == nullptr) return std::nullopt;
    const std::string wanted = "must be two frequencies, for example between = [\"408 MHz\", \"23 GHz\"]";
    if (value->type != TomlValue::Type::Array || value->items.size() != 2)
        reader.fail("between", wanted + ", but is " + describe(*value));
    std::vector<Frequency> ends;
    for (const TomlValue& item : value->items) {
        // A one-key table lets the two ends pass the same checks, with the same messages, as any other
        // frequency.
        TomlValue table;
        table.place = item.place;
        table.keys = {"between"};
        table.items = {item};
        TomlReader inner(table, reader.section());
        ends.push_back(*read_frequency(inner, "between"));
    }
    if (ends[0] == ends[1]) reader.fail("between", "must be two different frequencies");
    return std::pair(std::min(ends[0], ends[1]), std::max(ends[0], ends[1]));
}

}  // namespace

std::optional<MapSource> read_named_map(TomlReader& reader, const std::string& key,
                                        const std::string& section, const std::filesystem::path& folder) {
    const TomlValue* value = reader.find(key);
    if (value == nullptr) return std::nullopt;
    MapSource source;
    source.section = section + "." + key;
    source.place = value->place;
    if (value->type != TomlValue::Type::Table) {
        source.path = *read_path(reader, key, folder);
        return source;
    }
    TomlReader inner(*value, key + " of [" + section + "]");
    const auto path = read_path(inner, "map", folder);
    source.columns = read_column(inner);
    add_layout_keys(source, inner);
    inner.check_no_other_keys();
    if (!path) inner.fail_missing("map", "map = \"" + key + ".fits\"");
    source.path = *path;
    return source;
}

SketchSpec read_sketch(TomlReader reader) {
    SketchSpec sketch;
    sketch.disc = reader.boolean("disc").value_or(sketch.disc);
    sketch.loops = reader.boolean("loops").value_or(sketch.loops);
    sketch.texture = reader.boolean("texture").value_or(sketch.texture);
    read_kelvin(reader, "pole_brightness", sketch.pole_brightness);
    read_kelvin(reader, "plane_brightness", sketch.plane_brightness);
    sketch.plane_height = read_beam_fwhm(reader, "plane_height").value_or(sketch.plane_height);
    const auto read = [&reader](const char* key, double low, double high, double& value) {
        value = read_number(reader, key, low, high, std::string(key) + " = " + format_exact(value))
                    .value_or(value);
    };
    read("texture_rms", 0, 1, sketch.texture_rms);
    read("index", -10, 10, sketch.index);
    read("index_rms", 0, 2, sketch.index_rms);
    read("curvature", -2, 2, sketch.curvature);
    read("curvature_rms", 0, 1, sketch.curvature_rms);
    read("polarized_fraction", 0, 1, sketch.polarized_fraction);
    if (const auto seed =
            read_integer(reader, "seed", 0, std::numeric_limits<std::int64_t>::max(), "seed = 1"))
        sketch.seed = static_cast<std::uint64_t>(*seed);
    reader.check_no_other_keys();
    if (!sketch.disc && !sketch.loops)
        reader.fail_here("[sketch] has both 'disc' and 'loops' off, which leaves no sky: switch one on");
    return sketch;
}

IntensitySpec read_intensity(TomlReader reader, const std::filesystem::path& folder) {
    IntensitySpec intensity;
    const auto path = read_path(reader, "map", folder);
    MapSource& source = intensity.map;
    source.section = "intensity";
    source.place = reader.place_of("map");
    source.columns = read_column(reader);
    add_layout_keys(source, reader);
    source.unit = read_unit(reader, "unit");
    source.convention = read_choice<PolarizationConvention>(
        reader, "polarization_convention",
        {{"COSMO", PolarizationConvention::Cosmo}, {"IAU", PolarizationConvention::Iau}});
    intensity.beam_fwhm = read_beam_fwhm(reader, "beam_fwhm");
    intensity.zero_level = read_brightness(reader, "zero_level");
    reader.check_no_other_keys();
    if (!path) reader.fail_missing("map", "map = \"survey.fits\"");
    source.path = *path;
    return intensity;
}

PolarizationSpec read_polarization(TomlReader reader, const std::filesystem::path& folder) {
    PolarizationSpec polarization;
    const auto path = read_path(reader, "map", folder);
    MapSource source;
    source.section = "polarization";
    source.place = reader.place_of("map");
    source.columns = read_columns(reader);
    const std::vector<ColumnRef> column = read_column(reader);
    add_layout_keys(source, reader);
    source.unit = read_unit(reader, "unit");
    source.convention = read_choice<PolarizationConvention>(
        reader, "polarization_convention",
        {{"COSMO", PolarizationConvention::Cosmo}, {"IAU", PolarizationConvention::Iau}});
    polarization.reference_frequency = read_frequency(reader, "reference_frequency");
    polarization.beam_fwhm = read_beam_fwhm(reader, "beam_fwhm");
    polarization.index = read_value_or_map(reader, "index", -10, 10, "-3.1", folder);
    polarization.fraction = read_value_or_map(reader, "fraction", 0, 1, "0.2", folder);
    polarization.angle_map = read_named_map(reader, "angle_map", "polarization", folder);
    reader.check_no_other_keys();
    if (path) {
        for (const char* key : {"fraction", "fraction_map", "angle_map"})
            if (reader.has(key))
                reader.fail(key, "contradicts 'map', which holds Q and U: keep one of the two");
        if (!column.empty())
            reader.fail("column", "must be 'columns' here: Q and U are two, for example columns = [2, 3]");
        source.path = *path;
        polarization.map = source;
        return polarization;
    }
    if (!polarization.fraction && !polarization.angle_map)
        reader.fail_missing("map", "map = \"survey.fits\" (or fraction and angle_map)");
    if (!polarization.fraction)
        reader.fail_missing("fraction", "fraction = 0.2 (or fraction_map) beside angle_map");
    if (!polarization.angle_map)
        reader.fail_missing("angle_map", "angle_map = \"angle.fits\" beside fraction");
    check_no_map_keys(reader, {"columns", "unit"}, "'map' of Q and U");
    // The section's own layout keys are about the one map that cannot do without a frame and a convention.
    MapSource& angle = *polarization.angle_map;
    if (angle.columns.empty()) angle.columns = column;
    if (!angle.hdu) angle.hdu = source.hdu;
    if (!angle.ordering) angle.ordering = source.ordering;
    if (!angle.frame) angle.frame = source.frame;
    angle.convention = source.convention;
    return polarization;
}

IndexSpec read_index(TomlReader reader, const std::filesystem::path& folder) {
    IndexSpec index;
    index.scatter = read_scatter(reader, 2);
    const auto frequency = read_frequency(reader, "frequency");
    const auto between = read_between(reader);
    index.value = read_value_section(reader, "index", -10, 10, "-2.9", folder);
    if (frequency && between) reader.fail("between", "contradicts 'frequency': keep one of the two");
    index.between = between;
    index.frequency = frequency;
    // On the curved law the chord's index is the local one at the geometric mean.
    if (between)
        index.frequency =
            Frequency::from_hz(std::sqrt(between->first.hz()) * std::sqrt(between->second.hz()));
    return index;
}

void read_map_layout(TomlReader& reader, MapSource& source) {
    source.columns = read_column(reader);
    add_layout_keys(source, reader);
    source.unit = read_unit(reader, "unit");
}

ValueOrMap read_curvature(TomlReader reader, const std::filesystem::path& folder,
                          std::optional<ScatterSpec>& scatter) {
    if (reader.has("decorrelation_length"))
        reader.fail("decorrelation_length", "belongs into [index]: move it there");
    scatter = read_scatter(reader, 1);
    return read_value_section(reader, "curvature", -2, 2, "-0.04", folder);
}

}  // namespace foreglow
