// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/fits_map_header.h"

#include <algorithm>
#include <cmath>
#include <string_view>

#include "base/error.h"
#include "base/text.h"

namespace foreglow {
namespace {

constexpr std::string_view number_types = "BIJKED";

bool holds_numbers(const FitsTableColumn& column) {
    return number_types.find(column.type) != std::string_view::npos || column.type == 'L';
}

std::string quoted_list(const std::vector<FitsMapColumnInfo>& columns) {
    std::string text;
    for (const auto& column : columns) {
        if (!text.empty()) text += ", ";
        text += std::to_string(column.number) + " " + (column.name.empty() ? "(no name)" : column.name);
    }
    return text;
}

std::string to_text(Ordering ordering) {
    return ordering == Ordering::Ring ? "ring" : "nested";
}

/// Finds explicit indexing and marks the column of pixel numbers.
void find_indexing(FitsMapHeader& header, const std::string& where) {
    const std::string scheme = to_lower(header.text("INDXSCHM").value_or(""));
    const auto named = std::find_if(header.columns.begin(), header.columns.end(),
                                    [](const auto& column) { return to_lower(column.name) == "pixel"; });
    header.partial = scheme == "explicit" || (scheme != "implicit" && named != header.columns.end());
    if (!header.partial) return;
    // The HEALPix convention puts the pixel numbers first; most files also call them PIXEL.
    const auto column = named != header.columns.end() ? named : header.columns.begin();
    column->holds_pixel_numbers = true;
    if (named == header.columns.end()) {
        header.notices.push_back(where +
                                 "no column is called PIXEL; column 1 is taken for the pixel numbers");
    }
}

/// Returns NSIDE where the card is there and holds a whole number.
std::optional<std::int64_t> read_nside_card(const FitsMapHeader& header, const std::string& where) {
    if (header.find("NSIDE") == nullptr) return std::nullopt;
    const std::optional<double> nside = header.number("NSIDE");
    if (!nside || !(*nside >= 1) || *nside > 1e15 || std::floor(*nside) != *nside) {
        throw DataError(where + "the card NSIDE holds no whole number of 1 or more; the header is damaged");
    }
    return static_cast<std::int64_t>(*nside);
}

/// Returns a grid's nside, whose own limits are checked here.
int checked_nside(std::int64_t nside, const std::string& where) {
    const std::string said = where + "NSIDE = " + std::to_string(nside);
    if (nside > HealpixGrid::max_nside) {
        const double bytes = 12.0 * static_cast<double>(nside) * static_cast<double>(nside) * sizeof(double);
        const std::string memory =
            bytes < 1e19 ? format_bytes(static_cast<std::uint64_t>(bytes)) : "more than any machine has";
        throw DataError(said + " is more than Foreglow handles (8192; one column in memory would take " +
                        memory + "); bring the map to a coarser grid first");
    }
    if (!is_valid_nside(nside)) throw DataError(said + " is not a power of two; the header is damaged");
    return static_cast<int>(nside);
}

/// Works out nside for implicit indexing, and holds rows x repeat against it.
int implicit_nside(FitsMapHeader& header, const FitsTable& table, const FitsTableColumn& column,
                   const std::string& where) {
    std::int64_t cells = 0;
    if (__builtin_mul_overflow(table.rows, column.repeat, &cells)) {
        throw DataError(where + "NAXIS2 and TFORM make more pixels than can be; the header is damaged");
    }
    const std::string counted = "NAXIS2 = " + std::to_string(table.rows) + " rows of TFORM" +
                                std::to_string(column.number) + " = '" + column.format + "' make " +
                                std::to_string(cells) + " pixels";
    const std::optional<std::int64_t> card = read_nside_card(header, where);
    if (card) {
        const int nside = checked_nside(*card, where);
        const std::int64_t npix = 12LL * nside * nside;
        if (cells != npix) {
            throw DataError(where + counted + ", but NSIDE = " + std::to_string(nside) + " wants " +
                            std::to_string(npix) +
                            "; the header contradicts itself, or a partial map lacks INDXSCHM = 'EXPLICIT'");
        }
        return nside;
    }
    const auto nside = static_cast<std::int64_t>(std::llround(std::sqrt(static_cast<double>(cells) / 12.0)));
    if (nside < 1 || nside > (1 << 29) || 12 * nside * nside != cells || (nside & (nside - 1)) != 0) {
        throw DataError(where + "there is no NSIDE card, and " + counted +
                        ", which no nside has (12 nside^2)");
    }
    header.notices.push_back(where + "no NSIDE card; " + counted + ", so nside is " + std::to_string(nside));
    return checked_nside(nside, where);
}

void read_grid(FitsMapHeader& header, const FitsTable& table, const std::string& where) {
    if (!header.partial) {
        const auto counted = std::find_if(table.columns.begin(), table.columns.end(), holds_numbers);
        if (counted == table.columns.end())
            throw DataError(where + "none of the columns holds numbers: no map is in it");
        header.grid = HealpixGrid(implicit_nside(header, table, *counted, where));
        header.listed = header.grid.npix();
        return;
    }
    const std::optional<std::int64_t> card = read_nside_card(header, where);
    if (!card)
        throw DataError(
            where +
            "a partial map (explicit pixel numbers) without the card NSIDE cannot be placed on the sky");
    header.grid = HealpixGrid(checked_nside(*card, where));
    const auto index = std::find_if(header.columns.begin(), header.columns.end(),
                                    [](const auto& c) { return c.holds_pixel_numbers; });
    const FitsTableColumn& pixels = table.columns[static_cast<std::size_t>(index - header.columns.begin())];
    if (number_types.find(pixels.type) == std::string_view::npos) {
        throw DataError(where + "the column of pixel numbers, '" + pixels.name + "', has TFORM = '" +
                        pixels.format + "', which holds no numbers");
    }
    if (pixels.repeat < 1)
        throw DataError(where + "the column of pixel numbers, '" + pixels.name + "', is empty (TFORM = '" +
                        pixels.format + "')");
    if (__builtin_mul_overflow(table.rows, pixels.repeat, &header.listed) ||
        header.listed > header.grid.npix()) {
        throw DataError(where + "NAXIS2 = " + std::to_string(table.rows) + " rows of '" + pixels.format +
                        "' list more pixels than NSIDE = " + std::to_string(header.grid.nside()) + " has, " +
                        std::to_string(header.grid.npix()));
    }
}

void read_ordering(FitsMapHeader& header, const FitsMapRequest& request, const std::string& where) {
    const std::optional<std::string> card = header.text("ORDERING");
    std::optional<Ordering> said;
    if (card) {
        const std::string lower = to_lower(*card);
        if (lower == "ring") said = Ordering::Ring;
        if (lower == "nested" || lower == "nest") said = Ordering::Nested;
        if (!said && !lower.empty())
            header.notices.push_back(where + "ORDERING = '" + *card + "' is no ordering and is ignored");
        if (said && *card != "RING" && *card != "NESTED") {
            header.notices.push_back(where + "ORDERING = '" + *card + "' is taken for " +
                                     (*said == Ordering::Ring ? "RING" : "NESTED"));
        }
    }
    if (said && request.ordering && *said != *request.ordering) {
        throw InputError(message_place(request) + "`ordering = \"" + to_text(*request.ordering) +
                         "\"` contradicts ORDERING = '" + *card + "' in " + request.path.string() +
                         "; remove the key, or correct the file");
    }
    header.ordering = said ? said : request.ordering;
}

void read_frame(FitsMapHeader& header, const FitsMapRequest& request, const std::string& where) {
    const std::optional<std::string> card = header.text("COORDSYS");
    const std::optional<Frame> said = card ? read_frame_card(*card) : std::nullopt;
    if (card && !said && !card->empty() && to_lower(*card) != "unknown") {
        header.notices.push_back(where + "COORDSYS = '" + *card + "' is no frame and is ignored");
    }
    if (said && request.frame && *said != *request.frame) {
        throw InputError(message_place(request) + "`frame = \"" + to_text(*request.frame) +
                         "\"` contradicts COORDSYS = '" + *card + "' in " + request.path.string() +
                         "; remove the key, or correct the file");
    }
    header.frame = said ? said : request.frame;
}

void read_convention(FitsMapHeader& header, const std::string& where) {
    const std::optional<std::string> card = header.text("POLCCONV");
    if (!card) return;
    const std::string lower = to_lower(*card);
    if (lower == "cosmo") header.convention = PolarizationConvention::Cosmo;
    if (lower == "iau") header.convention = PolarizationConvention::Iau;
    if (!header.convention && !lower.empty() && lower != "unknown") {
        header.notices.push_back(where + "POLCCONV = '" + *card +
                                 "' is neither COSMO nor IAU and is ignored");
    }
}

/// Finds the column that a request names.
std::size_t find_column(const FitsMapHeader& header, const std::variant<int, std::string>& wanted,
                        const FitsMapRequest& request) {
    const std::string where = message_place(request);
    const std::string there =
        message_table(request, header.hdu) + "the columns are " + quoted_list(header.columns);
    if (const int* number = std::get_if<int>(&wanted)) {
        if (*number >= 1 && *number <= static_cast<int>(header.columns.size()))
            return static_cast<std::size_t>(*number - 1);
        throw InputError(where + "there is no column " + std::to_string(*number) + "; in " + there);
    }
    const std::string name = to_lower(trim(std::get<std::string>(wanted)));
    std::vector<std::string> names;
    std::size_t found = header.columns.size();
    for (std::size_t i = 0; i < header.columns.size(); ++i) {
        names.push_back(to_lower(header.columns[i].name));
        if (names.back() != name) continue;
        if (found < header.columns.size()) {
            throw InputError(where + "two columns are called '" + std::get<std::string>(wanted) +
                             "'; name it by number: in " + there);
        }
        found = i;
    }
    if (found < header.columns.size()) return found;
    const std::string near = nearest_word(name, names);
    const auto at = static_cast<std::size_t>(std::find(names.begin(), names.end(), near) - names.begin());
    throw InputError(where + "there is no column '" + std::get<std::string>(wanted) + "'" +
                     (near.empty() ? "" : " (did you mean '" + header.columns[at].name + "'?)") + "; in " +
                     there);
}

void find_requested(FitsMapHeader& header, const FitsTable& table, const FitsMapRequest& request,
                    const std::string& where) {
    std::vector<std::size_t> found;
    for (const auto& wanted : request.columns)
        found.push_back(find_column(header, wanted, request));
    if (request.columns.empty()) {
        const auto first = std::find_if(header.columns.begin(), header.columns.end(),
                                        [](const auto& c) { return !c.holds_pixel_numbers; });
        if (first != header.columns.end())
            found.push_back(static_cast<std::size_t>(first - header.columns.begin()));
    }
    for (const std::size_t i : found) {
        const FitsTableColumn& column = table.columns[i];
        const std::string name = "column " + std::to_string(column.number) + " '" + column.name + "'";
        if (header.columns[i].holds_pixel_numbers) {
            throw InputError(
                message_place(request) + name + " of " + request.path.string() +
                " holds the pixel numbers; name one of the others: " + quoted_list(header.columns));
        }
        if (!holds_numbers(column)) {
            throw DataError(where + name + " has TFORM = '" + column.format +
                            "', which holds no float, double or integer numbers");
        }
        if (table.rows * column.repeat != header.listed) {
            throw DataError(where + name + " has TFORM = '" + column.format + "', so " +
                            std::to_string(table.rows) + " rows hold " +
                            std::to_string(table.rows * column.repeat) + " values for " +
                            std::to_string(header.listed) + " pixels");
        }
        header.requested.push_back(column.number);
    }
}

}  // namespace

const FitsCard* FitsMapHeader::find(const std::string& key) const {
    return find_card(cards, key);
}
std::optional<double> FitsMapHeader::number(const std::string& key) const {
    return card_number(cards, key);
}
std::optional<std::string> FitsMapHeader::text(const std::string& key) const {
    return card_text(cards, key);
}

std::optional<Frame> read_frame_card(const std::string& text) {
    const std::string lower = to_lower(trim(text));
    if (lower == "g" || lower == "gal" || lower == "galactic") return Frame::Galactic;
    if (lower == "e" || lower == "ecl" || lower == "ecliptic") return Frame::Ecliptic;
    for (const auto* name : {"c", "q", "cel", "celestial", "equ", "equatorial", "icrs"}) {
        if (lower == name) return Frame::Icrs;
    }
    return std::nullopt;
}

FitsMapHeader make_fits_map_header(const FitsTable& table, const FitsMapRequest& request) {
    const std::string where = message_table(request, table.hdu);
    FitsMapHeader header;
    header.path = request.path;
    header.hdu = table.hdu;
    header.cards = table.cards;
    for (const auto& column : table.columns)
        header.columns.push_back({column.number, column.name, column.unit, column.format, false});
    find_indexing(header, where);
    read_grid(header, table, where);
    read_ordering(header, request, where);
    read_frame(header, request, where);
    read_convention(header, where);
    find_requested(header, table, request, where);
    return header;
}

Ordering required_ordering(const FitsMapHeader& header, const FitsMapRequest& request) {
    if (header.ordering) return *header.ordering;
    const std::optional<std::string> card = header.text("ORDERING");
    throw InputError(message_place(request) + request.path.string() +
                     " does not say in which order its pixels are (" +
                     (card ? "ORDERING = '" + *card + "'" : "no card ORDERING") + "); " +
                     advice_to_add(request, "ordering = \"ring\"") + " or `ordering = \"nested\"`");
}

std::string message_place(const FitsMapRequest& request) {
    return request.place.empty() ? "" : request.place + ": ";
}

std::string advice_to_add(const FitsMapRequest& request, const std::string& key_and_value) {
    return "add `" + key_and_value + "`" + (request.section.empty() ? "" : " to [" + request.section + "]");
}

}  // namespace foreglow
