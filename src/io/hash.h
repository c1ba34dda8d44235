// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>
#include <span>
#include <string>

namespace foreglow {

/// Returns the SHA-256 of a file's bytes (FIPS 180-4), 64 lower-case hexadecimal digits; the file is
/// streamed.
/// @throws FileError with the system's reason
[[nodiscard]] std::string sha256_of_file(const std::filesystem::path& path);

/// Returns the XXH3-128 of a file's bytes (canonical, big-endian), 32 lower-case hexadecimal digits; the file
/// is one of our own, which nobody shortens meanwhile.
/// @throws FileError with the system's reason
[[nodiscard]] std::string xxh3_128_of_file(const std::filesystem::path& path);

/// Returns the SHA-256 of bytes in memory, 64 lower-case hexadecimal digits.
[[nodiscard]] std::string sha256_of_bytes(std::span<const std::byte> bytes);

/// Returns the XXH3-128 of several pieces of memory one after the other, in the same form as that of a file.
[[nodiscard]] std::string xxh3_128_of_pieces(std::span<const std::span<const std::byte>> pieces);

}  // namespace foreglow
