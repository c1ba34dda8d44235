// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/fits_header_text.h"

#include <fitsio.h>

#include <algorithm>
#include <cctype>
#include <charconv>
#include <cmath>
#include <cstdlib>
#include <ctime>
#include <string_view>

#include "base/error.h"
#include "base/text.h"
#include "io/fits_sentinel.h"

namespace foreglow {
namespace {

constexpr std::int64_t block_bytes = 2880;
constexpr std::size_t card_chars = 80;
constexpr std::int64_t full_row_pixels = 1024;  // the row length of released HEALPix maps
constexpr const char* empty_checksum = "0000000000000000";

/// A header being built in memory by CFITSIO; the data unit never exists there.
class HeaderBuilder {
  public:
    HeaderBuilder() {
        check(fits_create_file(&file_, "mem://", &status_));
        check(fits_create_img(file_, BYTE_IMG, 0, nullptr, &status_));
    }
    ~HeaderBuilder() {
        int ignored = 0;
        fits_close_file(file_, &ignored);
    }
    HeaderBuilder(const HeaderBuilder&) = delete;
    HeaderBuilder& operator=(const HeaderBuilder&) = delete;

    /// Begins a table without rows; their number is set in the text, since CFITSIO would fill them with
    /// zeros.
    void begin_table(std::vector<std::string> names, std::vector<std::string> formats) {
        std::vector<char*> name_pointers, format_pointers;
        for (auto& name : names)
            name_pointers.push_back(name.data());
        for (auto& format : formats)
            format_pointers.push_back(format.data());
        check(fits_create_tbl(file_, BINARY_TBL, 0, static_cast<int>(names.size()), name_pointers.data(),
                              format_pointers.data(), nullptr, nullptr, &status_));
    }
    void add(const std::string& key, const std::string& value, const std::string& comment) {
        const std::string text = printable(value);
        if (key == "COMMENT" || key == "HISTORY") {
            check(key == "COMMENT" ? fits_write_comment(file_, text.c_str(), &status_)
                                   : fits_write_history(file_, text.c_str(), &status_));
            return;
        }
        // 68 characters fit between the quotes of one card; doubled quotes count twice.
        const auto quotes = std::count(text.begin(), text.end(), '\'');
        if (static_cast<std::ptrdiff_t>(text.size()) + quotes > 68) fits_write_key_longwarn(file_, &status_);
        check(fits_write_key_longstr(file_, key.c_str(), text.c_str(), printable(comment).c_str(), &status_));
    }
    void add(const std::string& key, std::int64_t value, const std::string& comment) {
        check(fits_write_key_lng(file_, key.c_str(), value, printable(comment).c_str(), &status_));
    }
    void add(const std::string& key, bool value, const std::string& comment) {
        check(fits_write_key_log(file_, key.c_str(), value ? 1 : 0, printable(comment).c_str(), &status_));
    }
    /// Writes the shortest digits that read back to the same double, which CFITSIO's own fixed formats do
    /// not.
    void add(const std::string& key, double value, const std::string& comment) {
        FOREGLOW_EXPECTS(std::isfinite(value));
        std::string digits = format_exact(value);
        std::transform(digits.begin(), digits.end(), digits.begin(),
                       [](unsigned char c) { return std::toupper(c); });
        if (digits.find_first_of(".E") == std::string::npos) digits += '.';
        std::string card = key + std::string(8 - key.size(), ' ') + "= ";
        if (digits.size() < 20) card.append(20 - digits.size(), ' ');
        card += digits;
        if (!comment.empty()) card += " / " + printable(comment);
        card.resize(card_chars, ' ');
        check(fits_write_record(file_, card.c_str(), &status_));
    }
    void add_card(const FitsCard& card) {
        const bool valid = !card.key.empty() && card.key.size() <= 8 &&
                           std::all_of(card.key.begin(), card.key.end(), [](unsigned char c) {
                               return std::isupper(c) || std::isdigit(c) || c == '-' || c == '_';
                           });
        FOREGLOW_EXPECTS(valid);
        std::visit([&](const auto& value) { add(card.key, value, card.comment); }, card.value);
    }
    void add_checksums() {
        add("CHECKSUM", std::string(empty_checksum), "HDU checksum");
        add("DATASUM", std::string("0"), "data unit checksum");
    }

    /// Returns the text of the current header, padded to whole blocks.
    [[nodiscard]] std::string text() {
        char* cards = nullptr;
        int count = 0;
        check(fits_hdr2str(file_, 0, nullptr, 0, &cards, &count, &status_));
        std::string out(cards);  // whole cards, END included
        fits_free_memory(cards, &status_);
        out.resize(static_cast<std::size_t>(round_up_to_fits_block(static_cast<std::int64_t>(out.size()))),
                   ' ');
        return out;
    }

  private:
    static void check(int status) { FOREGLOW_EXPECTS(status == 0); }
    /// FITS headers hold printable ASCII only (FITS 4.0, section 3.2).
    static std::string printable(std::string text) {
        for (char& c : text) {
            if (c < 0x20 || c > 0x7e) c = '?';
        }
        return text;
    }

    fitsfile* file_ = nullptr;
    int status_ = 0;
};

/// Replaces the value of a card, which must be there, keeping its width.
void set_card_value(std::string& header, std::string_view key, std::string value, bool at_right) {
    std::string start(key);
    start.resize(8, ' ');
    start += "= ";
    for (std::size_t at = 0; at < header.size(); at += card_chars) {
        if (header.compare(at, start.size(), start) != 0) continue;
        const std::size_t slash = header.find('/', at + start.size());
        const std::size_t width = std::max<std::size_t>(20, slash - at - start.size() - 1);
        FOREGLOW_EXPECTS(value.size() <= width);
        if (at_right) value.insert(0, width - value.size(), ' ');
        value.resize(width, ' ');
        header.replace(at + start.size(), width, value);
        return;
    }
    FOREGLOW_EXPECTS(false && "the card is there");
}

std::uint32_t sum_of_words(std::string_view bytes) {
    std::uint64_t sum = 0;
    for (std::size_t i = 0; i < bytes.size(); i += 4) {
        for (std::size_t j = 0; j < 4; ++j)
            sum += std::uint64_t{static_cast<unsigned char>(bytes[i + j])} << (24 - 8 * j);
    }
    return fold_checksum(sum);
}

std::string in_quotes(std::string_view text) {
    std::string out;
    return out.append(1, '\'').append(text).append(1, '\'');
}

/// Puts DATASUM, then the CHECKSUM that makes the whole HDU sum to minus zero, into a header.
void sign_header(std::string& header, std::uint32_t data_sum) {
    set_card_value(header, "DATASUM", in_quotes(std::to_string(data_sum)), false);
    const std::uint32_t total = fold_checksum(std::uint64_t{sum_of_words(header)} + data_sum);
    char encoded[17] = {};
    fits_encode_chksum(total, 1, encoded);
    set_card_value(header, "CHECKSUM", in_quotes(encoded), false);
}

std::string column_name(std::string name) {
    for (char& c : name) {
        if (!std::isalnum(static_cast<unsigned char>(c))) c = '_';
    }
    return name;
}

/// The time of SOURCE_DATE_EPOCH as FITS writes it, or "" where the variable is not set.
std::string reproducible_date() {
    const char* text = std::getenv("SOURCE_DATE_EPOCH");
    if (text == nullptr || *text == '\0') return "";
    const std::string_view digits = text;
    std::time_t seconds = 0;
    const auto read = std::from_chars(digits.data(), digits.data() + digits.size(), seconds);
    std::tm utc{};
    char date[32] = {};
    if (read.ec != std::errc() || read.ptr != digits.data() + digits.size() || seconds < 0 ||
        gmtime_r(&seconds, &utc) == nullptr ||
        std::strftime(date, sizeof date, "%Y-%m-%dT%H:%M:%S", &utc) != 19) {
        throw InputError("the environment variable SOURCE_DATE_EPOCH = '" + std::string(digits) +
                         "' is no number of seconds since 1970; set it right or unset it");
    }
    return date;
}

void add_healpix_cards(HeaderBuilder& builder, const FitsMapLayout& layout) {
    const bool partial = layout.pixels.has_value();
    const std::int64_t first = partial ? layout.pixels->front() : 0;
    const std::int64_t last = partial ? layout.pixels->back() : 12LL * layout.nside * layout.nside - 1;
    const auto add = [&](const char* key, const char* value, const char* comment) {
        builder.add(std::string(key), std::string(value), std::string(comment));
    };
    add("PIXTYPE", "HEALPIX", "HEALPix pixelization");
    add("ORDERING", layout.ordering == Ordering::Ring ? "RING" : "NESTED", "pixel order: RING or NESTED");
    builder.add("NSIDE", std::int64_t{layout.nside}, "resolution of the grid");
    builder.add("FIRSTPIX", first, "first pixel number (from 0)");
    builder.add("LASTPIX", last, "last pixel number (from 0)");
    add("INDXSCHM", partial ? "EXPLICIT" : "IMPLICIT", "indexing: IMPLICIT or EXPLICIT");
    builder.add("GRAIN", std::int64_t{partial ? 1 : 0}, "pixels per listed number; 0 for IMPLICIT");
    add("OBJECT", partial ? "PARTIAL" : "FULLSKY", "sky coverage: FULLSKY or PARTIAL");
    if (partial)
        builder.add("OBS_NPIX", static_cast<std::int64_t>(layout.pixels->size()), "number of pixels listed");
    builder.add("COORDSYS", std::string(1, coordsys_letter(layout.frame)),
                "G galactic, C celestial (ICRS), E ecliptic");
    if (layout.convention) {
        builder.add("POLAR", true, "polarization is included");
        add("POLCCONV", *layout.convention == PolarizationConvention::Cosmo ? "COSMO" : "IAU",
            "sign of U: COSMO or IAU");
    }
    builder.add("BAD_DATA", fits_bad_data, "value of undefined pixels");
}

}  // namespace

std::int64_t round_up_to_fits_block(std::int64_t bytes) {
    return (bytes + block_bytes - 1) / block_bytes * block_bytes;
}

std::uint32_t fold_checksum(std::uint64_t sum) {
    while (sum >> 32 != 0)
        sum = (sum & 0xffffffff) + (sum >> 32);
    return static_cast<std::uint32_t>(sum);
}

FitsTableShape make_table_shape(const FitsMapLayout& layout) {
    FOREGLOW_EXPECTS(is_valid_nside(layout.nside) && !layout.columns.empty());
    const std::int64_t npix = 12LL * layout.nside * layout.nside;
    FitsTableShape shape;
    shape.cell_bytes = layout.float64 ? 8 : 4;
    shape.columns = static_cast<std::int64_t>(layout.columns.size());
    if (layout.pixels) {
        shape.rows = static_cast<std::int64_t>(layout.pixels->size());
        shape.index_bytes = 4;  // the largest number, 12 * 8192^2 - 1, is below 2^31
        return shape;
    }
    shape.row_pixels = npix % full_row_pixels == 0 ? full_row_pixels : 1;
    shape.rows = npix / shape.row_pixels;
    return shape;
}

std::string make_map_headers(const FitsMapLayout& layout, std::uint32_t data_sum) {
    const FitsTableShape shape = make_table_shape(layout);
    HeaderBuilder builder;
    builder.add_checksums();
    std::string primary = builder.text();
    sign_header(primary, 0);

    std::vector<std::string> names, formats;
    if (layout.pixels) {
        names.emplace_back("PIXEL");
        formats.emplace_back("1J");
    }
    for (const auto& column : layout.columns) {
        names.push_back(column_name(column.name));
        formats.push_back(std::to_string(shape.row_pixels) + (layout.float64 ? "D" : "E"));
    }
    builder.begin_table(names, formats);
    for (std::size_t i = 0; i < layout.columns.size(); ++i) {
        if (layout.columns[i].unit.empty()) continue;
        const std::size_t number = i + 1 + (layout.pixels ? 1 : 0);
        builder.add("TUNIT" + std::to_string(number), layout.columns[i].unit, "unit of the column");
    }
    if (!layout.extname.empty()) builder.add("EXTNAME", layout.extname, "name of this table");
    add_healpix_cards(builder, layout);
    for (const auto& card : layout.cards)
        builder.add_card(card);
    if (const std::string date = reproducible_date(); !date.empty())
        builder.add("DATE", date, "UTC, from SOURCE_DATE_EPOCH");
    builder.add_checksums();
    std::string table = builder.text();
    set_card_value(table, "NAXIS2", std::to_string(shape.rows), true);
    sign_header(table, data_sum);
    return primary + table;
}

}  // namespace foreglow
