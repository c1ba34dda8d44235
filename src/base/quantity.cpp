// SPDX-License-Identifier: GPL-2.0-or-later
#include "base/quantity.h"

#include <array>
#include <charconv>
#include <cmath>
#include <utility>

#include "base/error.h"
#include "base/text.h"

namespace foreglow {
namespace {

using UnitScale = std::pair<std::string_view, double>;
constexpr std::array<UnitScale, 5> frequency_units{
    {{"Hz", 1.0}, {"kHz", 1e3}, {"MHz", 1e6}, {"GHz", 1e9}, {"THz", 1e12}}};
constexpr double degree = 3.141592653589793238462643383279502884 / 180.0;
constexpr std::array<UnitScale, 4> angle_units{
    {{"deg", degree}, {"arcmin", degree / 60.0}, {"arcsec", degree / 3600.0}, {"rad", 1.0}}};

constexpr std::array<UnitScale, 5> energy_units{
    {{"GeV", 1.0}, {"TeV", 1e3}, {"MeV", 1e-3}, {"keV", 1e-6}, {"eV", 1e-9}}};
constexpr std::array<UnitScale, 6> field_units{
    {{"uG", 1.0}, {"nG", 1e-3}, {"mG", 1e3}, {"G", 1e6}, {"nT", 10.0}, {"T", 1e10}}};
constexpr std::array<UnitScale, 4> time_units{{{"Myr", 1.0}, {"Gyr", 1e3}, {"kyr", 1e-3}, {"yr", 1e-6}}};

template <std::size_t N>
double scale_of(const std::array<UnitScale, N>& units, const NumberWithUnit& quantity,
                const std::string& example) {
    std::string list;
    for (const auto& [name, scale] : units) {
        if (name == quantity.unit) return scale;
        list += (list.empty() ? "" : ", ") + std::string(name);
    }
    if (quantity.unit.empty())
        throw InputError("has no unit: write it as \"" + example + "\" (" + list + ")");
    throw InputError("has the unknown unit '" + quantity.unit + "': use one of " + list);
}

}  // namespace

NumberWithUnit parse_number_with_unit(std::string_view text) {
    const std::string_view trimmed = trim(text);
    double value = 0;
    const char* first = trimmed.data();
    const char* last = first + trimmed.size();
    if (last - first >= 2 && first[0] == '+' && first[1] != '-') ++first;  // from_chars takes no plus sign
    const auto [end, code] = std::from_chars(first, last, value);
    if (code != std::errc() || !std::isfinite(value))
        throw InputError("does not begin with a number: '" + std::string(text) + "'");
    return {value, std::string(trim(std::string_view(end, static_cast<std::size_t>(last - end))))};
}

Frequency parse_frequency(std::string_view text) {
    const NumberWithUnit quantity = parse_number_with_unit(text);
    const double hz = quantity.value * scale_of(frequency_units, quantity, "30 GHz");
    if (!(hz > 0)) throw InputError("must be above zero, but is '" + std::string(text) + "'");
    if (!std::isfinite(hz)) throw InputError("is too large: '" + std::string(text) + "'");
    return Frequency::from_hz(hz);
}

Angle parse_angle(std::string_view text) {
    const NumberWithUnit quantity = parse_number_with_unit(text);
    return Angle::from_radians(quantity.value * scale_of(angle_units, quantity, "40 arcmin"));
}

double parse_energy_gev(std::string_view text) {
    const NumberWithUnit quantity = parse_number_with_unit(text);
    const double value = quantity.value * scale_of(energy_units, quantity, "10 GeV");
    if (!(value >= 1e-3 && value <= 1e9))
        throw InputError("must be from 1 MeV to 1e6 TeV, but is '" + std::string(text) + "'");
    return value;
}

double parse_field_ug(std::string_view text) {
    const NumberWithUnit quantity = parse_number_with_unit(text);
    const double value = quantity.value * scale_of(field_units, quantity, "5 uG");
    if (!(value >= 1e-3 && value <= 1e6))
        throw InputError("must be from 1 nG to 1 G, but is '" + std::string(text) + "'");
    return value;
}

double parse_time_myr(std::string_view text) {
    const NumberWithUnit quantity = parse_number_with_unit(text);
    const double value = quantity.value * scale_of(time_units, quantity, "50 Myr");
    if (!(value >= 0 && value <= 1e5))
        throw InputError("must be from 0 to 100 Gyr, but is '" + std::string(text) + "'");
    return value;
}

std::string to_text(Frequency frequency) {
    const double hz = frequency.hz();
    for (auto unit = frequency_units.rbegin(); unit != frequency_units.rend(); ++unit)
        if (hz >= 0.99999999 * unit->second)
            return format_number(hz / unit->second, 9) + " " + std::string(unit->first);
    return format_number(hz, 9) + " Hz";
}

std::string to_text(Angle angle) {
    const double deg = std::abs(angle.degrees());
    if (deg >= 1.0 - 1e-9 || deg == 0) return format_number(angle.degrees(), 6) + " deg";
    if (deg * 60 >= 1.0 - 1e-9) return format_number(angle.arcmin(), 6) + " arcmin";
    return format_number(angle.arcmin() * 60, 6) + " arcsec";
}

}  // namespace foreglow
