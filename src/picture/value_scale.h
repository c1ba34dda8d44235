// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <optional>
#include <span>
#include <string>
#include <vector>

namespace foreglow {

/// How values become positions on a scale: linear, log10, or signed, asinh(v/knee), linear near zero and log
/// beyond.
enum class ScaleKind { Linear, Log, Signed };

/// Reads "linear", "log" or "signed".
/// @throws InputError otherwise
[[nodiscard]] ScaleKind parse_scale(const std::string& text);

/// Maps values from [low, high] to positions from 0 to 1.
class ValueScale {
  public:
    /// @param knee  of a signed scale, where linear turns into log; otherwise unused
    /// @throws ContractError unless low < high, 0 < low for log and 0 < knee for signed
    ValueScale(ScaleKind kind, double low, double high, double knee = 1);
    /// Returns the position of a value, below 0 or above 1 outside the range; -infinity for values <= 0 on a
    /// log scale.
    [[nodiscard]] double position(double value) const;
    /// Writes the positions of many values, with logarithms good to 1e-9, which no colour shows; NaN where a
    /// value is undefined.
    void positions(std::span<const double> values, std::span<double> out) const;
    [[nodiscard]] ScaleKind kind() const { return kind_; }
    [[nodiscard]] double low() const { return low_; }
    [[nodiscard]] double high() const { return high_; }
    [[nodiscard]] double knee() const { return knee_; }

  private:
    [[nodiscard]] double bent(double value) const;
    ScaleKind kind_;
    double low_, high_, knee_, bent_low_, bent_span_;
};

/// What is wanted of a scale; what is left open is chosen from the values.
struct ScaleRequest {
    std::optional<ScaleKind> kind;
    std::optional<double> low, high;
    double low_percentile = 0.5, high_percentile = 99.5;
};

/// A scale that suits a set of values, and what they are like.
struct ScaleChoice {
    ValueScale scale{ScaleKind::Linear, 0, 1};
    std::int64_t pixels = 0, undefined = 0, not_positive = 0, below = 0, above = 0;
    std::vector<std::string>
        notices;  ///< sentences for the user: fallbacks, constant maps, values that a log cannot show
};

/// Chooses scale and range. An open range is that between two percentiles (of every n-th value where there
/// are more than 32768, which knows the 0.5 % beyond an end to 8 % of itself; of the positive ones for log);
/// signed ranges are symmetric, with the knee at the median of |v|. An open kind is signed where both signs
/// matter, log where all values are positive and the range spans a factor above 8, else linear.
/// @throws InputError where the request contradicts itself: low not below high, or a log range that is not
/// positive
[[nodiscard]] ScaleChoice choose_scale(std::span<const double> values, const ScaleRequest& request);

}  // namespace foreglow
