// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <string>
#include <string_view>
#include <vector>

namespace foreglow {

/// One value of a TOML document (TOML 1.0.0), with the place it stands at.
struct TomlValue {
    enum class Type { String, Integer, Float, Boolean, Date, Array, Table };

    Type type = Type::Table;
    std::string place;         ///< FILE:LINE:COLUMN of the value, or the command-line option it came from
    std::string key_place;     ///< likewise of its key
    std::string text;          ///< of a String
    std::int64_t integer = 0;  ///< of an Integer
    double number = 0;         ///< of a Float or an Integer
    bool boolean = false;      ///< of a Boolean
    std::vector<std::string> keys;   ///< of a Table, in the order of the file; keys[i] names items[i]
    std::vector<TomlValue> items;    ///< of a Table or an Array
    bool from_command_line = false;  ///< set by an option; paths in it are relative to the caller's folder
    std::string as_typed;            ///< what the option said, where from_command_line
};

/// Parses a TOML document into a table.
/// @param file_name  for the places, as the user wrote it
/// @throws InputError "FILE:LINE:COLUMN: ..." where the text is not TOML
[[nodiscard]] TomlValue parse_toml(std::string_view text, const std::string& file_name);

/// Returns a table's value of that key, or nullptr.
[[nodiscard]] const TomlValue* find_value(const TomlValue& table, std::string_view key);

/// Says in words what a value is, for messages: "the string 'abc'", "the whole number 3", "an array".
[[nodiscard]] std::string describe(const TomlValue& value);

/// Writes a text as a TOML basic string, quotes included.
[[nodiscard]] std::string to_toml_string(std::string_view text);

/// Sets a value by "key=value" as given to --set.
///
/// Keys are dotted (channel_grid.count); an element of an array of tables is reached by its `name` or its
/// number from 0 (channel.low.beam_fwhm, channel.0.beam_fwhm). The value is read as TOML and, where it is
/// none, as a string. Tables on the way that are not there yet are made.
/// @throws InputError "--set KEY=VALUE: ..." where there is no '=', no such element, or the way leads through
/// a plain value
void apply_override(TomlValue& document, const std::string& assignment);

}  // namespace foreglow
