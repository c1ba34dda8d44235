// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstddef>
#include <cstdint>
#include <span>

namespace foreglow {

/// Says what went into some cells: the sum of their 32-bit words, and whether a value was infinite in the
/// cells' precision.
struct CellTally {
    std::uint64_t words = 0;
    bool infinite = false;
};

/// Turns values into big-endian float64 or float32 cells, rounded once; NaN becomes BAD_DATA.
/// @param out  room for the cells; need not be aligned
CellTally encode_cells(std::span<const double> values, bool float64, std::byte* out);
CellTally encode_cells(std::span<const float> values, bool float64, std::byte* out);

}  // namespace foreglow
