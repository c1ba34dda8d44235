// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/response_file.h"

#include <algorithm>
#include <array>
#include <string>

#include "base/error.h"
#include "base/text.h"
#include "io/csv_table.h"
#include "io/text_file.h"

namespace foreglow {
namespace {

constexpr const char* response_header = "frequency_GHz,transmission";
constexpr const char* window_header = "l,B_l";

[[noreturn]] void fail(const std::string& place, const std::string& message) {
    throw DataError(to_one_line(place + ": " + message));
}

std::string joined(const std::vector<std::string>& names) {
    std::string text;
    for (const std::string& name : names)
        text += (text.empty() ? "" : ",") + name;
    return text;
}

/// Returns how many Hz the first column's unit is, from a name such as frequency_GHz.
double scale_of_header(const CsvTable& table) {
    constexpr std::array<std::pair<const char*, double>, 5> units{
        {{"Hz", 1.0}, {"kHz", 1e3}, {"MHz", 1e6}, {"GHz", 1e9}, {"THz", 1e12}}};
    if (table.header.size() == 2 && to_lower(table.header[1]) == "transmission")
        for (const auto& [unit, scale] : units)
            if (table.header[0] == std::string("frequency_") + unit) return scale;
    fail(table.header_place(), "the header is '" + joined(table.header) + "', but must be " +
                                   response_header + " (or frequency_Hz, _kHz, _MHz, _THz)");
}

void check_response_row(const CsvTable& table, const ResponseTable& response, std::size_t row) {
    const double hz = response.frequencies[row].hz();
    if (!(hz >= 1 && hz <= 1e13)) fail(table.place(row), "the frequency must lie between 1 Hz and 10 THz");
    if (response.transmission[row] < 0)
        fail(table.place(row), "the transmission is " + format_exact(response.transmission[row]) +
                                   ", but must not be below zero: set it to 0 or take the row out");
    if (row >= 1 && hz < response.frequencies[row - 1].hz())
        fail(table.place(row), "the frequency is below that of the row before: sort the rows by frequency");
    if (row >= 2 && hz == response.frequencies[row - 2].hz())
        fail(table.place(row), "this is the third row of the same frequency: two make a step, take one out");
}

bool is_header_word(const std::string& name, std::initializer_list<const char*> words) {
    return std::any_of(words.begin(), words.end(), [&](const char* word) { return to_lower(name) == word; });
}

void check_window_header(const CsvTable& table) {
    const auto& names = table.header;
    const bool is_right = (names.size() == 2 || names.size() == 3) &&
                          is_header_word(names[0], {"l", "ell"}) &&
                          is_header_word(names[1], {"b_l", "bl", "b_ell"}) &&
                          (names.size() == 2 || is_header_word(names[2], {"b_l_pol", "bl_pol", "b_ell_pol"}));
    if (!is_right)
        fail(table.header_place(),
             "the header is '" + joined(names) + "', but must be l,B_l or l,B_l,B_l_pol");
}

}  // namespace

ResponseTable read_response_file(const std::filesystem::path& path) {
    const CsvTable table = read_csv_table(path, "response file", response_header);
    const double scale = scale_of_header(table);
    if (table.rows.size() < 2)
        fail(table.header_place(), "a response needs at least two rows, but has " +
                                       std::to_string(table.rows.size()) +
                                       ": for a single frequency leave 'response' out");
    ResponseTable response;
    response.file = path;
    double area = 0;
    for (std::size_t row = 0; row < table.rows.size(); ++row) {
        response.frequencies.push_back(Frequency::from_hz(table.rows[row][0] * scale));
        response.transmission.push_back(table.rows[row][1]);
        check_response_row(table, response, row);
        if (row > 0)
            area += (response.frequencies[row].hz() - response.frequencies[row - 1].hz()) *
                    (response.transmission[row] + response.transmission[row - 1]);
    }
    if (!(area > 0))
        fail(table.place(0),
             "the transmission is zero everywhere, or the rows span no frequency: there is no band");
    return response;
}

BeamTable read_beam_window(const std::filesystem::path& path) {
    const CsvTable table = read_csv_table(path, "beam window", window_header);
    check_window_header(table);
    if (table.rows.empty())
        fail(table.header_place(), "the beam window has no rows: give one for each l = 0, 1, 2, ...");
    BeamTable window;
    window.file = path;
    window.has_polarization_column = table.header.size() == 3;
    for (std::size_t row = 0; row < table.rows.size(); ++row) {
        if (table.rows[row][0] != static_cast<double>(row))
            fail(table.place(row), "l is " + format_exact(table.rows[row][0]) + " where " +
                                       std::to_string(row) +
                                       " comes next: give every l = 0, 1, 2, ... in order");
        window.intensity.push_back(table.rows[row][1]);
        window.polarization.push_back(table.rows[row].back());
    }
    if (!(window.intensity.front() > 0)) fail(table.place(0), "B_l at l = 0 must be above zero");
    window.lmax = static_cast<int>(table.rows.size()) - 1;
    return window;
}

}  // namespace foreglow
