// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>
#include <string>

namespace foreglow {

enum class FitsFileKind { Plain, Gzip };

/// Finds by its first bytes whether a file is a FITS file, plain or gzip'd, whatever its name.
/// @param place  start of messages about the request, "" or "model.toml:3:7: "
/// @throws InputError where it does not exist or is a folder, a device or a pipe
/// @throws DataError where it is something else, saying what it looks like; FileError where it cannot be read
[[nodiscard]] FitsFileKind check_fits_file_kind(const std::string& place, const std::filesystem::path& path);

}  // namespace foreglow
