// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <optional>
#include <span>
#include <vector>

#include "base/quantity.h"
#include "physics/response.h"

namespace foreglow {

/// The ranges of index and curvature that a sky's pixels span.
struct ParameterRange {
    double index_low = 0, index_high = 0;
    double curvature_low = 0, curvature_high = 0;
};

/// Returns M(beta, c)/A = sum over i of weight_i (nu_i/nu0)^(beta + c ln(nu_i/nu0)), the channel's number for a pixel of
/// unit amplitude at nu0, by the sum itself: the oracle of BandLaw and of the spectral basis.
[[nodiscard]] double exact_band_value(const BandSum& band, Frequency reference, double index, double curvature);

/// A channel's number per unit amplitude as a fast function of index and curvature.
///
/// M(beta, c) = exp(ln_ref (beta + c ln_ref)) exp(P(beta, c)): the law at the band's mean frequency times a small band correction,
/// ln of which is a polynomial of total degree d over the range. For one frequency P is a constant and the law is exact.
class BandLaw {
  public:
    /// Fits the correction by least squares on Chebyshev points and raises d until a grid between them agrees with the exact sum.
    /// @param tolerance  largest relative error allowed over the range, 1e-12 or more
    /// @throws NumericError when degree 12 does not reach the tolerance
    BandLaw(const BandSum& band, Frequency reference, const ParameterRange& range, double tolerance);

    /// Returns the largest relative error found over the range.
    [[nodiscard]] double worst_error() const { return worst_error_; }

    /// Multiplies: out[i] = amplitude[i] M(index[i], curvature[i]); NaN in any gives NaN. All spans [n], out may be amplitude.
    void apply(std::span<const double> amplitude, std::span<const double> index, std::span<const double> curvature,
               std::span<double> out) const;
    /// As above for two amplitudes that share the law (Q and U).
    void apply(std::span<const double> q, std::span<const double> u, std::span<const double> index,
               std::span<const double> curvature, std::span<double> q_out, std::span<double> u_out) const;

    /// Returns M(index, curvature) for one pixel of unit amplitude, as apply computes it.
    [[nodiscard]] double value(double index, double curvature) const;

  private:
    void evaluate(std::span<const double> index, std::span<const double> curvature, std::span<double> out) const;

    int degree_ = 0;
    double log_ref_ = 0;                    // ln(nu_mean/nu0)
    double index_middle_ = 0, index_scale_ = 1;
    double curvature_middle_ = 0, curvature_scale_ = 1;
    std::vector<double> coefficients_;      // of x^i y^j, j outer: i = 0..degree - j
    bool varies_with_curvature_ = false;
    double worst_error_ = 0;
};

}  // namespace foreglow
