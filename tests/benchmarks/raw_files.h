// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <filesystem>
#include <vector>

namespace foreglow::benchmarks {

/// Writes bytes that mean nothing as a map is written: NAME.part, synced, renamed. From a buffer that stays
/// in cache, thus a lower bound of what writing costs.
/// @param sync  whether to sync before the renaming
void write_raw_file(const std::filesystem::path& path, std::int64_t bytes, bool sync);

/// Reads a whole file into memory that the call allocates, in blocks shared among the threads.
[[nodiscard]] std::vector<char> read_raw_file(const std::filesystem::path& path);

/// Reads a whole file into memory that is there already, [file's length].
void read_raw_file(const std::filesystem::path& path, char* out);

}  // namespace foreglow::benchmarks
