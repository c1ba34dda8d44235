// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <memory>
#include <optional>
#include <vector>

#include "jobs/at.h"
#include "sphere/sky_position.h"

namespace foreglow {

/// Some of the positions that were asked for, in their order.
struct PositionBatch {
    std::vector<SkyPosition> positions;  ///< in the rows' frame
    std::vector<std::int64_t> pixels;    ///< RING, on the grid of --nside; empty where positions were given
};

/// Takes the positions of a request one batch after the other, from the command line or a table of any
/// length.
///
/// A table has the columns lon_deg and lat_deg (or lon and lat, l and b, ra and dec), or pixel, in any order
/// and among others; without a header line the first two are longitude and latitude.
class PositionReader {
  public:
    /// @param frame       of positions and pixels
    /// @param pixel_grid  of pixel numbers
    /// @throws InputError where no position is asked for, or in two ways at once
    PositionReader(const AtOptions& options, Frame frame, std::optional<HealpixGrid> pixel_grid);
    ~PositionReader();
    PositionReader(const PositionReader&) = delete;
    PositionReader& operator=(const PositionReader&) = delete;

    /// Takes the next batch; waits where a table is still being written.
    /// @return nothing at the end
    /// @throws InputError where a position is wrong, DataError "FILE:LINE: ..." in a table
    [[nodiscard]] std::optional<PositionBatch> next();

  private:
    struct Impl;
    std::unique_ptr<Impl> impl_;
};

}  // namespace foreglow
