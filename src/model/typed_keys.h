// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>
#include <initializer_list>
#include <optional>
#include <string>
#include <utility>
#include <vector>

#include "base/quantity.h"
#include "base/text.h"
#include "io/toml_reader.h"
#include "physics/brightness_unit.h"

namespace foreglow {

/// Reads a frequency from 1 Hz to 10 THz, the range in which the units of brightness are exact.
/// @throws InputError with place and key, as all functions here
[[nodiscard]] std::optional<Frequency> read_frequency(TomlReader& reader, const std::string& key);

/// Reads a beam's full width at half maximum: above 0, at most 180 deg.
[[nodiscard]] std::optional<Angle> read_beam_fwhm(TomlReader& reader, const std::string& key);

/// Reads a unit of brightness such as "uK_CMB".
[[nodiscard]] std::optional<BrightnessUnit> read_unit(TomlReader& reader, const std::string& key);

/// Reads a brightness such as "8.9 K_RJ".
[[nodiscard]] std::optional<Brightness> read_brightness(TomlReader& reader, const std::string& key);

/// Reads a number within [low, high].
[[nodiscard]] std::optional<double> read_number(TomlReader& reader, const std::string& key, double low,
                                                double high, const std::string& example);

/// Reads a whole number within [low, high].
[[nodiscard]] std::optional<std::int64_t> read_integer(TomlReader& reader, const std::string& key,
                                                       std::int64_t low, std::int64_t high,
                                                       const std::string& example);

/// Reads the path of a file that must exist, relative to `folder` (to the caller's folder where an option
/// gave it).
[[nodiscard]] std::optional<std::filesystem::path> read_path(TomlReader& reader, const std::string& key,
                                                             const std::filesystem::path& folder);

/// Resolves a path as read_path does, for keys that hold it in a value of their own.
/// @throws InputError where no such file exists
[[nodiscard]] std::filesystem::path resolve_path(const TomlReader& reader, const std::string& key,
                                                 const TomlValue& value, const std::string& text,
                                                 const std::filesystem::path& folder);

/// Throws InputError that refuses a section or key which a later version brings.
void refuse_for_now(TomlReader& reader, const std::string& key);

/// Reads one of a few words, in any case of letters.
template <typename T>
[[nodiscard]] std::optional<T> read_choice(TomlReader& reader, const std::string& key,
                                           std::initializer_list<std::pair<const char*, T>> choices) {
    const std::optional<std::string> text = reader.text(key, key + " = \"" + choices.begin()->first + "\"");
    if (!text) return std::nullopt;
    std::string list;
    std::vector<std::string> words;
    for (const auto& [word, value] : choices) {
        if (to_lower(word) == to_lower(trim(*text))) return value;
        words.emplace_back(word);
        list += (list.empty() ? "" : ", ") + ("\"" + words.back() + "\"");
    }
    const std::string nearest = nearest_word(*text, words);
    reader.fail(key, "must be one of " + list + ", but is '" + *text + "'" +
                         (nearest.empty() ? "" : ": did you mean \"" + nearest + "\"?"));
}

}  // namespace foreglow
