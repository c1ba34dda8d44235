// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/fits_header_check.h"

#include <unistd.h>

#include <array>
#include <cerrno>
#include <string_view>

#include "base/error.h"
#include "base/text.h"
#include "io/atomic_file.h"
#include "io/fits_card.h"

namespace foreglow {
namespace {

constexpr std::size_t card_chars = 80;
constexpr std::int64_t most_blocks =
    10000;  // 360 000 cards; a header without END could be as long as its file
using Block = std::array<char, 2880>;

/// Reads one block; false at the end of the file.
bool read_block(int descriptor, std::int64_t offset, const std::string& where, Block& block) {
    ssize_t got = -1;
    do {
        got = ::pread(descriptor, block.data(), block.size(), offset);
    } while (got < 0 && errno == EINTR);
    if (got < 0) throw FileError(where + "cannot be read: " + system_reason(errno));
    return got == static_cast<ssize_t>(block.size());
}

bool is_size_card(std::string_view key) {
    return key == "PCOUNT" || key == "GCOUNT" || key == "TFIELDS" ||
           (key.substr(0, 5) == "NAXIS" && key.size() <= 8);
}

void check_card(std::string_view card, const std::string& where) {
    const std::string_view key = trim(card.substr(0, 8));
    if (card.substr(8, 2) != "= " || !is_size_card(key)) return;
    const std::string field(trim(card.substr(10, card.find('/') - 10)));
    const auto value = parse_card_value(field);
    const auto* whole = std::get_if<std::int64_t>(&value);
    const bool counts_few =
        key == "NAXIS" || key == "TFIELDS";  // at most 999, FITS 4.0, sections 4.4.1 and 7.3.1
    if (whole != nullptr && *whole >= 0 && (!counts_few || *whole <= 999)) return;
    throw DataError(where + std::string(key) + " = " + field + " is no whole number " +
                    (counts_few ? "from 0 to 999" : "of 0 or more") + "; the header is damaged");
}

}  // namespace

void check_fits_header(int descriptor, std::int64_t offset, const std::string& where) {
    Block block{};
    for (std::int64_t b = 0; b < most_blocks; ++b) {
        const bool whole =
            read_block(descriptor, offset + b * static_cast<std::int64_t>(block.size()), where, block);
        if (!whole && b == 0 && offset > 0) return;  // the end, or junk that is no header
        if (!whole) break;
        const std::string_view cards(block.data(), block.size());
        if (b == 0 && cards.substr(0, 8) != "XTENSION" && cards.substr(0, 6) != "SIMPLE") return;
        for (std::size_t at = 0; at < cards.size(); at += card_chars) {
            const std::string_view card = cards.substr(at, card_chars);
            if (trim(card.substr(0, 8)) == "END") return;
            check_card(card, where);
        }
    }
    throw DataError(where + "the header has no END card; the file is damaged or cut short: get it again");
}

}  // namespace foreglow
