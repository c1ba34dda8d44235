// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <span>
#include <vector>

namespace foreglow {

/// Carries spectra to angular correlation functions and back, on Gauss-Legendre nodes of cos theta.
///
/// xi(theta) = sum over l of (2l+1)/4pi C_l P_l(cos theta); C_l = 2 pi integral of xi P_l d cos theta, exact
/// for l up to nodes - lmax (libsharp's zonal transforms).
class AngularCorrelation {
  public:
    /// @param lmax   of spectra
    /// @param nodes  more than lmax
    AngularCorrelation(int lmax, int nodes);

    /// @param cl  [lmax + 1] or shorter
    /// @return    [nodes], theta ascending
    [[nodiscard]] std::vector<double> from_spectrum(std::span<const double> cl) const;
    /// @param xi  [nodes]
    /// @return    [lmax + 1]
    [[nodiscard]] std::vector<double> to_spectrum(std::span<const double> xi) const;

  private:
    int lmax_, nodes_;
};

/// Returns the variance of a field, sum over l of (2l+1)/4pi C_l.
[[nodiscard]] double variance_of_spectrum(std::span<const double> cl);

}  // namespace foreglow
