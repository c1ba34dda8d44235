// SPDX-License-Identifier: GPL-2.0-or-later
#include "physics/electron_spectrum.h"

#include <cmath>

#include "base/constants.h"
#include "base/error.h"
#include "physics/spectral_law.h"
#include "physics/synchrotron_kernel.h"

namespace foreglow {
namespace {

Frequency upper_of(const IndexDefinition& definition) {
    if (const auto* local = std::get_if<Frequency>(&definition)) return *local;
    return std::get<1>(definition).second;
}
Frequency lower_of(const IndexDefinition& definition) {
    if (const auto* local = std::get_if<Frequency>(&definition)) return *local;
    return std::get<1>(definition).first;
}

// sqrt(3) e^3 B/(16 pi^2 eps0 m c) times the integral in GeV.
double emissivity_factor(double density, double field_uG) {
    return density * power_per_hz_and_microgauss() * field_uG / (4 * constants::pi);
}

}  // namespace

double log_electron_ratio(const ElectronLaw& law, double slope, Frequency frequency, Frequency reference,
                          EmissionPart part) {
    return ElectronIntegral(law, frequency, part).log_value(slope) -
           ElectronIntegral(law, reference, part).log_value(slope) -
           2 * log_frequency_ratio(frequency, reference);
}

LocalSpectrum local_spectrum(const ElectronLaw& law, double slope, Frequency frequency) {
    const double total = ElectronIntegral(law, frequency, EmissionPart::Total).value(slope);
    const double first = ElectronIntegral(law, frequency, EmissionPart::TotalFirst).value(slope) / total;
    const double second = ElectronIntegral(law, frequency, EmissionPart::TotalSecond).value(slope) / total;
    return {first - 2, 0.5 * (second - first * first)};
}

double intrinsic_polarized_fraction(const ElectronLaw& law, double slope, Frequency frequency) {
    const ElectronIntegral total(law, frequency, EmissionPart::Total);
    const ElectronIntegral part(law, frequency, EmissionPart::Polarized);
    return std::exp(part.log_value(slope) - total.log_value(slope));
}

double power_law_emissivity(double slope, double density, double field_uG, Frequency frequency) {
    FOREGLOW_EXPECTS(slope > 1.0 / 3 && field_uG > 0);
    const double x = frequency.hz() / critical_frequency(1, field_uG).hz();
    const double moment = std::exp2(0.5 * (slope - 1)) / (0.5 * (slope + 1)) *
                          std::tgamma(slope / 4 + 19.0 / 12) * std::tgamma(slope / 4 - 1.0 / 12);
    return emissivity_factor(density, field_uG) * 0.5 * std::pow(x, -0.5 * (slope - 1)) * moment;
}

double emissivity(const ElectronLaw& law, double slope, double density, Frequency frequency) {
    return emissivity_factor(density, law.field_uG) *
           std::exp(ElectronIntegral(law, frequency, EmissionPart::Total).log_value(slope));
}

IndexOfSlope::IndexOfSlope(const ElectronLaw& law, const IndexDefinition& definition)
    : limits_(slope_limits(law)),
      log_ratio_(log_frequency_ratio(upper_of(definition), lower_of(definition))),
      upper_(law, upper_of(definition), log_ratio_ == 0 ? EmissionPart::TotalFirst : EmissionPart::Total),
      lower_(law, lower_of(definition), EmissionPart::Total) {}

double IndexOfSlope::value(double slope) const {
    if (log_ratio_ == 0) return upper_.value(slope) / lower_.value(slope) - 2;
    return (upper_.log_value(slope) - lower_.log_value(slope)) / log_ratio_ - 2;
}

IndexOfSlope::Slope IndexOfSlope::find(double index) const {
    double low = limits_.low;
    double high = limits_.high;
    double above = value(low) - index;
    double below = value(high) - index;
    if (above <= 0) return {low, above < 0};
    if (below >= 0) return {high, below > 0};
    // False position with halved ends (the Illinois rule) on a monotone function.
    for (int i = 0; i < 200 && high - low > 1e-14 * high; ++i) {
        const double middle = low + (high - low) * above / (above - below);
        const double there = value(middle) - index;
        if (there == 0) return {middle, false};
        if (there > 0) {
            low = middle;
            above = there;
            below *= 0.5;
        } else {
            high = middle;
            below = there;
            above *= 0.5;
        }
        if (std::abs(there) < 1e-14) return {middle, false};
    }
    return {0.5 * (low + high), false};
}

}  // namespace foreglow
