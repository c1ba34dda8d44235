// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <functional>
#include <span>
#include <vector>

#include "model/sky_model.h"
#include "physics/response.h"
#include "sphere/stokes_turn.h"

namespace foreglow {

/// What some pixels are at one frequency or in one channel; each [n], NaN where a pixel has no value, empty
/// where the source has none at all.
struct PointValues {
    std::vector<double> brightness;       ///< in the unit asked for
    std::vector<double> amplitude;        ///< brightness at nu0 on any scale: the weight of index_reference
    std::vector<double> index;            ///< d ln T/d ln nu at the frequency
    std::vector<double> curvature;        ///< half the second derivative there
    std::vector<double> index_reference;  ///< at nu0
    std::vector<double> electron_slope;   ///< the law's own s, else -3 - 2 index
    std::vector<double> q, u;             ///< in the unit asked for, COSMO
};

/// A frequency or a channel that is asked of a sky.
struct PointRow {
    BandSum band;  ///< in the unit asked for
    Frequency at;  ///< where index and curvature are local
    /// Returns the band with steps of lambda^2 no longer than that [m^2], for Q and U that rotate within it;
    /// empty for a single frequency.
    std::function<BandSum(double)> refine;
};

/// Applies the spectral law to pixels of a sky: brightness over the band, index and curvature at `at`.
/// @param strip       [n] as PointSky::evaluate makes it
/// @param reference, polarized_reference  where the strip's indices hold
/// @param band        in the unit asked for; with one frequency the law itself, else its exact sum
[[nodiscard]] PointValues make_point_values(const SkyStrip& strip, Frequency reference,
                                            Frequency polarized_reference, const BandSum& band, Frequency at);

/// Returns a band's number per unit amplitude of curved power laws, [n], as make_point_values has it.
[[nodiscard]] std::vector<double> make_curved_factors(std::span<const double> index,
                                                      std::span<const double> curvature, Frequency reference,
                                                      const BandSum& band);

/// Tells which pixels, with which weights, each row is made of.
struct PixelGroups {
    std::vector<std::int64_t> pixels;  ///< RING numbers, group behind group
    std::vector<double> weights;       ///< of the pixels; empty: 1
    std::vector<std::size_t> first;    ///< [rows + 1] in `pixels`; empty: one pixel each

    [[nodiscard]] std::size_t rows() const { return first.empty() ? pixels.size() : first.size() - 1; }
};

/// The values of rows, with what a group adds to them.
struct GroupedValues {
    PointValues values;                 ///< [rows]
    std::vector<double> scatter;        ///< standard deviation of brightness (of index where there is none)
    std::vector<std::int64_t> defined;  ///< pixels that have a value
};

/// Takes weighted means over groups, undefined pixels left out.
///
/// With T the mean brightness, index and curvature are those of T: d ln T/d ln nu = sum w T_i beta_i/sum w
/// T_i, and half the second derivative = sum w T_i (c_i + beta_i^2/2)/sum w T_i - index^2/2. Without
/// brightness they are plain means. A row of one pixel is that pixel.
[[nodiscard]] GroupedValues take_means(PointValues values, const PixelGroups& groups);

/// Turns Q and U of each pixel.
/// @param turns  [n]
void turn_stokes(PointValues& values, std::span<const StokesTurn> turns);

}  // namespace foreglow
