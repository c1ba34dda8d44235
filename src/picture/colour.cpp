// SPDX-License-Identifier: GPL-2.0-or-later
#include "picture/colour.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>

namespace foreglow {
namespace {

using Linear = std::array<double, 3>;

Linear linear_rgb(const OklabColour& colour, double chroma) {
    const double hue = colour.hue_deg * std::numbers::pi / 180.0;
    const double a = chroma * std::cos(hue), b = chroma * std::sin(hue);
    const auto cube = [](double v) { return v * v * v; };
    const double l = cube(colour.lightness + 0.3963377774 * a + 0.2158037573 * b);
    const double m = cube(colour.lightness - 0.1055613458 * a - 0.0638541728 * b);
    const double s = cube(colour.lightness - 0.0894841775 * a - 1.2914855480 * b);
    return {4.0767416621 * l - 3.3077115913 * m + 0.2309699292 * s,
            -1.2684380046 * l + 2.6097574011 * m - 0.3413193965 * s,
            -0.0041960863 * l - 0.7034186147 * m + 1.7076147010 * s};
}

bool is_on_screen(const Linear& rgb) {
    constexpr double slack = 1e-6;  // white and black themselves miss 0 and 1 by the matrices' rounding
    return std::all_of(rgb.begin(), rgb.end(), [](double v) { return v >= -slack && v <= 1 + slack; });
}

std::uint8_t encode(double linear) {
    const double v = std::clamp(linear, 0.0, 1.0);
    const double coded = v <= 0.0031308 ? 12.92 * v : 1.055 * std::pow(v, 1 / 2.4) - 0.055;
    return static_cast<std::uint8_t>(std::lround(coded * 255));
}

double decode(std::uint8_t coded) {
    const double v = coded / 255.0;
    return v <= 0.04045 ? v / 12.92 : std::pow((v + 0.055) / 1.055, 2.4);
}

}  // namespace

Rgb to_rgb(const OklabColour& colour) {
    Linear rgb = linear_rgb(colour, colour.chroma);
    if (!is_on_screen(rgb)) {
        double inside = 0, outside = colour.chroma;
        for (int step = 0; step < 40; ++step) {
            const double middle = (inside + outside) / 2;
            (is_on_screen(linear_rgb(colour, middle)) ? inside : outside) = middle;
        }
        rgb = linear_rgb(colour, inside);
    }
    return {encode(rgb[0]), encode(rgb[1]), encode(rgb[2])};
}

double oklab_lightness(Rgb colour) {
    const double r = decode(colour.red), g = decode(colour.green), b = decode(colour.blue);
    const double l = std::cbrt(0.4122214708 * r + 0.5363325363 * g + 0.0514459929 * b);
    const double m = std::cbrt(0.2119034982 * r + 0.6806995451 * g + 0.1073969566 * b);
    const double s = std::cbrt(0.0883024619 * r + 0.2817188376 * g + 0.6299787005 * b);
    return 0.2104542553 * l + 0.7936177850 * m - 0.0040720468 * s;
}

Rgb mix(Rgb a, Rgb b, double share) {
    const auto one = [share](std::uint8_t from, std::uint8_t to) {
        return static_cast<std::uint8_t>(std::lround(from + share * (to - from)));
    };
    return {one(a.red, b.red), one(a.green, b.green), one(a.blue, b.blue)};
}

}  // namespace foreglow
