// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstddef>
#include <cstdint>
#include <functional>
#include <memory>
#include <span>
#include <vector>

#include "base/progress.h"
#include "base/quantity.h"
#include "model/galaxy_sampling.h"
#include "model/galaxy_spec.h"
#include "model/galaxy_table.h"
#include "physics/response.h"
#include "sphere/grid.h"

namespace foreglow {

/// The Galaxy at some frequencies in some pixels, galactic frame, K_RJ, COSMO.
struct GalaxyMaps {
    std::vector<std::vector<double>> i, q, u;  ///< [K][pixels]; q and u empty without polarization
    std::vector<double> largest_depth;  ///< largest |rotation measure| on a pixel's lines of sight, [pixels]
    GalaxySampling sampling;
};

/// A band whose quadrature can be made fine enough for a rotation measure: returns it with steps of lambda^2
/// no longer than `step` [m^2], as far as the number of its nodes is bounded.
using RefinedBand = std::function<BandSum(double step)>;

/// Q and U averaged over bands where the integrals are made.
struct GalaxyStokes {
    std::vector<std::vector<double>> q, u;  ///< in the bands' units, COSMO, [bands][npix]
    std::int64_t coarse_pixels = 0;         ///< whose rotation would want more nodes than a band may have
};

/// Makes the Galaxy on one grid: disc, turbulence, loops. The same numbers for any number of threads.
class GalaxyMaker {
  public:
    GalaxyMaker(const GalaxySpec& galaxy, std::shared_ptr<const GalaxyTable> table, const HealpixGrid& grid,
                bool polarized);
    ~GalaxyMaker();
    GalaxyMaker(const GalaxyMaker&) = delete;
    GalaxyMaker& operator=(const GalaxyMaker&) = delete;

    /// Makes whole maps, RING order.
    /// @param polarized  false leaves Q and U away, even where turbulence of both was drawn
    [[nodiscard]] GalaxyMaps make_maps(std::span<const Frequency> frequencies, bool polarized,
                                       Progress& progress) const;
    /// Makes some pixels with the usual sampling.
    [[nodiscard]] GalaxyMaps make_pixels(std::span<const std::int64_t> pixels,
                                         std::span<const Frequency> frequencies, bool polarized) const;
    /// Makes whole maps of Q and U, each averaged over its band: with nodes so dense that the largest
    /// rotation measure met on a line of sight turns by less than 0.3 rad from node to node (2 RM
    /// d(lambda^2) < 0.3).
    [[nodiscard]] GalaxyStokes make_band_stokes(std::span<const RefinedBand> bands, Progress& progress) const;

  private:
    struct Impl;
    std::unique_ptr<Impl> impl_;
};

/// The largest turn of 2 RM lambda^2 from node to node of a band.
inline constexpr double turn_between_nodes = 0.3;  // rad

/// The most nodes of one band that make_band_stokes asks for: turns of 2 RM lambda^2 over a band of up to
/// 380 rad are averaged exactly, and beyond it less than 1/380 is left.
inline constexpr std::size_t most_band_nodes = 192;

}  // namespace foreglow
