// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <array>
#include <cstddef>
#include <functional>
#include <span>
#include <vector>

#include "base/vector_width.h"

namespace foreglow {

/// A range of one variable; low = high where it does not vary.
struct Interval {
    double low = 0, high = 0;
    [[nodiscard]] bool is_point() const { return !(high > low); }
};

/// A smooth function of up to four variables on a box, as a product of Chebyshev polynomials (Trefethen 2013,
/// ch. 3; common practice for several variables).
class ChebyshevBox {
  public:
    static constexpr std::size_t most_variables = 4;
    using Place = std::array<double, most_variables>;
    /// Writes the function along the first variable at fixed others; called from several threads.
    /// @param place  of the others; [0] is not used
    /// @param first  [n] values of the first variable
    /// @param out    [n]
    using Row = std::function<void(const Place& place, std::span<const double> first, std::span<double> out)>;

    ChebyshevBox() = default;
    /// Raises the degrees until the function between the nodes is met, then drops what is not needed.
    /// @param tolerance  largest absolute error wanted
    /// @param lowest     values below it need not be met
    ChebyshevBox(const std::array<Interval, most_variables>& box, const Row& row, double tolerance,
                 double lowest);

    /// Returns the largest error found between the nodes, of values above `lowest`.
    [[nodiscard]] double worst_error() const { return worst_error_; }
    [[nodiscard]] const Interval& interval(std::size_t variable) const { return box_[variable]; }

    /// Returns the value at a place, clamped to the box.
    [[nodiscard]] double value(const Place& place) const;
    /// Returns value and derivative in the first variable.
    struct ValueAndSlope {
        double value = 0, slope = 0;
    };
    [[nodiscard]] ValueAndSlope value_and_slope(const Place& place) const;
    /// Writes the values at places whose other variables do not vary.
    /// @param first  [n], clamped to the box; NaN stays NaN
    void evaluate_first(std::span<const double> first, std::span<double> out) const;
    /// Tells whether only the first variable varies.
    [[nodiscard]] bool is_curve() const { return counts_[1] == 1 && counts_[2] == 1 && counts_[3] == 1; }

  private:
    void sample(const Row& row, const std::array<int, most_variables>& counts);
    void measure(const Row& row, double lowest);
    void trim(double tolerance);
    [[nodiscard]] double scaled(std::size_t variable, double value) const;
    // Sums the polynomials of all variables but the first: [counts_[0]] coefficients of those.
    void contract(const Place& place, std::span<double> out) const;

    std::array<Interval, most_variables> box_{};
    std::array<int, most_variables> counts_{1, 1, 1, 1};  // degree + 1
    std::vector<double> coefficients_{0.0};               // [count 3][count 2][count 1][count 0]
    double worst_error_ = 0;
};

}  // namespace foreglow
