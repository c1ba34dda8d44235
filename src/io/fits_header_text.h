// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <string>

#include "io/fits_map_write.h"

namespace foreglow {

/// Says where the bytes of a map's table stand: a row holds row_pixels cells of each column, after the pixel
/// number if any.
struct FitsTableShape {
    std::int64_t rows = 0;
    std::int64_t row_pixels = 1;   ///< 1024 or 1
    std::int64_t cell_bytes = 4;   ///< 4 or 8
    std::int64_t index_bytes = 0;  ///< 4 with explicit indexing
    std::int64_t columns = 0;

    [[nodiscard]] std::int64_t row_bytes() const { return index_bytes + columns * row_pixels * cell_bytes; }
    [[nodiscard]] std::int64_t data_bytes() const { return rows * row_bytes(); }
};

[[nodiscard]] FitsTableShape make_table_shape(const FitsMapLayout& layout);

/// Returns both headers (primary and table) as they stand in the file, sums included: a multiple of 2880
/// bytes.
///
/// @param data_sum  the ones' complement sum of the data's big-endian 32-bit words
/// @throws InputError where SOURCE_DATE_EPOCH is no number
[[nodiscard]] std::string make_map_headers(const FitsMapLayout& layout, std::uint32_t data_sum);

/// Returns a length rounded up to whole FITS blocks of 2880 bytes.
[[nodiscard]] std::int64_t round_up_to_fits_block(std::int64_t bytes);

/// Folds a sum of 32-bit words into 32 bits with end-around carry, as FITS checksums add.
[[nodiscard]] std::uint32_t fold_checksum(std::uint64_t sum);

}  // namespace foreglow
