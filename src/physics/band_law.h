// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <array>
#include <span>
#include <vector>

#include "base/quantity.h"
#include "math/vector_exp.h"
#include "physics/response.h"

namespace foreglow {

/// The ranges of index and curvature that a sky's pixels span.
struct ParameterRange {
    double index_low = 0, index_high = 0;
    double curvature_low = 0, curvature_high = 0;
};

/// Returns M(beta, c)/A = sum over i of weight_i (nu_i/nu0)^(beta + c ln(nu_i/nu0)), the channel's number for
/// a pixel of unit amplitude at nu0, by the sum itself: the oracle of BandLaw and of the spectral basis.
[[nodiscard]] double exact_band_value(const BandSum& band, Frequency reference, double index,
                                      double curvature);

/// A channel's number per unit amplitude as a fast function of index and curvature.
///
/// M(beta, c) = exp(ln_ref (beta + c ln_ref)) exp(P(beta, c)): the law at the band's mean frequency times a
/// small band correction, ln of which is a polynomial of total degree d over the range. For one frequency P
/// is a constant and the law is exact.
class BandLaw {
  public:
    /// Fits the correction by least squares on Chebyshev points and raises d until a grid between them agrees
    /// with the exact sum; where degree 12 does not reach the tolerance (a band of several octaves), the
    /// exact sum itself is used, slowly.
    /// @param tolerance  largest relative error allowed over the range, 1e-12 or more
    BandLaw(const BandSum& band, Frequency reference, const ParameterRange& range, double tolerance);

    /// Returns the largest relative error found over the range.
    [[nodiscard]] double worst_error() const { return worst_error_; }

    /// Writes M(index[i], curvature[i]) of pixels of unit amplitude; NaN in either gives NaN. All spans [n],
    /// any n.
    /// @param precision  Single adds a relative error of 3e-10 and is faster
    void evaluate(std::span<const double> index, std::span<const double> curvature, std::span<double> out,
                  ExpPrecision precision = ExpPrecision::Double) const;

    /// Returns M(index, curvature) of one pixel of unit amplitude, as evaluate computes it.
    [[nodiscard]] double value(double index, double curvature) const;

    /// The numbers of a compiled loop over pixels.
    struct Kernel {
        static constexpr int highest_degree = 12;
        int degree = 0;
        bool varies_with_curvature = false;
        double log_ref = 0;  ///< ln(nu_mean/nu0)
        double index_middle = 0, index_scale = 0;
        double curvature_middle = 0, curvature_scale = 0;
        std::array<double, (highest_degree + 1) * (highest_degree + 2) / 2>
            c{};  ///< of x^i y^j: i = 0..degree - j for each j
    };

  private:
    void fit(const BandSum& band, Frequency reference, const ParameterRange& range);
    [[nodiscard]] double error_on_check_grid(const BandSum& band, Frequency reference,
                                             const ParameterRange& range) const;
    Kernel kernel_;
    std::vector<double> log_ratios_, band_weights_;  // of the exact sum, where it is used
    double worst_error_ = 0;
};

}  // namespace foreglow
