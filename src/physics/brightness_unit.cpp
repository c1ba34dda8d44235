// SPDX-License-Identifier: GPL-2.0-or-later
#include "physics/brightness_unit.h"

#include <array>
#include <cmath>

#include "base/constants.h"
#include "base/error.h"
#include "base/text.h"

namespace foreglow {
namespace {

using Kind = BrightnessUnit::Kind;
struct Name {
    std::string_view text;
    BrightnessUnit unit;
};
constexpr std::array<Name, 8> names{{{"K_RJ", {Kind::RayleighJeans, 1.0}},
                                     {"mK_RJ", {Kind::RayleighJeans, 1e-3}},
                                     {"uK_RJ", {Kind::RayleighJeans, 1e-6}},
                                     {"K_CMB", {Kind::Thermodynamic, 1.0}},
                                     {"mK_CMB", {Kind::Thermodynamic, 1e-3}},
                                     {"uK_CMB", {Kind::Thermodynamic, 1e-6}},
                                     {"MJy/sr", {Kind::MegajanskyPerSteradian, 1.0}},
                                     {"Jy/pixel", {Kind::JanskyPerPixel, 1.0}}}};

double rayleigh_jeans_per_intensity(Frequency frequency) {
    const double c = constants::speed_of_light;
    return c * c / (2 * constants::boltzmann * frequency.hz() * frequency.hz());
}

}  // namespace

std::optional<BrightnessUnit> find_brightness_unit(std::string_view text) {
    for (const Name& name : names)
        if (name.text == trim(text)) return name.unit;
    return std::nullopt;
}

std::string to_text(const BrightnessUnit& unit) {
    for (const Name& name : names)
        if (name.unit == unit) return std::string(name.text);
    FOREGLOW_EXPECTS(false && "a unit that has a name");
    return {};
}

std::string list_of_brightness_units() {
    std::string list;
    for (const Name& name : names)
        list += (list.empty() ? "" : ", ") + std::string(name.text);
    return list;
}

double rayleigh_jeans_per_thermodynamic(Frequency frequency) {
    const double x = constants::planck * frequency.hz() / (constants::boltzmann * constants::t_cmb);
    // x^2 e^x/(e^x - 1)^2 = (y/sinh y)^2 with y = x/2, which loses nothing at small x.
    const double y = x / 2;
    const double ratio = y < 1e-4 ? 1.0 - y * y / 6.0 : y / std::sinh(y);
    return ratio * ratio;
}

double rayleigh_jeans_per_unit(const BrightnessUnit& unit, Frequency frequency, double pixel_area_sr) {
    switch (unit.kind) {
        case Kind::RayleighJeans:
            return unit.scale;
        case Kind::Thermodynamic:
            return unit.scale * rayleigh_jeans_per_thermodynamic(frequency);
        case Kind::MegajanskyPerSteradian:
            return unit.scale * 1e6 * constants::jansky * rayleigh_jeans_per_intensity(frequency);
        case Kind::JanskyPerPixel:
            FOREGLOW_EXPECTS(pixel_area_sr > 0);
            return unit.scale * constants::jansky / pixel_area_sr * rayleigh_jeans_per_intensity(frequency);
    }
    FOREGLOW_EXPECTS(false && "a known kind of unit");
    return 0;
}

Brightness parse_brightness(std::string_view text) {
    const NumberWithUnit quantity = parse_number_with_unit(text);
    const auto unit = find_brightness_unit(quantity.unit);
    if (!unit)
        throw InputError(
            (quantity.unit.empty() ? "has no unit" : "has the unknown unit '" + quantity.unit + "'") +
            ": use one of " + list_of_brightness_units());
    return {quantity.value, *unit};
}

}  // namespace foreglow
