// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>
#include <string>

namespace foreglow {

/// Reads a whole text file, a byte order mark at its beginning left out.
/// @param what  what the file is, for messages: "study file"
/// @throws InputError where there is no such file or it is a folder; FileError where reading fails;
///         DataError where it is larger than 64 MiB, which no text file of ours is
[[nodiscard]] std::string read_text_file(const std::filesystem::path& path, const std::string& what);

/// Puts a message on one line: control characters, line ends among them, become blanks.
[[nodiscard]] std::string to_one_line(std::string text);

}  // namespace foreglow
