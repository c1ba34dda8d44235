// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <algorithm>
#include <bit>
#include <cstdint>
#include <filesystem>
#include <string>
#include <utility>
#include <vector>

#include "support/temporary_folder.h"

namespace foreglow::testing {

/// Builds the bytes of a FITS file with one HEALPix table by hand, so that it can be wrong in any way a test
/// wants.
class FitsMapBuilder {
  public:
    /// Begins an implicit RING map of that nside with the usual cards and no columns.
    explicit FitsMapBuilder(int nside) {
        card("PIXTYPE", "'HEALPIX '").card("ORDERING", "'RING    '").card("NSIDE", std::to_string(nside));
        card("INDXSCHM", "'IMPLICIT'").card("COORDSYS", "'G       '");
    }
    /// Sets a card's value as it stands in the file, quotes included; a structural card's own value is
    /// overruled.
    FitsMapBuilder& card(const std::string& key, const std::string& value) {
        for (auto& [name, old] : cards_) {
            if (name == key) {
                old = value;
                return *this;
            }
        }
        cards_.emplace_back(key, value);
        return *this;
    }
    FitsMapBuilder& without(const std::string& key) {
        std::erase_if(cards_, [&name = key](const auto& one) { return one.first == name; });
        return *this;
    }
    /// Adds a column; its values are stored as the letter of the format says (B I J K E D L), rows as the
    /// first column makes.
    FitsMapBuilder& column(const std::string& name, const std::string& format, std::vector<double> values,
                           const std::string& unit = "") {
        columns_.push_back({name, format, unit, std::move(values)});
        return *this;
    }
    /// Puts these bytes in place of the primary HDU's, as of an image.
    FitsMapBuilder& primary(std::string bytes) {
        primary_ = std::move(bytes);
        return *this;
    }

    [[nodiscard]] std::string bytes() const { return primary_ + table(); }
    void write(const std::filesystem::path& path) const { write_whole_file(path, bytes()); }

    static std::string block_of_cards(const std::vector<std::pair<std::string, std::string>>& cards) {
        std::string out;
        for (const auto& [key, value] : cards) {
            std::string line = key;
            line.resize(8, ' ');
            line += "= ";
            if (value.empty() || value.front() != '\'')
                line.append(value.size() < 20 ? 20 - value.size() : 0, ' ');
            line += value;
            line.resize(80, ' ');
            out += line;
        }
        out += "END";
        return padded(std::move(out), ' ');
    }
    static std::string padded(std::string bytes, char fill) {
        bytes.resize((bytes.size() + 2879) / 2880 * 2880, fill);
        return bytes;
    }
    /// Returns a primary HDU with an image of width x height zero bytes.
    static std::string image(int width, int height) {
        return block_of_cards({{"SIMPLE", "T"},
                               {"BITPIX", "8"},
                               {"NAXIS", "2"},
                               {"NAXIS1", std::to_string(width)},
                               {"NAXIS2", std::to_string(height)},
                               {"EXTEND", "T"}}) +
               padded(std::string(static_cast<std::size_t>(width) * static_cast<std::size_t>(height), '\0'),
                      '\0');
    }
    /// Returns the table HDU alone.
    [[nodiscard]] std::string table() const {
        std::string data;
        const std::size_t rows = columns_.empty() ? 0 : columns_[0].values.size() / columns_[0].repeat();
        for (std::size_t row = 0; row < rows; ++row) {
            for (const auto& column : columns_)
                column.append_row(row, data);
        }
        const std::size_t row_bytes = rows == 0 ? 0 : data.size() / rows;
        std::vector<std::pair<std::string, std::string>> all = {{"XTENSION", "'BINTABLE'"},
                                                                {"BITPIX", "8"},
                                                                {"NAXIS", "2"},
                                                                {"NAXIS1", std::to_string(row_bytes)},
                                                                {"NAXIS2", std::to_string(rows)},
                                                                {"PCOUNT", "0"},
                                                                {"GCOUNT", "1"},
                                                                {"TFIELDS", std::to_string(columns_.size())}};
        for (std::size_t i = 0; i < columns_.size(); ++i) {
            const std::string n = std::to_string(i + 1);
            all.emplace_back("TTYPE" + n, "'" + columns_[i].name + "'");
            all.emplace_back("TFORM" + n, "'" + columns_[i].format + "'");
            if (!columns_[i].unit.empty()) all.emplace_back("TUNIT" + n, "'" + columns_[i].unit + "'");
        }
        for (const auto& [key, value] : cards_) {
            const auto at = std::find_if(all.begin(), all.end(),
                                         [&name = key](const auto& one) { return one.first == name; });
            if (at != all.end()) {
                at->second = value;
            } else {
                all.emplace_back(key, value);
            }
        }
        return block_of_cards(all) + padded(data, '\0');
    }

  private:
    struct Column {
        std::string name, format, unit;
        std::vector<double> values;

        [[nodiscard]] std::size_t repeat() const {
            return std::isdigit(static_cast<unsigned char>(format[0])) ? std::stoul(format) : 1;
        }
        void append_row(std::size_t row, std::string& out) const {
            for (std::size_t i = 0; i < repeat(); ++i)
                append_cell(values[row * repeat() + i], out);
        }
        void append_cell(double value, std::string& out) const {
            const auto whole = [&] { return static_cast<std::uint64_t>(static_cast<std::int64_t>(value)); };
            switch (format[format.find_first_not_of("0123456789")]) {
                case 'L':
                    out += value != 0 ? 'T' : 'F';
                    return;
                case 'B':
                    return append_big_endian(whole(), 1, out);
                case 'I':
                    return append_big_endian(whole(), 2, out);
                case 'J':
                    return append_big_endian(whole(), 4, out);
                case 'K':
                    return append_big_endian(whole(), 8, out);
                case 'E':
                    return append_big_endian(std::bit_cast<std::uint32_t>(static_cast<float>(value)), 4, out);
                case 'D':
                    return append_big_endian(std::bit_cast<std::uint64_t>(value), 8, out);
                default:
                    out += 'x';
            }
        }
        static void append_big_endian(std::uint64_t bits, int count, std::string& out) {
            for (int i = count - 1; i >= 0; --i)
                out += static_cast<char>(bits >> (8 * i));
        }
    };

    std::vector<std::pair<std::string, std::string>> cards_;
    std::vector<Column> columns_;
    std::string primary_ =
        block_of_cards({{"SIMPLE", "T"}, {"BITPIX", "8"}, {"NAXIS", "0"}, {"EXTEND", "T"}});
};

}  // namespace foreglow::testing
