// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <complex>
#include <cstddef>
#include <span>
#include <vector>

namespace foreglow {

/// The spherical-harmonic coefficients a_lm of a real field, 0 <= m <= l <= lmax, in HEALPix's m-major
/// triangular order.
///
/// index(l, m) = m (2 lmax + 1 - m) / 2 + l; a_l,-m = (-1)^m conj(a_lm). Values [(lmax + 1)(lmax + 2) / 2].
class Alm {
  public:
    using Value = std::complex<double>;

    /// @param lmax  0 or more
    /// @throws ContractError otherwise
    explicit Alm(int lmax = 0);

    [[nodiscard]] int lmax() const { return lmax_; }
    [[nodiscard]] std::size_t index(int l, int m) const {
        const auto mm = static_cast<std::size_t>(m);
        return mm * (2 * static_cast<std::size_t>(lmax_) + 1 - mm) / 2 + static_cast<std::size_t>(l);
    }
    [[nodiscard]] Value operator()(int l, int m) const { return values_[index(l, m)]; }
    [[nodiscard]] Value& operator()(int l, int m) { return values_[index(l, m)]; }
    [[nodiscard]] std::span<const Value> values() const { return values_; }
    [[nodiscard]] std::span<Value> values() { return values_; }
    /// Returns the coefficients l = m..lmax of one m, [lmax + 1 - m].
    [[nodiscard]] std::span<const Value> column(int m) const;
    [[nodiscard]] std::span<Value> column(int m);

    bool operator==(const Alm&) const = default;

  private:
    int lmax_;
    std::vector<Value> values_;
};

/// The coefficients of a polarization field in the sign of HEALPix (COSMO): Q +- iU = -sum (E +- iB) +-2Y_lm.
struct AlmEB {
    Alm e, b;
    bool operator==(const AlmEB&) const = default;
};

/// Returns a copy with another lmax: cut, or filled up with zeros.
[[nodiscard]] Alm with_lmax(const Alm& alm, int lmax);

/// Adds factor times the terms of another set, up to the smaller lmax.
void add_scaled(Alm& alm, double factor, const Alm& other);

/// Multiplies a_lm by a factor for each l; terms beyond the end of the list become zero.
/// @param factors  [l], l = 0..
void multiply_by_l(Alm& alm, std::span<const double> factors);

}  // namespace foreglow
