// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <utility>
#include <variant>

#include "physics/electron_integral.h"
#include "physics/electron_law.h"

namespace foreglow {

/// Returns ln(T(nu)/T(nu0)) of one pixel, T = c^2 j/(2 k nu^2): ln of the emissivities' ratio less twice ln
/// of the frequencies'.
/// @param part  Total, or Polarized for Q and U
[[nodiscard]] double log_electron_ratio(const ElectronLaw& law, double slope, Frequency frequency,
                                        Frequency reference, EmissionPart part = EmissionPart::Total);

/// What a spectrum looks like at one frequency.
struct LocalSpectrum {
    double index = 0;      ///< d ln T/d ln nu
    double curvature = 0;  ///< half the second derivative of ln T in ln nu
};
[[nodiscard]] LocalSpectrum local_spectrum(const ElectronLaw& law, double slope, Frequency frequency);

/// Returns Pi = integral of N G dE over integral of N F dE, the fraction polarized where the field has one
/// direction ((s + 1)/(s + 7/3) for a power law; Ginzburg & Syrovatskii 1965). Of a tangled field: what
/// turning all its directions into one would leave; its net polarization is 0.
[[nodiscard]] double intrinsic_polarized_fraction(const ElectronLaw& law, double slope, Frequency frequency);

/// Returns the emissivity of N(E) = k E^-s in closed form [W m^-3 Hz^-1 sr^-1] (Rybicki & Lightman 1979, eq.
/// 6.36, in SI).
/// @param density  k [m^-3 GeV^-1 at 1 GeV], over all directions of motion
[[nodiscard]] double power_law_emissivity(double slope, double density, double field_uG, Frequency frequency);

/// Returns the emissivity of any law by quadrature, for k as above.
[[nodiscard]] double emissivity(const ElectronLaw& law, double slope, double density, Frequency frequency);

/// Where an index holds: the local one at a frequency, or the chord between two.
using IndexDefinition = std::variant<Frequency, std::pair<Frequency, Frequency>>;

/// The index of a law as a function of its slope: strictly decreasing, since steeper electrons give less
/// weight to high energies, where d ln F/d ln x is larger (Chebyshev's association inequality).
class IndexOfSlope {
  public:
    IndexOfSlope(const ElectronLaw& law, const IndexDefinition& definition);

    [[nodiscard]] double value(double slope) const;
    /// Finds the slope of an index; one that no slope within slope_limits has is clamped.
    struct Slope {
        double value = 0;
        bool is_clamped = false;
    };
    [[nodiscard]] Slope find(double index) const;

  private:
    SlopeLimits limits_;
    double log_ratio_ = 0;  // of the chord's frequencies; 0 for a local index
    ElectronIntegral upper_, lower_;
};

}  // namespace foreglow
