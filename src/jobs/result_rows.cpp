// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/result_rows.h"

#include <algorithm>
#include <cmath>

#include "base/error.h"
#include "base/text.h"

namespace foreglow {
namespace {

// Returns "" for no value.
std::string cell_text(const JsonValue& cell, int digits) {
    const JsonValue::Storage& value = cell.storage();
    if (const auto* text = std::get_if<std::string>(&value)) return *text;
    if (const auto* whole = std::get_if<std::int64_t>(&value)) return std::to_string(*whole);
    if (const auto* flag = std::get_if<bool>(&value)) return *flag ? "true" : "false";
    if (const auto* number = std::get_if<double>(&value)) {
        if (!std::isfinite(*number)) return "";
        return digits > 0 ? format_number(*number, digits) : format_exact(*number);
    }
    return "";
}

bool is_text(const JsonValue& cell) {
    return cell.text() != nullptr;
}

// RFC 4180: quotes around a cell that holds a comma or a quote, which is doubled.
std::string quoted(const std::string& text) {
    if (text.find_first_of(",\"\n") == std::string::npos) return text;
    std::string out(1, '"');
    for (const char c : text) {
        if (c == '"') out.push_back('"');
        out.push_back(c);
    }
    out.push_back('"');
    return out;
}

std::string padded(const std::string& text, std::size_t width, bool left) {
    const std::string fill(width > text.size() ? width - text.size() : 0, ' ');
    return left ? text + fill : fill + text;
}

}  // namespace

void ResultRows::add(std::vector<JsonValue> cells) {
    FOREGLOW_EXPECTS(cells.size() == columns_.size());
    rows_.push_back(std::move(cells));
}

std::string ResultRows::text(RowFormat format) const {
    std::string out;
    if (format == RowFormat::Json) {
        JsonValue::Array array;
        for (const auto& row : rows_) {
            JsonValue::Object object;
            for (std::size_t c = 0; c < columns_.size(); ++c)
                object.emplace_back(columns_[c], row[c]);
            array.emplace_back(std::move(object));
        }
        out = write_json(array);
        return out.empty() || out.back() == '\n' ? out : out + "\n";
    }
    if (format == RowFormat::Csv) {
        for (std::size_t c = 0; c < columns_.size(); ++c)
            out.append(c > 0 ? "," : "").append(columns_[c]);
        out += "\n";
        for (const auto& row : rows_) {
            for (std::size_t c = 0; c < row.size(); ++c) {
                if (c > 0) out.push_back(',');
                out.append(quoted(cell_text(row[c], 0)));
            }
            out += "\n";
        }
        return out;
    }
    constexpr int table_digits = 7;
    std::vector<std::size_t> widths;
    for (std::size_t c = 0; c < columns_.size(); ++c) {
        std::size_t width = columns_[c].size();
        for (const auto& row : rows_)
            width = std::max(width, cell_text(row[c], table_digits).size());
        widths.push_back(width);
    }
    const auto add_line = [&](const auto& cell, const auto& left) {
        std::string line;
        for (std::size_t c = 0; c < columns_.size(); ++c)
            line.append(c > 0 ? "  " : "").append(padded(cell(c), widths[c], left(c)));
        line.erase(line.find_last_not_of(' ') + 1);
        out += line + "\n";
    };
    const auto starts_left = [&](std::size_t c) { return !rows_.empty() && is_text(rows_[0][c]); };
    add_line([&](std::size_t c) { return columns_[c]; }, starts_left);
    for (const auto& row : rows_)
        add_line(
            [&](std::size_t c) {
                const std::string text = cell_text(row[c], table_digits);
                return text.empty() ? std::string("-") : text;
            },
            starts_left);
    return out;
}

}  // namespace foreglow
