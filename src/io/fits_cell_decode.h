// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstddef>
#include <cstdint>
#include <optional>
#include <span>

#include "io/fits_table_file.h"

namespace foreglow {

/// Turns a column's cells into doubles: TNULL, then TSCAL and TZERO, then sentinels into NaN.
///
/// Undefined: values within a relative 1e-5 of -1.6375e30 or of bad_data, NaN and infinities. Logical cells
/// give 1 and 0.
/// @param cells     the first cell's bytes
/// @param stride    from one row's first cell to the next row's [bytes]
/// @param per_row   cells taken from each row
/// @param out       [rows * per_row]
void decode_cells(const FitsTableColumn& column, std::optional<double> bad_data, const std::byte* cells,
                  std::int64_t stride, std::int64_t per_row, std::span<double> out);

}  // namespace foreglow
