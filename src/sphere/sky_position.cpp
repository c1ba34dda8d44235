// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/sky_position.h"

#include <charconv>
#include <cmath>
#include <optional>
#include <string>

#include "base/constants.h"
#include "base/error.h"
#include "base/text.h"

namespace foreglow {
namespace {

constexpr double degree = constants::pi / 180;

std::optional<double> find_number(std::string_view text) {
    if (text.starts_with('+')) {
        text.remove_prefix(1);
        if (text.starts_with('-')) return std::nullopt;
    }
    double value = 0;
    const auto [end, code] = std::from_chars(text.data(), text.data() + text.size(), value);
    if (code != std::errc() || end != text.data() + text.size() || !std::isfinite(value)) return std::nullopt;
    return value;
}

// "05:34:31.9" or "-05:34": the sign is that of the whole, also of "-00:30:00".
std::optional<double> find_sexagesimal(std::string_view text) {
    const bool negative = text.starts_with('-');
    if (negative || text.starts_with('+')) text.remove_prefix(1);
    double value = 0;
    double scale = 1;
    int fields = 0;
    while (true) {
        const auto end = text.find(':');
        const std::string_view field = text.substr(0, end);
        const std::optional<double> number = find_number(field);
        if (!number || field.front() == '-' || field.front() == '+' || fields == 3) return std::nullopt;
        if (fields > 0 && *number >= 60) return std::nullopt;
        value += *number * scale;
        scale /= 60;
        ++fields;
        if (end == std::string_view::npos) break;
        text.remove_prefix(end + 1);
    }
    if (fields < 2) return std::nullopt;
    return negative ? -value : value;
}

double parse_coordinate(std::string_view text, const char* what, bool sexagesimal, double unit_deg) {
    const std::string_view trimmed = trim(text);
    if (const auto number = find_number(trimmed)) return *number;
    if (trimmed.find(':') != std::string_view::npos) {
        if (!sexagesimal)
            throw InputError(
                "'" + std::string(trimmed) +
                "' is sexagesimal, which is read in icrs only: add --frame icrs, or give degrees");
        if (const auto number = find_sexagesimal(trimmed)) return *number * unit_deg;
    }
    throw InputError("'" + std::string(trimmed) + "' is no " + what + ": write degrees, as in 83.633" +
                     (sexagesimal ? ", or hours and degrees, as in 05:34:31.9,+22:00:52" : ""));
}

}  // namespace

SkyPosition make_position(double lon_deg, double lat_deg) {
    if (!(std::abs(lat_deg) <= 90))
        throw InputError("the latitude " + format_number(lat_deg, 12) +
                         " is beyond 90 deg: give longitude first, then latitude from -90 to 90");
    if (!(std::abs(lon_deg) <= 360))
        throw InputError("the longitude " + format_number(lon_deg, 12) +
                         " is beyond 360 deg: give one from -360 to 360");
    double lon = lon_deg < 0 ? lon_deg + 360 : lon_deg;
    if (lon >= 360) lon -= 360;
    return {lon + 0.0, lat_deg};
}

SkyPosition parse_position(std::string_view lon, std::string_view lat, Frame frame) {
    const bool sexagesimal = frame == Frame::Icrs;
    return make_position(parse_coordinate(lon, "longitude", sexagesimal, 15.0),
                         parse_coordinate(lat, "latitude", sexagesimal, 1.0));
}

Vector3 direction_of(const SkyPosition& position) {
    const double lon = position.lon_deg * degree;
    const double lat = position.lat_deg * degree;
    return {std::cos(lat) * std::cos(lon), std::cos(lat) * std::sin(lon), std::sin(lat)};
}

SkyPosition position_of(const Vector3& direction) {
    const double rho = std::hypot(direction[0], direction[1]);
    return make_position(std::atan2(direction[1], direction[0]) / degree,
                         std::atan2(direction[2], rho) / degree);
}

}  // namespace foreglow
