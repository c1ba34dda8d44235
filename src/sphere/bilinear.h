// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <span>
#include <vector>

#include "sphere/frame.h"
#include "sphere/grid.h"

namespace foreglow {

/// Interpolates maps of one grid bilinearly between rings, for many places at a time.
///
/// The definition is that of HealpixGrid::interpolation (get_interpol of HEALPix 3.80): linear in azimuth
/// between the two nearest pixels of the rings above and below, then linear in colatitude; beyond the first
/// and the last ring the mean of its four pixels stands for the pole.
class BilinearSampler {
  public:
    explicit BilinearSampler(const HealpixGrid& grid);

    /// Returns the pixels and weights at a direction [unit vector]; weights differ from those of
    /// HealpixGrid::interpolation by less than 2e-15 nside.
    [[nodiscard]] HealpixGrid::Stencil stencil(const Vector3& direction) const;
    /// Returns the pixels and weights at the centre of a pixel of another grid in the same frame; azimuths
    /// are compared in whole numbers, so that the weights along a ring are exact to a rounding.
    [[nodiscard]] HealpixGrid::Stencil stencil_at(const HealpixGrid& to_grid, int ring,
                                                  std::int64_t column) const;

    /// Interpolates a map at the pixels first, first + 1, ... of another grid in the same frame.
    /// @param values  [npix of the sampler's grid]; undefined pixels are left out of each mean
    void sample(std::span<const double> values, const HealpixGrid& to_grid, std::int64_t first,
                std::span<double> out) const;
    /// Likewise where the other grid's frame is another one.
    /// @param back  takes unit vectors of the other frame to that of the map
    void sample(std::span<const double> values, const Matrix3& back, const HealpixGrid& to_grid,
                std::int64_t first, std::span<double> out) const;

    /// A ring as azimuths see it.
    struct Row {
        std::int64_t first = 0;  ///< pixel
        int pixels = 0;
        double shift = 0;  ///< azimuth of the first centre in pixels, 0 or 1/2
    };
    /// The strip of sky between two neighbouring rings, or between a ring and a pole.
    struct Zone {
        double cos_above = 1, sin_above = 0;  ///< of the upper edge's colatitude
        double per_radian = 0;                ///< 1 / width
    };

  private:
    struct Level {
        std::size_t zone = 0;
        bool is_on_ring = false;  ///< on the zone's upper edge
    };
    [[nodiscard]] Level level_of(int ring, const HealpixGrid& to_grid) const;
    [[nodiscard]] bool touches_pole(std::size_t zone) const { return zone == 0 || zone == rows_.size(); }
    [[nodiscard]] double read(std::span<const double> values, std::size_t zone, double below,
                              double turns) const;
    void sample_ring(std::span<const double> values, const HealpixGrid& to_grid, int ring,
                     std::int64_t column, std::span<double> out) const;

    HealpixGrid grid_;
    std::vector<Row> rows_;    ///< [ring_count]
    std::vector<Zone> zones_;  ///< [ring_count + 1], from the north pole to the south pole
};

/// Returns the mean by a stencil's weights, undefined pixels left out; undefined where none is defined.
[[nodiscard]] double weighted_mean(std::span<const double> values, const HealpixGrid::Stencil& stencil);

}  // namespace foreglow
