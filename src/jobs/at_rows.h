// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <span>
#include <string>
#include <vector>

#include "jobs/at_source.h"
#include "sphere/sky_position.h"

namespace foreglow {

/// What all rows of an answer have in common.
struct RowStyle {
    RowFormat format = RowFormat::Table;
    Frame frame = Frame::Galactic;
    int nside = 0;
    bool negate_u = false;  ///< IAU
    bool has_brightness = true, polarized = false;
    bool with_disc = false;     ///< pixels and scatter are printed
    bool with_channel = false;  ///< likewise the channel
    std::vector<AtColumn> columns;
};

/// Rows that have been computed: each position has one for each column.
struct RowBatch {
    std::span<const SkyPosition> positions;
    std::span<const std::int64_t> pixels;  ///< as printed, in RING or NESTED
    std::vector<GroupedValues> columns;    ///< [columns], each [positions]
};

/// Returns what stands before the first row.
[[nodiscard]] std::string write_row_heading(const RowStyle& style);

/// Writes rows, position by position, in the shortest digits that read back to the same double (a table: 7
/// digits); with threads.
/// @param is_first  whether these are the first rows of the answer
/// @return one text for each block of rows, in order
[[nodiscard]] std::vector<std::string> write_rows(const RowStyle& style, const RowBatch& batch,
                                                  bool is_first);

/// Returns what stands behind the last row.
[[nodiscard]] std::string write_row_ending(const RowStyle& style, bool any_rows);

}  // namespace foreglow
