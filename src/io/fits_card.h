// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <optional>
#include <span>
#include <string>
#include <variant>

namespace foreglow {

/// One card of a FITS header: KEYWORD = value / comment.
struct FitsCard {
    std::string key;  ///< up to eight of A-Z, 0-9, '-' and '_'
    std::variant<std::string, double, std::int64_t, bool> value;
    std::string comment;
};

/// Turns the value field of a card into a value: 'text' (doubled quotes stand for one), T or F, a whole or a
/// real number.
[[nodiscard]] std::variant<std::string, double, std::int64_t, bool> parse_card_value(
    const std::string& field);

/// Returns the first card of that keyword, or null.
[[nodiscard]] const FitsCard* find_card(std::span<const FitsCard> cards, const std::string& key);
/// Returns a card's number, be it written as a whole or a real one.
[[nodiscard]] std::optional<double> card_number(std::span<const FitsCard> cards, const std::string& key);
/// Returns a card's whole number.
[[nodiscard]] std::optional<std::int64_t> card_whole(std::span<const FitsCard> cards, const std::string& key);
/// Returns a card's text without blanks at its ends.
[[nodiscard]] std::optional<std::string> card_text(std::span<const FitsCard> cards, const std::string& key);

}  // namespace foreglow
