// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/csv_table.h"

#include <charconv>
#include <cmath>
#include <optional>
#include <string_view>

#include "base/error.h"
#include "base/text.h"
#include "io/text_file.h"

namespace foreglow {
namespace {

[[noreturn]] void fail(const CsvTable& table, int line, const std::string& message) {
    throw DataError(to_one_line(table.file + ":" + std::to_string(line) + ": " + message));
}

std::optional<double> find_number(std::string_view cell) {
    if (cell.starts_with('+')) cell.remove_prefix(1);
    double value = 0;
    const auto [end, code] = std::from_chars(cell.data(), cell.data() + cell.size(), value);
    if (code != std::errc() || end != cell.data() + cell.size() || !std::isfinite(value)) return std::nullopt;
    return value;
}

std::string_view without_quotes(std::string_view cell) {
    if (cell.size() >= 2 && cell.front() == '"' && cell.back() == '"')
        return trim(cell.substr(1, cell.size() - 2));
    return cell;
}

void add_header(CsvTable& table, const std::vector<std::string>& cells, int line,
                const std::string& example) {
    table.header_line = line;
    for (const std::string& cell : cells) {
        const std::string_view name = without_quotes(trim(cell));
        if (name.empty() || find_number(name))
            fail(table, line,
                 "the first line must name the columns: put the line " + example + " above the numbers");
        table.header.emplace_back(name);
    }
}

void add_row(CsvTable& table, const std::vector<std::string>& cells, int line) {
    if (cells.size() != table.header.size())
        fail(table, line,
             "this row has " + std::to_string(cells.size()) + " cells, but the header names " +
                 std::to_string(table.header.size()) +
                 " columns: give every row as many cells as the header");
    std::vector<double> row;
    for (std::size_t i = 0; i < cells.size(); ++i) {
        const std::optional<double> number = find_number(trim(cells[i]));
        if (!number)
            fail(table, line,
                 "'" + cells[i] + "' in column " + table.header[i] +
                     " is no finite number: write it as 1.5 or 2e-3");
        row.push_back(*number);
    }
    table.rows.push_back(std::move(row));
    table.lines.push_back(line);
}

}  // namespace

CsvTable read_csv_table(const std::filesystem::path& path, const std::string& what,
                        const std::string& header_example) {
    const std::string text = read_text_file(path, what);
    CsvTable table;
    table.file = path.string();
    int line = 0;
    for (const std::string& raw : split(text, '\n')) {
        ++line;
        const std::string_view content = trim(raw);
        if (content.empty() || content.front() == '#') continue;
        const std::vector<std::string> cells = split(content, ',');
        if (table.header.empty())
            add_header(table, cells, line, header_example);
        else
            add_row(table, cells, line);
    }
    if (table.header.empty())
        fail(table, 1,
             "the " + what + " is empty: its first line must be a header such as " + header_example);
    return table;
}

}  // namespace foreglow
