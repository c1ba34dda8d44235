// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <span>

#include "base/quantity.h"
#include "model/galaxy_integral.h"
#include "model/galaxy_loops.h"
#include "model/galaxy_sampling.h"
#include "model/galaxy_turbulence.h"
#include "sphere/grid.h"

namespace foreglow {

/// Makes pixels of a grid one by one: the mean of the disc's lines of sight, turbulence, loops.
///
/// Pixels near the plane of grids coarser than nside 128 are means over the pixels of nside 128 that they
/// hold (of 8 times their own nside where that is less; at least four), since the plane is thinner than they
/// are.
class GalaxyPixels {
  public:
    /// @param fields  outlive this, as do the others
    /// @param frequencies  [K]
    GalaxyPixels(const GalaxySpec& galaxy, const GalaxyTable& table, const TurbulenceFields& fields,
                 const HealpixGrid& grid, bool polarized, std::span<const Frequency> frequencies);

    [[nodiscard]] const GalaxyIntegral& integral() const { return integral_; }
    /// Returns what a pixel shows, K_RJ, COSMO; q and u empty without polarization.
    [[nodiscard]] GalaxySightline pixel(std::int64_t number, const GalaxySampling& sampling) const {
        return pixel(number, static_cast<std::size_t>(number), sampling);
    }
    /// Likewise with fields that hold some pixels only.
    /// @param place  of the pixel in the fields
    [[nodiscard]] GalaxySightline pixel(std::int64_t number, std::size_t place,
                                        const GalaxySampling& sampling) const;

  private:
    [[nodiscard]] GalaxySightline line_of(const Vector3& direction, const GalaxySampling& sampling) const;
    [[nodiscard]] GalaxySightline mean_line(std::int64_t number, const Vector3& direction,
                                            const GalaxySampling& sampling) const;
    void add_turbulence(GalaxySightline& line, std::size_t p) const;
    void add_loops(GalaxySightline& line, const Vector3& direction) const;
    void tilt(GalaxySightline& line, std::size_t p) const;

    const GalaxySpec& galaxy_;
    std::vector<Frequency> frequencies_;
    GalaxyIntegral integral_;
    LoopSpectra spectra_;
    const TurbulenceFields& fields_;
    HealpixGrid grid_;
    bool polarized_;
};

}  // namespace foreglow
