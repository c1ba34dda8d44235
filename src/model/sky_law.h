// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <span>
#include <variant>
#include <vector>

#include "math/least_squares.h"
#include "physics/band_law.h"
#include "physics/electron_band.h"
#include "physics/response.h"

// The seam between skies and channels. A sky's pixels follow a law (SkyLaw), whose numbers in each pixel are
// columns (LawColumns). A channel's band turns the law into one fast function of the columns (BandFactor);
// the oracle of that function is exact_band_values. Whoever adds a law adds an alternative to SkyLaw, one to
// BandFactor, and a branch to each function below.
//
// A sky that is no law times an amplitude, but whose maps an integrator makes at node frequencies, goes in
// one step further up, at the functions that take the whole sky: make_intensity_basis and
// make_polarized_basis (its nodes are the basis' components, the channels' weights interpolate between them),
// make_intensity_component and make_polarized_component (the integrator's map at a node, component_maps.h),
// measure_basis_errors, and PixelRoute (the same weights, pixel by pixel).

namespace foreglow {

/// T = A (nu/nu0)^(beta + c ln(nu/nu0)), with the bounds of beta and c over the sky.
struct CurvedSkyLaw {
    Frequency reference;
    ParameterRange range;
};

/// The exact spectrum of an electron distribution, with the bounds of what its pixels differ in.
struct ElectronSkyLaw {
    Frequency reference;
    ElectronLaw law;
    ElectronRange range;
    EmissionPart part = EmissionPart::Total;  ///< Polarized for Q and U
};

using SkyLaw = std::variant<CurvedSkyLaw, ElectronSkyLaw>;

/// What the law of some pixels is made of, [n] each; NaN where undefined.
struct LawColumns {
    std::span<const double> index, curvature;  ///< of the curved law
    ElectronColumns electrons;                 ///< of the electron law

    [[nodiscard]] std::size_t size() const {
        return electrons.slope.empty() ? index.size() : electrons.slope.size();
    }
    /// Tells whether no column of a pixel is undefined.
    [[nodiscard]] bool is_defined_at(std::size_t pixel) const;
    [[nodiscard]] LawColumns part(std::size_t first, std::size_t count) const;
};

/// Columns that own their numbers.
struct LawPoints {
    std::vector<double> index, curvature, slope, field, break_energy, cutoff_energy;

    [[nodiscard]] LawColumns columns() const {
        return {index, curvature, {slope, field, break_energy, cutoff_energy}};
    }
    /// Appends one pixel's numbers.
    void add(const LawColumns& columns, std::size_t pixel);
};

/// A band's number per unit amplitude as a fast function of a law's columns.
class BandFactor {
  public:
    /// @param tolerance  largest relative error over the law's range, 1e-12 or more
    /// @throws NumericError where the band is too wide for it
    BandFactor(const SkyLaw& law, const BandSum& band, double tolerance);

    /// Returns the largest relative error found over the range.
    [[nodiscard]] double worst_error() const;

    /// Writes the numbers of some pixels; NaN in any column gives NaN.
    /// @param out  [columns.size()]
    void evaluate(const LawColumns& columns, std::span<double> out,
                  ExpPrecision precision = ExpPrecision::Double) const;

  private:
    std::variant<BandLaw, ElectronBandLaw> fast_;
};

/// Computes bands of some pixels of unit amplitude: of the curved law by the sums themselves, slowly; of
/// electrons by an ElectronBandLaw of tolerance 1e-10, which its tests hold against the sums.
/// @return [pixels][bands]
[[nodiscard]] Matrix exact_band_values(const SkyLaw& law, const std::vector<BandSum>& bands,
                                       const LawColumns& pixels);

/// Takes points that span a law's range: `first` along the first parameter, `others` along each other one; a
/// parameter that does not vary has one.
[[nodiscard]] LawPoints make_law_grid(const SkyLaw& law, int first, int others);

}  // namespace foreglow
