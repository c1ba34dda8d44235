// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <array>
#include <cstdint>
#include <limits>
#include <span>
#include <vector>

#include "sphere/alm.h"
#include "sphere/grid.h"
#include "sphere/ring_weights.h"

namespace foreglow {

// Spherical-harmonic transforms in double precision (libsharp: Reinecke & Seljebotn 2013). Spin 2 is COSMO:
// Q, U against the E, B of the HEALPix libraries. Results are the same, bit for bit, whatever the number of
// threads.

/// Stands for "all the l that the coefficients have".
inline constexpr int all_l = std::numeric_limits<int>::max();

/// Linear polarization at some pixels: Q and U of the same length.
struct StokesValues {
    std::vector<double> q, u;
};

/// Returns the map of a_lm at the pixels' centres: sum over l, m of a_lm Y_lm.
/// @param lmax   terms above it are left out
/// @return       [npix]
[[nodiscard]] std::vector<double> synthesize(const Alm& alm, const HealpixGrid& grid, int lmax = all_l);
[[nodiscard]] StokesValues synthesize_spin2(const AlmEB& alm, const HealpixGrid& grid, int lmax = all_l);

/// Returns a_lm = sum over pixels of w 4 pi / npix m(p) conj(Y_lm(p)), with w = 1 where no ring weights are
/// given.
/// @param map  [npix], each pixel defined
/// @throws ContractError where a pixel is undefined
[[nodiscard]] Alm analyse(const HealpixGrid& grid, std::span<const double> map, int lmax,
                          const RingWeights* weights = nullptr);
[[nodiscard]] AlmEB analyse_spin2(const HealpixGrid& grid, std::span<const double> q,
                                  std::span<const double> u, int lmax, const RingWeights* weights = nullptr);

/// A strip of the sky: `count` rings from `first` on and, when mirrored, their mirror images in the south as
/// well.
///
/// A mirrored strip costs half of what its two halves cost apart; its rings are at most 2 nside, from the
/// north, and the equator is its own image and comes once. A strip's buffer holds the pixels of its rings in
/// RING order, north then south.
struct RingStrip {
    int first = 0;
    int count = 0;
    bool mirrored = false;
};

/// Where a piece of a strip's buffer lies in the full map.
struct PixelRange {
    std::int64_t first_pixel = 0;
    std::int64_t count = 0;
    std::int64_t offset = 0;  ///< in the strip's buffer
};

/// Returns the pieces of a strip; the second one is empty unless the strip is mirrored.
[[nodiscard]] std::array<PixelRange, 2> pixel_ranges(const HealpixGrid& grid, const RingStrip& strip);
/// Returns the length of a strip's buffer.
[[nodiscard]] std::int64_t pixel_count(const HealpixGrid& grid, const RingStrip& strip);
/// Returns mirrored strips that cover the sky once, each of about `pixels` pixels (at least one ring and its
/// image).
[[nodiscard]] std::vector<RingStrip> cut_into_strips(const HealpixGrid& grid, std::int64_t pixels);

/// Writes the map of a_lm on one strip; strips may come in any order.
///
/// Values differ from those of synthesize() by rounding only (contributions that underflow are cut for groups
/// of rings).
/// @param out  [pixel_count(grid, strip)]
void synthesize_strip(const Alm& alm, const HealpixGrid& grid, const RingStrip& strip, std::span<double> out,
                      int lmax = all_l);
void synthesize_strip_spin2(const AlmEB& alm, const HealpixGrid& grid, const RingStrip& strip,
                            std::span<double> q, std::span<double> u, int lmax = all_l);

/// Adds what one strip gives to the sum of analyse(); all strips of the sky, in a fixed order, give the
/// whole.
/// @param values  [pixel_count(grid, strip)], each pixel defined
/// @throws ContractError where a pixel is undefined
void add_analysis_of_strip(Alm& alm, const HealpixGrid& grid, const RingStrip& strip,
                           std::span<const double> values, const RingWeights* weights = nullptr);
void add_analysis_of_strip_spin2(AlmEB& alm, const HealpixGrid& grid, const RingStrip& strip,
                                 std::span<const double> q, std::span<const double> u,
                                 const RingWeights* weights = nullptr);

}  // namespace foreglow
