// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <optional>
#include <vector>

#include "base/quantity.h"
#include "physics/brightness_unit.h"
#include "physics/response_weights.h"

namespace foreglow {

/// One row of a tabulated transmission.
struct ResponseRow {
    Frequency frequency;
    double transmission = 0;
};

/// How close a band's nodes must lie for what turns with lambda^2 inside it.
struct BandRefinement {
    double lambda2_step = 0;     ///< mean distance between nodes at most [m^2] ...
    std::size_t most_nodes = 0;  ///< ... unless the band would take more than about so many
};

/// What a channel lets through: one frequency, or a transmission tau(nu) that is linear between rows and zero
/// outside them.
class Response {
  public:
    /// A delta function.
    [[nodiscard]] static Response at(Frequency frequency);
    /// A flat response from low to high.
    /// @throws ContractError unless 0 < low < high
    [[nodiscard]] static Response flat(Frequency low, Frequency high);
    /// A table; equal neighbouring frequencies are steps.
    /// @throws ContractError unless frequencies are above zero and never fall, and some transmission on a
    /// piece of width is above zero
    [[nodiscard]] static Response table(std::vector<ResponseRow> rows);

    [[nodiscard]] bool is_delta() const { return rows_.size() == 1; }
    [[nodiscard]] Frequency lowest() const { return rows_.front().frequency; }
    [[nodiscard]] Frequency highest() const { return rows_.back().frequency; }
    /// Returns the w-weighted mean frequency, integral w nu dnu / integral w dnu.
    [[nodiscard]] Frequency mean_frequency(ResponseWeights weights) const;

    struct Node {
        double hz = 0;
        double weight = 0;  ///< of w(nu) dnu [any scale]
    };
    /// Returns Gauss-Legendre nodes on each linear piece, dense enough that integrals of laws nu^p, |p| < 8,
    /// are good to 1e-13.
    /// @param refinement  where given, nodes lie closer still: see there
    [[nodiscard]] std::vector<Node> nodes(ResponseWeights weights,
                                          const BandRefinement* refinement = nullptr) const;

  private:
    explicit Response(std::vector<ResponseRow> rows) : rows_(std::move(rows)) {}
    std::vector<ResponseRow> rows_;
};

/// A channel's map as a sum over frequencies: M = sum over i of weight_i T_RJ(nu_i), M in the channel's unit.
struct BandSum {
    std::vector<double> hz;
    std::vector<double> weights;
};

/// How a channel's number is calibrated.
struct Calibration {
    BrightnessUnit unit;
    Frequency reference;              ///< of the calibration source's flux law (MJy/sr and Jy/pixel)
    double reference_flux_index = 0;  ///< I of that source ~ (nu/reference)^index
    double pixel_area_sr = 0;         ///< needed for Jy/pixel
};

/// Makes M = integral w T dnu / integral w t_cal dnu, t_cal the brightness temperature of one unit of the
/// calibration source: 1 for K_RJ, x^2 e^x/(e^x-1)^2 for K_CMB, c^2 I/(2 k nu^2) of 1 MJy/sr
/// (nu/reference)^reference_flux_index (Planck 2013 IX, sec. 2).
/// @return relative error of the sum below 1e-12 for laws T ~ nu^p, |p| < 6
/// @param refinement  as in Response::nodes
[[nodiscard]] BandSum make_band_sum(const Response& response, ResponseWeights weights,
                                    const Calibration& calibration,
                                    const BandRefinement* refinement = nullptr);

}  // namespace foreglow
