// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <span>
#include <string>

#include "picture/colour.h"

namespace foreglow {

/// Returns the bytes of a PNG file with a table of colours (W3C Portable Network Graphics, second edition:
/// colour type 3, 8 bits), no filter, compressed for speed.
///
/// Pictures of the sky have few runs, and searching for repeats gains less than a tenth of the size: only
/// runs are looked for (zlib's Z_RLE).
/// @param indices  [width * height], row by row from above, each below colours.size()
/// @param colours  1 to 256
/// @throws FileError where memory does not suffice
[[nodiscard]] std::string write_indexed_png(int width, int height, std::span<const std::uint8_t> indices,
                                            std::span<const Rgb> colours);

}  // namespace foreglow
