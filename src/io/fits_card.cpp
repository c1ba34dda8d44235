// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/fits_card.h"

#include <algorithm>
#include <cerrno>
#include <cstdlib>

#include "base/text.h"

namespace foreglow {

std::variant<std::string, double, std::int64_t, bool> parse_card_value(const std::string& field) {
    if (field.empty()) return std::string();
    if (field.front() == '\'') {
        std::string out;
        for (std::size_t i = 1; i < field.size(); ++i) {
            if (field[i] == '\'') {
                if (i + 1 >= field.size() || field[i + 1] != '\'') break;
                ++i;  // a doubled quote stands for one
            }
            out += field[i];
        }
        out.erase(out.find_last_not_of(' ') + 1);
        return out;
    }
    if (field == "T" || field == "F") return field == "T";
    char* end = nullptr;
    errno = 0;
    const long long whole = std::strtoll(field.c_str(), &end, 10);
    if (*end == '\0' && errno == 0) return std::int64_t{whole};
    std::string real = field;
    std::replace(real.begin(), real.end(), 'D', 'E');  // Fortran's double exponent
    const double number = std::strtod(real.c_str(), &end);
    if (*end == '\0') return number;
    return field;
}

const FitsCard* find_card(std::span<const FitsCard> cards, const std::string& key) {
    const auto at =
        std::find_if(cards.begin(), cards.end(), [&](const FitsCard& card) { return card.key == key; });
    return at == cards.end() ? nullptr : &*at;
}

std::optional<double> card_number(std::span<const FitsCard> cards, const std::string& key) {
    const FitsCard* card = find_card(cards, key);
    if (card == nullptr) return std::nullopt;
    if (const auto* real = std::get_if<double>(&card->value)) return *real;
    if (const auto* whole = std::get_if<std::int64_t>(&card->value)) return static_cast<double>(*whole);
    return std::nullopt;
}

std::optional<std::int64_t> card_whole(std::span<const FitsCard> cards, const std::string& key) {
    const FitsCard* card = find_card(cards, key);
    const auto* whole = card == nullptr ? nullptr : std::get_if<std::int64_t>(&card->value);
    if (whole == nullptr) return std::nullopt;
    return *whole;
}

std::optional<std::string> card_text(std::span<const FitsCard> cards, const std::string& key) {
    const FitsCard* card = find_card(cards, key);
    const auto* text = card == nullptr ? nullptr : std::get_if<std::string>(&card->value);
    if (text == nullptr) return std::nullopt;
    return std::string(trim(*text));
}

}  // namespace foreglow
