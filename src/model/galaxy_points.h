// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <memory>
#include <span>
#include <vector>

#include "model/galaxy_spec.h"
#include "model/point_values.h"
#include "sphere/grid.h"

namespace foreglow {

/// The built-in Galaxy at single pixels of a grid: only the lines of sight that are asked for are
/// integrated, at the frequencies that are asked for.
///
/// Index and curvature come from five frequencies around each (SpectralStencil, as make's truth). Where
/// Faraday rotation turns Q and U within a channel's band, its nodes are made as dense as make's. Lines of
/// sight are sampled with the usual 128 steps near the plane and 48 elsewhere.
class GalaxyPoints {
  public:
    /// The grid where none is asked for: from here on a pixel is one line of sight.
    static constexpr int usual_nside = 128;

    GalaxyPoints(const GalaxySpec& galaxy, Frequency reference, const HealpixGrid& grid, bool polarized);
    ~GalaxyPoints();
    GalaxyPoints(GalaxyPoints&&) noexcept;
    GalaxyPoints& operator=(GalaxyPoints&&) noexcept;

    /// Returns what pixels are in each row, [rows]; tables are made for the rows of the first call and kept.
    [[nodiscard]] std::vector<PointValues> answer(std::span<const std::int64_t> pixels,
                                                  std::span<const PointRow> rows) const;

  private:
    struct Impl;
    std::unique_ptr<Impl> impl_;
};

}  // namespace foreglow
