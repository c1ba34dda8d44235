// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <filesystem>
#include <string>
#include <string_view>
#include <vector>

namespace foreglow {

/// Reads a text of any length as it comes, whole lines at a time: a file, or standard input.
class LineStream {
  public:
    /// @param path  "-" is standard input
    /// @throws InputError where there is no such file or it is a folder; FileError where it cannot be opened
    LineStream(const std::filesystem::path& path, const std::string& what);
    ~LineStream();
    LineStream(const LineStream&) = delete;
    LineStream& operator=(const LineStream&) = delete;

    /// Waits for more and takes the lines that are complete, at most about 1 MiB at a time; the last line
    /// need not end.
    /// @return false at the end of the text
    /// @throws FileError where reading fails; DataError where a line is longer than 1 MiB
    [[nodiscard]] bool next();

    /// The lines taken last, without their ends; valid until the next call.
    [[nodiscard]] const std::vector<std::string_view>& lines() const { return lines_; }
    /// Returns "FILE:LINE" of one of them.
    [[nodiscard]] std::string place(std::size_t line) const;

  private:
    void cut_lines();

    std::string name_;
    int descriptor_ = -1;
    bool owned_ = false, at_end_ = false;
    std::string buffer_;
    std::size_t used_ = 0;  ///< bytes of the lines taken last
    std::vector<std::string_view> lines_;
    std::int64_t first_line_ = 1;
};

}  // namespace foreglow
