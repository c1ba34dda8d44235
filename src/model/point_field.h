// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <memory>
#include <optional>
#include <span>
#include <variant>

#include "model/point_map.h"
#include "sphere/bilinear.h"

namespace foreglow {

/// A scalar at single pixels of a grid: a number, or a template read there.
///
/// On the grid and in its frame the template's own pixel is taken. Another template follows load_sky for
/// indices, curvatures and fractions: from a coarser grid or another frame bilinearly between rings, from a
/// finer one first the mean of the children, weighted with |brightness| where there are weights.
class PointField {
  public:
    [[nodiscard]] static PointField uniform(double value) { return PointField(value); }
    /// @param weights  the brightness template, or null for plain means
    [[nodiscard]] static PointField of_map(std::shared_ptr<const PointMap> map,
                                           std::shared_ptr<const PointMap> weights, const HealpixGrid& grid,
                                           Frame frame);

    /// Tells whether the template's own pixels are taken.
    [[nodiscard]] bool is_pixel_for_pixel() const;

    /// Writes the values at RING pixels of the grid, [n].
    void evaluate(std::span<const std::int64_t> pixels, std::span<double> out) const;

  private:
    struct Map {
        std::shared_ptr<const PointMap> map, weights;
        HealpixGrid grid{1};  // that is asked
        Frame frame = Frame::Galactic;
        HealpixGrid between{1};  // of the map's frame: the coarser of the two grids
        std::optional<BilinearSampler> sampler;

        void evaluate(std::span<const std::int64_t> pixels, std::span<double> out) const;
        void read_coarsened(std::span<const std::int64_t> pixels, std::span<double> out) const;
        void read_weights(std::span<const std::int64_t> pixels, std::span<double> out) const;
    };
    explicit PointField(std::variant<double, Map> source) : source_(std::move(source)) {}
    std::variant<double, Map> source_;
};

/// Writes the stencils of bilinear interpolation at pixels of another grid and frame, four entries each.
/// @param pixels, weights  [4 n]
void make_stencils(const BilinearSampler& sampler, Frame map_frame, const HealpixGrid& to_grid,
                   Frame to_frame, std::span<const std::int64_t> to_pixels, std::span<std::int64_t> pixels,
                   std::span<double> weights);

/// Returns the mean of four values, undefined ones left out; undefined where none is defined.
[[nodiscard]] double mean_of_four(std::span<const double> values, std::span<const double> weights);

}  // namespace foreglow
