// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <memory>
#include <optional>
#include <span>
#include <variant>

#include "sphere/alm.h"
#include "sphere/harmonics.h"
#include "sphere/regrid.h"
#include "sphere/sky_map.h"

namespace foreglow {

/// A scalar on the pixels of one grid that is made strip by strip when asked for, so that no full map of it
/// need exist.
class PixelField {
  public:
    /// The same value everywhere.
    [[nodiscard]] static PixelField uniform(double value);
    /// A map already on the grid, used pixel for pixel.
    [[nodiscard]] static PixelField of_map(std::shared_ptr<const SkyMap> map);
    /// A map on another grid or in another frame, by bilinear interpolation between its four nearest pixels.
    ///
    /// Undefined neighbours are left out and the others' weights renormalised; without any the pixel is
    /// undefined.
    [[nodiscard]] static PixelField interpolated(std::shared_ptr<const SkyMap> map, const HealpixGrid& grid,
                                                 Frame frame);
    /// The map of some a_lm; a pixel is undefined where `filled` (a map of 0 and 1, interpolated) exceeds 1
    /// %.
    [[nodiscard]] static PixelField harmonic(Alm alm, Frame frame,
                                             std::shared_ptr<const SkyMap> filled = nullptr);

    /// Writes the values of one strip.
    /// @param out  [pixel_count(grid, strip)]
    void evaluate(const HealpixGrid& grid, const RingStrip& strip, std::span<double> out) const;

    struct Range {
        double low = 0, high = 0;
    };
    /// Returns bounds of the defined values; nothing where none is defined or the field is harmonic.
    [[nodiscard]] std::optional<Range> range() const;
    /// Returns the map that is used pixel for pixel, or nullptr where the field is made otherwise.
    [[nodiscard]] std::shared_ptr<const SkyMap> map() const {
        const auto* source = std::get_if<Map>(&source_);
        return source == nullptr ? nullptr : source->map;
    }
    [[nodiscard]] bool is_uniform() const { return std::holds_alternative<double>(source_); }

  private:
    struct Map {
        std::shared_ptr<const SkyMap> map;
    };
    struct Interpolated {
        std::shared_ptr<const SkyMap> map;
        Frame frame = Frame::Galactic;  // of the grid
    };
    struct Harmonic {
        Alm alm;
        Frame frame = Frame::Galactic;
        std::shared_ptr<const SkyMap> filled;
    };
    using Source = std::variant<double, Map, Interpolated, Harmonic>;
    explicit PixelField(Source source) : source_(std::move(source)) {}
    Source source_;
};

/// Copies one piece of a strip out of a full map, with threads.
void copy_range(std::span<const double> map, const PixelRange& range, std::span<double> strip);

/// Interpolates a map at the pixels of a strip of another grid and frame (interpolate_pixels).
void interpolate_strip(const SkyMap& map, const HealpixGrid& grid, Frame frame, const RingStrip& strip,
                       std::span<double> out);

/// Makes pixels of a strip undefined where the interpolated map of filled pixels exceeds
/// largest_filled_share.
void undefine_filled(const SkyMap& filled, const HealpixGrid& grid, Frame frame, const RingStrip& strip,
                     std::span<double> values);

}  // namespace foreglow
