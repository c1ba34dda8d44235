// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <functional>
#include <span>
#include <vector>

#include "math/chebyshev_box.h"
#include "math/vector_exp.h"
#include "physics/electron_spectrum.h"
#include "physics/response.h"

namespace foreglow {

/// What one pixel's electrons are: their slope, and what a map may say of field, break and cut-off.
struct ElectronPixel {
    double slope = 0;
    double field_uG = 0, break_GeV = 0, cutoff_GeV = 0;
};
/// Returns the law with a pixel's own field, break and cut-off energies (where the law has such).
[[nodiscard]] ElectronLaw with_pixel(const ElectronLaw& law, const ElectronPixel& pixel);

/// The bounds of these over a sky.
struct ElectronRange {
    Interval slope, field_uG, break_GeV, cutoff_GeV;
};

/// Columns of pixels, [n] each; the last three are empty where one value holds everywhere.
struct ElectronColumns {
    std::span<const double> slope, field_uG, break_GeV, cutoff_GeV;
};

/// Returns M/A = sum over i of weight_i T(nu_i)/T(nu0) of one pixel by the sum itself: the oracle of
/// ElectronBandLaw.
[[nodiscard]] double exact_electron_band_value(const ElectronLaw& law, double slope, const BandSum& band,
                                               Frequency reference, EmissionPart part);

/// A smooth quantity of the electrons as a polynomial of slope and of ln of field, break and cut-off.
class ElectronBox {
  public:
    using Row =
        std::function<void(const ElectronLaw& law, std::span<const double> slopes, std::span<double> out)>;
    ElectronBox() = default;
    ElectronBox(const ElectronLaw& law, const ElectronRange& range, const Row& row, double tolerance,
                double lowest);

    [[nodiscard]] const ChebyshevBox& box() const { return box_; }
    [[nodiscard]] ChebyshevBox::Place place(const ElectronColumns& columns, std::size_t i) const;
    void evaluate(const ElectronColumns& columns, std::span<double> out) const;

  private:
    ChebyshevBox box_;
};

/// A channel's number per unit amplitude as a fast function of the electrons: exp of a polynomial. Along the
/// band ln of the emissivity is interpolated between Chebyshev points in ln nu.
class ElectronBandLaw {
  public:
    /// @param tolerance  largest relative error wanted over the range; worst_error says what was reached
    ElectronBandLaw(const ElectronLaw& law, const BandSum& band, Frequency reference,
                    const ElectronRange& range, EmissionPart part, double tolerance);

    /// Returns the largest relative error found over the range, of values above exp(-60) times those at
    /// reference.
    [[nodiscard]] double worst_error() const { return logarithm_.box().worst_error(); }
    /// Writes the numbers of some pixels; NaN in any column gives NaN.
    void evaluate(const ElectronColumns& columns, std::span<double> out,
                  ExpPrecision precision = ExpPrecision::Double) const;

  private:
    ElectronBox logarithm_;
};

/// The local index and curvature at one frequency, and the slope that an index stands for.
class ElectronShape {
  public:
    /// @param range      its slope is not read: it is found from the range of the indices
    /// @param definition where the indices hold
    ElectronShape(const ElectronLaw& law, ElectronRange range, const Interval& indices,
                  const IndexDefinition& definition, Frequency reference);

    /// Returns the bounds with the slopes that the indices stand for.
    [[nodiscard]] const ElectronRange& range() const { return range_; }
    /// Turns indices into slopes in place; NaN stays NaN.
    /// @param columns  its slope is not read
    /// @return how many indices no slope within slope_limits has; they took the nearest
    [[nodiscard]] std::int64_t find_slopes(std::span<double> indices, const ElectronColumns& columns) const;
    /// Writes the local index and curvature at the reference frequency, to 1e-7.
    void write_local(const ElectronColumns& columns, std::span<double> index,
                     std::span<double> curvature) const;

  private:
    ElectronRange range_;
    SlopeLimits limits_;
    ElectronBox defined_index_, index_, curvature_;
};

}  // namespace foreglow
