// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/map_source.h"

#include <cmath>

#include "base/constants.h"
#include "base/error.h"
#include "base/text.h"

namespace foreglow {
namespace {

std::string start_of(const MapSource& source) {
    return source.place + ": the map " + source.path.filename().string();
}

FitsMap read_map(const MapSource& source, std::size_t columns, Progress& progress) {
    FitsMapRequest request = make_request(source);
    if (request.columns.empty() && columns == 1) request.columns = {1};
    FitsMap map = read_fits_map(request);
    FOREGLOW_EXPECTS(map.columns.size() == columns);
    for (const std::string& notice : map.notices)
        progress.notice(notice);
    if (map.undefined > 0)
        progress.notice(source.path.filename().string() + ": " + std::to_string(map.undefined) + " of " +
                        std::to_string(map.grid.npix()) + " pixels are undefined and stay so");
    return map;
}

// What released maps write for the scale alone: 'K', 'mK', 'uK', perhaps with a word on the kind behind it.
std::optional<double> scale_of_bare_kelvin(const std::string& tunit) {
    const std::string first = to_lower(trim(tunit.substr(0, tunit.find_first_of(" ,_("))));
    if (first == "k" || first == "kelvin") return 1.0;
    if (first == "mk") return 1e-3;
    if (first == "uk" || first == "muk" || first == "microk") return 1e-6;
    return std::nullopt;
}

bool is_temperature(const BrightnessUnit& unit) {
    return unit.kind == BrightnessUnit::Kind::RayleighJeans ||
           unit.kind == BrightnessUnit::Kind::Thermodynamic;
}

// What a word behind a bare kelvin says of its kind, as in 'mK,thermodynamic' or 'K (Rayleigh-Jeans)'.
std::optional<BrightnessUnit::Kind> kind_of_bare_kelvin(const std::string& tunit) {
    const std::string lower = to_lower(tunit);
    const auto says = [&lower](const char* word) { return lower.find(word) != std::string::npos; };
    if (says("cmb") || says("thermo")) return BrightnessUnit::Kind::Thermodynamic;
    if (says("rj") || says("rayleigh") || says("antenna")) return BrightnessUnit::Kind::RayleighJeans;
    return std::nullopt;
}

bool contradicts_bare_kelvin(const std::string& tunit, const BrightnessUnit& unit) {
    const auto scale = scale_of_bare_kelvin(tunit);
    if (!scale) return false;
    return !is_temperature(unit) || *scale != unit.scale ||
           kind_of_bare_kelvin(tunit).value_or(unit.kind) != unit.kind;
}

void scale_to_rayleigh_jeans(std::vector<double>& values, const BrightnessUnit& unit, Frequency frequency,
                             const HealpixGrid& grid) {
    const double factor = rayleigh_jeans_per_unit(unit, frequency, grid.pixel_area());
    for (double& value : values)
        value *= factor;
}

}  // namespace

FitsMapRequest make_request(const MapSource& source) {
    return {source.path, source.place,    source.section, source.columns,
            source.hdu,  source.ordering, source.frame};
}

Frame resolve_frame(const MapSource& source, std::optional<Frame> in_header) {
    if (in_header && source.frame && *in_header != *source.frame)
        throw InputError(start_of(source) + " has COORDSYS " + to_text(*in_header) + " but [" +
                         source.section + "] says " + to_text(*source.frame) + ": correct one of them");
    if (source.frame) return *source.frame;
    if (in_header) return *in_header;
    throw InputError(start_of(source) +
                     " does not say its frame (COORDSYS is absent or unknown): add `frame = \"galactic\"` " +
                     "(or \"icrs\", \"ecliptic\") to [" + source.section + "]");
}

BrightnessUnit resolve_unit(const MapSource& source, const std::string& tunit) {
    const auto in_header = find_brightness_unit(tunit);
    if (!source.unit) {
        if (in_header) return *in_header;
        const std::string what = trim(tunit).empty()
                                     ? "does not say its unit (TUNIT is absent or unknown)"
                                     : "has TUNIT '" + tunit + "', which does not say which scale it is in";
        throw InputError(start_of(source) + " " + what + ": add `unit = \"K_RJ\"` (or another of " +
                         list_of_brightness_units() + ") to [" + source.section + "]");
    }
    const bool contradicts =
        in_header ? *in_header != *source.unit : contradicts_bare_kelvin(tunit, *source.unit);
    if (contradicts)
        throw InputError(start_of(source) + " has TUNIT '" + tunit + "' but [" + source.section +
                         "] says \"" + to_text(*source.unit) + "\": correct one of them");
    return *source.unit;
}

PolarizationConvention resolve_convention(const MapSource& source,
                                          std::optional<PolarizationConvention> in_header) {
    if (in_header && source.convention && *in_header != *source.convention)
        throw InputError(start_of(source) + " has another POLCCONV than [" + source.section +
                         "] says in `polarization_convention`: correct one of them");
    if (source.convention) return *source.convention;
    if (in_header) return *in_header;
    throw InputError(start_of(source) + " does not say the sign of U (POLCCONV is absent or unknown): add " +
                     "`polarization_convention = \"COSMO\"` (or \"IAU\") to [" + source.section + "]");
}

SkyMap read_plain_map(const MapSource& source, Progress& progress) {
    FitsMap map = read_map(source, 1, progress);
    return {map.grid, resolve_frame(source, map.frame), "", std::move(map.columns[0].values)};
}

SkyMap read_brightness_map(const MapSource& source, Frequency frequency, Progress& progress) {
    FitsMap map = read_map(source, 1, progress);
    const Frame frame = resolve_frame(source, map.frame);
    const BrightnessUnit unit = resolve_unit(source, map.columns[0].unit);
    SkyMap out{map.grid, frame, "K_RJ", std::move(map.columns[0].values)};
    scale_to_rayleigh_jeans(out.values, unit, frequency, out.grid);
    return out;
}

StokesMaps read_stokes_maps(const MapSource& source, Frequency frequency, Progress& progress) {
    FitsMap map = read_map(source, 2, progress);
    StokesMaps out;
    out.grid = map.grid;
    out.frame = resolve_frame(source, map.frame);
    out.unit = "K_RJ";
    const BrightnessUnit q_unit = resolve_unit(source, map.columns[0].unit);
    const BrightnessUnit u_unit = resolve_unit(source, map.columns[1].unit);
    const bool flip = resolve_convention(source, map.convention) == PolarizationConvention::Iau;
    out.q = std::move(map.columns[0].values);
    out.u = std::move(map.columns[1].values);
    scale_to_rayleigh_jeans(out.q, q_unit, frequency, out.grid);
    scale_to_rayleigh_jeans(out.u, u_unit, frequency, out.grid);
    for (std::size_t i = 0; i < out.q.size(); ++i) {
        if (flip) out.u[i] = -out.u[i];
        if (!is_defined(out.q[i]) || !is_defined(out.u[i])) out.q[i] = out.u[i] = undefined_pixel;
    }
    return out;
}

StokesMaps read_angle_map(const MapSource& source, Progress& progress) {
    FitsMap map = read_map(source, 1, progress);
    StokesMaps out;
    out.grid = map.grid;
    out.frame = resolve_frame(source, map.frame);
    const double sign =
        resolve_convention(source, map.convention) == PolarizationConvention::Iau ? -1.0 : 1.0;
    for (const double degrees : map.columns[0].values) {
        const double twice = 2 * degrees * constants::pi / 180;
        out.q.push_back(std::cos(twice));
        out.u.push_back(sign * std::sin(twice));
    }
    return out;
}

}  // namespace foreglow
