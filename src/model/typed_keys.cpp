// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/typed_keys.h"

#include <cmath>
#include <system_error>

#include "base/error.h"

namespace foreglow {
namespace {

/// Reads a string and parses it; the parser's message, which names no key, is put behind place and key.
template <typename Parse>
auto read_parsed(TomlReader& reader, const std::string& key, const std::string& example, const Parse& parse)
    -> std::optional<decltype(parse(std::string()))> {
    const std::optional<std::string> text = reader.text(key, key + " = \"" + example + "\"");
    if (!text) return std::nullopt;
    try {
        return parse(*text);
    } catch (const InputError& error) {
        reader.fail(key, error.what());
    }
}

}  // namespace

std::optional<Frequency> read_frequency(TomlReader& reader, const std::string& key) {
    const auto frequency =
        read_parsed(reader, key, "30 GHz", [](const std::string& text) { return parse_frequency(text); });
    if (frequency && !(frequency->hz() >= 1 && frequency->hz() <= 1e13))
        reader.fail(key, "must lie between 1 Hz and 10 THz, but is '" + *reader.text(key, "") + "'");
    return frequency;
}

std::optional<Angle> read_beam_fwhm(TomlReader& reader, const std::string& key) {
    const auto fwhm =
        read_parsed(reader, key, "40 arcmin", [](const std::string& text) { return parse_angle(text); });
    if (fwhm && !(fwhm->radians() > 0 && fwhm->degrees() <= 180 * (1 + 1e-12)))
        reader.fail(key, "must be above 0 and at most 180 deg, but is '" + *reader.text(key, "") + "'");
    return fwhm;
}

std::optional<BrightnessUnit> read_unit(TomlReader& reader, const std::string& key) {
    const std::optional<std::string> text = reader.text(key, key + " = \"uK_CMB\"");
    if (!text) return std::nullopt;
    if (const auto unit = find_brightness_unit(*text)) return unit;
    std::vector<std::string> names;
    for (const std::string& name : split(list_of_brightness_units(), ','))
        names.emplace_back(trim(name));
    const std::string bare(trim(*text));
    if (bare == "K" || bare == "mK" || bare == "uK")
        reader.fail(key, "is '" + bare + "', which does not say which temperature: write \"" + bare +
                             "_RJ\" (Rayleigh-Jeans brightness) or \"" + bare + "_CMB\" (thermodynamic)");
    const std::string nearest = nearest_word(bare, names);
    reader.fail(key, "must be one of " + list_of_brightness_units() + ", but is '" + *text + "'" +
                         (nearest.empty() ? "" : ": did you mean \"" + nearest + "\"?"));
}

std::optional<Brightness> read_brightness(TomlReader& reader, const std::string& key) {
    return read_parsed(reader, key, "8.9 K_RJ",
                       [](const std::string& text) { return parse_brightness(text); });
}

std::optional<double> read_number(TomlReader& reader, const std::string& key, double low, double high,
                                  const std::string& example) {
    const std::optional<double> number = reader.number(key, example);
    if (number && !(*number >= low && *number <= high))
        reader.fail(key, "must lie between " + format_exact(low) + " and " + format_exact(high) +
                             ", for example " + example + ", but is " + format_exact(*number));
    return number;
}

std::optional<std::int64_t> read_integer(TomlReader& reader, const std::string& key, std::int64_t low,
                                         std::int64_t high, const std::string& example) {
    const std::optional<std::int64_t> number = reader.integer(key, example);
    if (number && (*number < low || *number > high))
        reader.fail(key, "must lie between " + std::to_string(low) + " and " + std::to_string(high) +
                             ", for example " + example + ", but is " + std::to_string(*number));
    return number;
}

std::filesystem::path resolve_path(const TomlReader& reader, const std::string& key, const TomlValue& value,
                                   const std::string& text, const std::filesystem::path& folder) {
    const bool is_open = text.find('\0') == std::string::npos && !text.empty();
    std::filesystem::path path =
        value.from_command_line || !is_open ? std::filesystem::path(text) : folder / text;
    std::error_code code;
    const auto status = std::filesystem::status(path, code);
    if (!is_open || !std::filesystem::exists(status))
        reader.fail(key,
                    "names the file '" + text + "', which does not exist" +
                        (value.from_command_line ? "" : " (paths are relative to the file they stand in)") +
                        ": correct the path");
    if (std::filesystem::is_directory(status))
        reader.fail(key, "names '" + text + "', which is a folder: give a file");
    return path;
}

std::optional<std::filesystem::path> read_path(TomlReader& reader, const std::string& key,
                                               const std::filesystem::path& folder) {
    const std::optional<std::string> text = reader.text(key, key + " = \"file.fits\"");
    if (!text) return std::nullopt;
    return resolve_path(reader, key, *reader.find(key), *text, folder);
}

void refuse_for_now(TomlReader& reader, const std::string& key) {
    if (reader.has(key)) reader.fail(key, "is not there yet in this version: take it out");
}

}  // namespace foreglow
