// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>
#include <string>
#include <vector>

namespace foreglow {

/// A table of finite numbers under a header of column names, with each row's line in the file.
struct CsvTable {
    std::string file;
    std::vector<std::string> header;  ///< [columns]
    int header_line = 0;
    std::vector<std::vector<double>> rows;  ///< [rows][columns]
    std::vector<int> lines;                 ///< [rows], from 1

    /// Returns "FILE:LINE" of a row.
    [[nodiscard]] std::string place(std::size_t row) const {
        return file + ":" + std::to_string(lines.at(row));
    }
    /// Returns "FILE:LINE" of the header.
    [[nodiscard]] std::string header_place() const { return file + ":" + std::to_string(header_line); }
};

/// Reads a numeric CSV file: commas between cells, a header first, blank lines and lines that begin with #
/// left out.
/// @param what  what the file is, for messages: "response file"
/// @param header_example  the header line to show where there is none
/// @throws InputError where the file does not exist; DataError "FILE:LINE: ..." where a cell is no finite
/// number, a row has
///         another number of cells than the header, or the header is missing; FileError where reading fails
[[nodiscard]] CsvTable read_csv_table(const std::filesystem::path& path, const std::string& what,
                                      const std::string& header_example);

}  // namespace foreglow
