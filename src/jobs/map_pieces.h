// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <array>
#include <cstdint>
#include <functional>
#include <memory>
#include <span>
#include <vector>

#include "jobs/make_maps.h"
#include "model/map_file.h"
#include "model/map_statistics.h"
#include "sphere/harmonics.h"

namespace foreglow {

/// A piece of a strip that one thread does at a time.
struct MapPiece {
    std::int64_t first_pixel = 0;    ///< RING number
    std::size_t begin = 0, end = 0;  ///< in the strip's buffer
    [[nodiscard]] std::size_t size() const { return end - begin; }
};

/// Cuts a strip into pieces of at most 8192 pixels, in RING order.
[[nodiscard]] std::vector<MapPiece> cut_into_pieces(const HealpixGrid& grid, const RingStrip& strip);

/// Statistics of I, Q, U.
using StokesStatistics = std::array<MapStatistics, 3>;

/// Fills the pixels of a preview that lie in a piece.
class PreviewSampler {
  public:
    /// @param columns  1 or 3
    PreviewSampler(const HealpixGrid& grid, Frame frame, const std::string& unit, std::size_t columns,
                   std::string channel);
    /// Threads may sample disjoint pieces at once.
    void sample(std::int64_t first_pixel, std::span<const std::span<double>> columns);
    [[nodiscard]] Preview take() { return std::move(preview_); }

  private:
    struct Place {
        std::int64_t pixel = 0;   ///< on the map's grid
        std::int64_t target = 0;  ///< on the preview's
    };
    std::vector<Place> places_;  ///< ascending in pixel
    Preview preview_;
};

}  // namespace foreglow
