// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <memory>
#include <span>

#include "io/fits_map_read.h"

namespace foreglow {

/// Reads single pixels of a HEALPix FITS map: the header once, then only the rows that are asked for.
///
/// Values are those of read_fits_map: scaled, NaN where undefined or not in the file. Pixels of a partial map
/// are found by bisection of its pixel numbers; only where one is not there are all of them looked at, once,
/// to see that they ascend. A gzip'd map is unpacked whole.
class FitsPixelReader {
  public:
    /// @throws as read_fits_map_header, and InputError where neither the file nor the request gives the
    /// ordering
    explicit FitsPixelReader(const FitsMapRequest& request);
    ~FitsPixelReader();
    FitsPixelReader(FitsPixelReader&&) noexcept;
    FitsPixelReader& operator=(FitsPixelReader&&) noexcept;

    [[nodiscard]] const FitsMapHeader& header() const;

    /// Writes the requested columns at some pixels, with threads where they are many.
    /// @param pixels  RING numbers, in any order, [n]
    /// @param out     [columns][n]
    /// @throws DataError, FileError as read_fits_map
    void read(std::span<const std::int64_t> pixels, std::span<const std::span<double>> out) const;

  private:
    struct Impl;
    std::unique_ptr<Impl> impl_;
};

}  // namespace foreglow
