// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <memory>
#include <optional>
#include <span>

#include "model/model_spec.h"
#include "model/sky_model.h"
#include "sphere/harmonics.h"

namespace foreglow {

/// The bundled invented sky at single pixels of a grid: only the rings that hold them are made.
///
/// Where many rings are asked for on a grid of nside 512 or less, the whole sky is made once and kept.
class SketchPoints {
  public:
    /// The grid where none is asked for: half a degree in two pixels, and the sketch is smoother than a
    /// degree.
    static constexpr int usual_nside = 256;

    SketchPoints(const SketchSpec& sketch, const HealpixGrid& grid, bool with_polarization);

    /// Makes the values at RING pixels, as make_sketch_sky to a rounding.
    [[nodiscard]] SkyStrip evaluate(std::span<const std::int64_t> pixels) const;

  private:
    void add_ring(int ring, std::span<const std::int64_t> pixels, std::span<const std::size_t> places,
                  SkyStrip& out) const;
    [[nodiscard]] SkyStrip pick_from_whole(std::span<const std::int64_t> pixels) const;

    SketchSpec sketch_;
    HealpixGrid grid_;
    std::optional<Alm> texture_, index_, curvature_;
    std::optional<AlmEB> polarization_;
    mutable std::shared_ptr<const SkyStrip> whole_;
};

}  // namespace foreglow
