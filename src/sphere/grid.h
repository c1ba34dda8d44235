// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <array>
#include <cstdint>
#include <span>

#include "sphere/frame.h"

namespace foreglow {

enum class Ordering { Ring, Nested };

/// The sign of U: COSMO (HEALPix; angle from south through east) or IAU (from north through east); U_IAU =
/// -U_COSMO.
enum class PolarizationConvention { Cosmo, Iau };

/// The HEALPix grid of one nside (Gorski et al. 2005): 12 nside^2 pixels of equal area on 4 nside - 1 rings.
///
/// All pixel numbers are RING numbers unless a name says nested.
class HealpixGrid {
  public:
    static constexpr int max_nside = 8192;

    /// @param nside  a power of two from 1 to 8192
    /// @throws ContractError otherwise
    explicit HealpixGrid(int nside);

    [[nodiscard]] int nside() const { return nside_; }
    [[nodiscard]] std::int64_t npix() const { return 12LL * nside_ * nside_; }
    [[nodiscard]] int ring_count() const { return 4 * nside_ - 1; }
    [[nodiscard]] double pixel_area() const;  ///< [sr]

    struct Ring {
        std::int64_t first_pixel = 0;
        int pixels = 0;
        double cos_theta = 0, sin_theta = 0;
        double phi0 = 0;  ///< azimuth of the first pixel's centre [rad]
    };
    /// Returns where a ring lies, in closed form (Gorski et al. 2005, eqs 2-9).
    /// @param ring  0 (north) to ring_count() - 1 (south)
    [[nodiscard]] Ring ring(int ring) const;
    /// Returns the ring that holds a pixel, 0 to ring_count() - 1.
    [[nodiscard]] int ring_of(std::int64_t pixel) const;

    /// Returns the unit vector of a pixel's centre.
    [[nodiscard]] Vector3 direction(std::int64_t pixel) const;
    /// Returns the pixel that holds a direction (need not be normalised).
    [[nodiscard]] std::int64_t pixel_at(const Vector3& direction) const;
    [[nodiscard]] std::int64_t ring_to_nested(std::int64_t pixel) const;
    [[nodiscard]] std::int64_t nested_to_ring(std::int64_t nested_pixel) const;

    /// Writes the unit vectors of the centres of pixels first, first + 1, ...; faster than one by one.
    void directions(std::int64_t first, std::span<Vector3> out) const;
    /// Writes the pixels that hold places of one colatitude; no trigonometric function is called.
    /// @param turns  azimuths / 2 pi, in [0, 1]
    void pixels_on_parallel(double cos_theta, double sin_theta, std::span<const double> turns,
                            std::span<std::int32_t> out) const;
    /// Writes the nested numbers of RING pixels first, first + 1, ...
    void nested_numbers(std::int64_t first, std::span<std::int64_t> out) const;
    /// Writes the RING numbers of nested pixels first, first + 1, ...
    void ring_numbers(std::int64_t first_nested, std::span<std::int64_t> out) const;

    /// Returns the up to eight pixels that touch a pixel, by side or corner; -1 where there is none.
    [[nodiscard]] std::array<std::int64_t, 8> neighbours(std::int64_t pixel) const;

    /// The four pixels and weights of bilinear interpolation along the two neighbouring rings; weights sum
    /// to 1.
    struct Stencil {
        std::array<std::int64_t, 4> pixels{};
        std::array<double, 4> weights{};
    };
    [[nodiscard]] Stencil interpolation(const Vector3& direction) const;

    bool operator==(const HealpixGrid&) const = default;

  private:
    int nside_;
};

/// Tells whether a number is a power of two from 1 to 8192.
[[nodiscard]] bool is_valid_nside(std::int64_t nside);

}  // namespace foreglow
