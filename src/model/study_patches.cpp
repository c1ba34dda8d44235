// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/study_patches.h"

#include <cmath>
#include <set>

#include "base/error.h"
#include "base/text.h"
#include "model/study_channels.h"
#include "model/typed_keys.h"

namespace foreglow {
namespace {

constexpr double largest_size_deg = 10, smallest_pixel_arcsec = 1;
constexpr int fewest_pixels = 16;

void read_center(TomlReader& reader, PatchSpec& patch) {
    const TomlValue* value = reader.find("center");
    const auto is_number = [](const TomlValue& one) {
        return one.type == TomlValue::Type::Integer || one.type == TomlValue::Type::Float;
    };
    if (value == nullptr) reader.fail_missing("center", "center = [83.0, -41.0] (degrees)");
    if (value->type != TomlValue::Type::Array || value->items.size() != 2 || !is_number(value->items[0]) ||
        !is_number(value->items[1]))
        reader.fail("center",
                    "must be longitude and latitude in degrees, for example center = [83.0, -41.0], but is " +
                        describe(*value));
    const double lon = value->items[0].number, lat = value->items[1].number;
    if (!(lon >= -360 && lon <= 360 && lat >= -90 && lat <= 90))
        reader.fail("center",
                    "must be a longitude from -360 to 360 and a latitude from -90 to 90 degrees, but is [" +
                        format_exact(lon) + ", " + format_exact(lat) + "]");
    patch.longitude = Angle::from_degrees(lon);
    patch.latitude = Angle::from_degrees(lat);
}

}  // namespace

PatchSpec read_patch(TomlReader reader) {
    PatchSpec patch;
    patch.place = reader.place();
    const auto name = read_channel_name(reader);
    if (name) reader.set_section("[[patch]] '" + *name + "'");
    read_center(reader, patch);
    const auto size = read_beam_fwhm(reader, "size"), pixel = read_beam_fwhm(reader, "pixel");
    reader.check_no_other_keys();
    if (!name) reader.fail_missing("name", "name = \"deep-field\"");
    if (!size) reader.fail_missing("size", "size = \"9 deg\"");
    if (!pixel) reader.fail_missing("pixel", "pixel = \"0.5 arcmin\"");
    if (size->degrees() > largest_size_deg * (1 + 1e-12))
        reader.fail("size",
                    "must be at most 10 deg, beyond which a plane is no sky, but is " + to_text(*size));
    if (pixel->arcmin() * 60 < smallest_pixel_arcsec * (1 - 1e-12))
        reader.fail("pixel", "must be at least 1 arcsec, but is " + to_text(*pixel));
    patch.name = *name;
    patch.pixel = *pixel;
    patch.pixels = static_cast<int>(std::lround(size->radians() / pixel->radians()));
    if (patch.pixels < fewest_pixels)
        reader.fail("pixel", "gives " + std::to_string(patch.pixels) +
                                 " pixels a side: take a smaller one, so that there are 16 or more");
    if (patch.pixels > PatchSpec::most_pixels)
        reader.fail("pixel", "gives " + std::to_string(patch.pixels) + " pixels a side, and at most " +
                                 std::to_string(PatchSpec::most_pixels) +
                                 " can be made: take a larger one, or a smaller size");
    return patch;
}

void check_patch_names(const std::vector<PatchSpec>& patches) {
    std::set<std::string> seen;
    for (const PatchSpec& patch : patches)
        if (!seen.insert(to_lower(patch.name)).second)
            throw InputError(patch.place + ": there are two patches '" + patch.name +
                             "': give each a name of its own (file systems may not tell capitals)");
}

}  // namespace foreglow
