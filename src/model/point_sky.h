// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <memory>
#include <optional>
#include <span>
#include <string>
#include <vector>

#include "model/model_spec.h"
#include "model/point_values.h"
#include "model/sky_model.h"

namespace foreglow {

/// A model's sky of which only single pixels are wanted: nothing of the size of a map is made or read, but
/// where random structure is asked for. Without a seed [detail] and scatter are off, and a notice says so.
///
/// On the grid and in the frame of its templates a pixel is the one that load_sky and make_sky_strip give.
/// Indices, curvatures and fractions on other grids are brought as there; an intensity or polarization
/// template on another grid is brought by bilinear interpolation or the mean of the children where load_sky
/// goes through its a_lm, and a notice says so.
class PointSky {
  public:
    /// @param grid  to answer on; else the intensity template's own
    /// @throws InputError, DataError, FileError as load_sky
    PointSky(const ModelSpec& model, std::optional<HealpixGrid> grid, bool with_polarization);
    /// Takes the random structure that a study's seed adds, for which the whole sky has to be made first.
    /// @param lmax  the study's
    /// @throws as load_sky and DetailedSky
    PointSky(const ModelSpec& model, const HealpixGrid& grid, bool with_polarization, int lmax,
             std::uint64_t seed, int realization);
    ~PointSky();
    PointSky(PointSky&&) noexcept;
    PointSky& operator=(PointSky&&) noexcept;

    [[nodiscard]] const HealpixGrid& grid() const;
    [[nodiscard]] Frame frame() const;  ///< of the intensity template, in which the law acts
    [[nodiscard]] Frequency reference() const;
    [[nodiscard]] Frequency polarized_reference() const;
    [[nodiscard]] bool is_polarized() const;
    [[nodiscard]] const std::vector<std::string>& notices() const;

    /// Makes the law at RING pixels, with threads where they are many; not of the built-in Galaxy, which has
    /// none.
    [[nodiscard]] SkyStrip evaluate(std::span<const std::int64_t> pixels) const;

    /// Returns what pixels are in each row, [rows], with threads where they are many.
    [[nodiscard]] std::vector<PointValues> answer(std::span<const std::int64_t> pixels,
                                                  std::span<const PointRow> rows) const;

  private:
    struct Impl;
    std::unique_ptr<Impl> impl_;
};

}  // namespace foreglow
