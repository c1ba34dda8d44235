// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/draw.h"

#include <algorithm>
#include <charconv>
#include <cmath>

#include "base/error.h"
#include "base/text.h"
#include "io/atomic_file.h"
#include "io/fits_map_read.h"
#include "physics/brightness_unit.h"
#include "picture/sky_picture.h"

namespace foreglow {
namespace {

std::variant<int, std::string> parse_column(const std::string& text) {
    int number = 0;
    const auto [end, status] = std::from_chars(text.data(), text.data() + text.size(), number);
    if (status == std::errc() && end == text.data() + text.size()) return number;
    return text;
}

std::string stem_of(const std::filesystem::path& map) {
    std::filesystem::path name = map.filename();
    if (to_lower(name.extension().string()) == ".gz") name = name.stem();
    return name.stem().string();
}

std::filesystem::path output_path(const DrawOptions& options) {
    if (options.output) return *options.output;
    std::string name = stem_of(options.map);
    if (options.column) name += "-" + *options.column;
    std::replace(name.begin(), name.end(), '/', '_');
    name += ".png";
    return name;
}

void check_output(const std::filesystem::path& output, bool replace) {
    if (to_lower(output.extension().string()) != ".png")
        throw InputError(output.string() + ": pictures are written as PNG; give a name that ends in .png");
    std::error_code none;
    if (std::filesystem::is_directory(output, none))
        throw InputError(output.string() + " is a folder; give the picture another name");
    if (!replace && std::filesystem::exists(std::filesystem::symlink_status(output, none)))
        throw InputError(output.string() + " exists already; give another name with --out, or --replace it");
    const std::filesystem::path folder = output.parent_path();
    if (!folder.empty() && !std::filesystem::is_directory(folder, none))
        throw InputError(folder.string() + ", the folder for the picture, does not exist; make it first");
}

std::optional<CloseUpField> close_up_of(const DrawOptions& options) {
    if (!options.center && !options.size) return std::nullopt;
    if (!options.center || !options.size)
        throw InputError(options.center
                             ? "a close-up needs its size too: add for instance --size \"10 deg\""
                             : "a close-up needs its centre too: add --center \"LON,LAT\" in degrees");
    const auto [longitude, latitude] = *options.center;
    if (!(std::abs(longitude) <= 360) || !(std::abs(latitude) <= 90))
        throw InputError(
            "the centre of a close-up is longitude,latitude in degrees, -360 to 360 and -90 to 90, and " +
            format_number(longitude, 8) + "," + format_number(latitude, 8) + " was asked for");
    return CloseUpField{Angle::from_degrees(longitude), Angle::from_degrees(latitude), *options.size};
}

FitsMapRequest request_of(const DrawOptions& options) {
    FitsMapRequest request;
    request.path = options.map;
    if (options.column) request.columns.push_back(parse_column(*options.column));
    request.hdu = options.hdu;
    request.ordering = options.ordering;
    request.frame = options.frame;
    return request;
}

/// Returns the factor from the file's unit to the unit shown.
double unit_factor(const DrawOptions& options, const FitsMapColumn& column) {
    if (!options.unit || column.unit.empty() || trim(*options.unit) == column.unit) return 1;
    const auto from = find_brightness_unit(column.unit), to = find_brightness_unit(*options.unit);
    if (!from || !to || from->kind != to->kind)
        throw InputError(options.map.string() + ": column " + column.name + " is in " + column.unit +
                         ", which a picture cannot turn into " + *options.unit +
                         "; ask for a unit that differs by a power of ten only, or leave --unit out");
    return from->scale / to->scale;
}

/// Names what a column holds as a colour bar should say it, with the convention that gives U and Q their
/// signs.
std::string quantity_of(const FitsMapColumn& column, const FitsMap& map) {
    const std::string name = to_lower(column.name);
    const std::string convention = !map.convention ? "convention not stated"
                                   : *map.convention == PolarizationConvention::Cosmo ? "COSMO"
                                                                                      : "IAU";
    if (name == "i_stokes") return "Stokes I";
    if (name == "q_stokes") return "Stokes Q (" + convention + ")";
    if (name == "u_stokes") return "Stokes U (" + convention + ")";
    if (name == "index") return "Spectral index \u03b2 (T \u221d \u03bd^\u03b2)";
    if (name == "curvature") return "Curvature c of ln T in ln \u03bd";
    return column.name;
}

std::string title_of(const DrawOptions& options, const FitsMapHeader& header, const FitsMapColumn& column) {
    if (options.title) return *options.title;
    std::string title = options.map.filename().string() + ": " + column.name;
    const auto hz = header.number("FREQ");
    if (hz && *hz > 0 && std::isfinite(*hz)) title += " at " + to_text(Frequency::from_hz(*hz));
    return title;
}

/// Tells whether a column by its name holds numbers that have no unit.
bool is_pure_number(const std::string& column) {
    const std::string name = to_lower(column);
    return name == "index" || name == "index_error" || name == "curvature" || name == "curvature_error";
}

SkyMap take_map(const DrawOptions& options, FitsMap& file) {
    if (!file.frame)
        throw InputError(options.map.string() +
                         ": the file does not say in which frame it is (COORDSYS is missing or unknown); add "
                         "--frame galactic, "
                         "--frame icrs or --frame ecliptic");
    FitsMapColumn& column = file.columns.front();
    const double factor = unit_factor(options, column);
    SkyMap map{file.grid, *file.frame, options.unit.value_or(column.unit), std::move(column.values)};
    if (factor != 1)
        for (double& value : map.values)
            value *= factor;
    return map;
}

PictureOptions picture_options(const DrawOptions& options) {
    PictureOptions picture;
    picture.width = options.width;
    if (options.scale) picture.scale.kind = parse_scale(*options.scale);
    if (options.palette) picture.palette = parse_palette(*options.palette);
    for (const auto& end : {options.low, options.high})
        if (end && !std::isfinite(*end))
            throw InputError("the ends of a picture's range must be finite numbers");
    picture.scale.low = options.low;
    picture.scale.high = options.high;
    return picture;
}

}  // namespace

DrawResult run_draw(const DrawOptions& options) {
    const std::filesystem::path output = output_path(options);
    check_output(output, options.replace);
    const auto field = close_up_of(options);
    PictureOptions look = picture_options(options);
    const FitsMapRequest request = request_of(options);
    const FitsMapHeader header = read_fits_map_header(request);
    FitsMap file = read_fits_map(request);
    look.title = title_of(options, header, file.columns.front());
    look.quantity = quantity_of(file.columns.front(), file);
    const SkyMap map = take_map(options, file);
    const std::string& column = file.columns.front().name;
    if (map.unit.empty() && !is_pure_number(column)) {
        look.unit = "unit not stated";
        file.notices.push_back("the file gives no unit for column " + column + ": name it with --unit");
    }
    const Picture picture = field ? draw_close_up(map, *field, look) : draw_all_sky(map, look);
    write_text_file(output, picture.png);
    DrawResult result{output, picture.width, picture.height, std::move(file.notices)};
    result.notices.insert(result.notices.end(), picture.notices.begin(), picture.notices.end());
    return result;
}

}  // namespace foreglow
