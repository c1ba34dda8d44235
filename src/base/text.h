// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <span>
#include <string>
#include <string_view>
#include <vector>

namespace foreglow {

/// Removes blanks, tabs and line ends at both ends.
[[nodiscard]] std::string_view trim(std::string_view text);

/// Returns the same text in lower case (ASCII only).
[[nodiscard]] std::string to_lower(std::string_view text);

/// Splits at each separator; empty pieces are kept, so n separators give n + 1 pieces.
[[nodiscard]] std::vector<std::string> split(std::string_view text, char separator);

/// Returns the candidate nearest to a word by Levenshtein distance, or "" when none is near enough to be a
/// slip of the pen.
[[nodiscard]] std::string nearest_word(std::string_view word, std::span<const std::string> candidates);

/// Writes a number with at most `digits` significant digits and no needless zeros: 0.1, 1e-05, 30.
[[nodiscard]] std::string format_number(double value, int digits);

/// Writes a number in the shortest form that reads back to the same double.
[[nodiscard]] std::string format_exact(double value);

/// Writes a size as a person would: "12.0 GiB", "512 B".
[[nodiscard]] std::string format_bytes(std::uint64_t bytes);

/// Reads "8 GiB", "500 MB", "1.5 TB".
/// @throws InputError where the number or the unit is wrong; the message does not name the key
[[nodiscard]] std::uint64_t parse_bytes(std::string_view text);

}  // namespace foreglow
