// SPDX-License-Identifier: GPL-2.0-or-later
#include "physics/electron_law.h"

#include <cmath>

#include "base/constants.h"
#include "base/error.h"
#include "physics/synchrotron_kernel.h"

namespace foreglow {
namespace {

constexpr double seconds_per_Myr = 1e6 * 365.25 * 86400;

// c2 = (8 pi/3) r_e^2 eps0 c^3/(m c^2)^2 in SI, for GeV, Myr and uG.
double loss_constant() {
    using namespace constants;
    const double rest = electron_mass * speed_of_light * speed_of_light;
    const double radius = elementary_charge * elementary_charge / (4 * pi * vacuum_permittivity * rest);
    const double c3 = speed_of_light * speed_of_light * speed_of_light;
    const double si = 8 * pi / 3 * radius * radius * vacuum_permittivity * c3 / (rest * rest);
    return si * 1e-20 * 1e9 * elementary_charge * seconds_per_Myr;
}

}  // namespace

SlopeLimits slope_limits(const ElectronLaw& law) {
    const auto* isotropized = std::get_if<IsotropizedAging>(&law.aging);
    const bool aged = !std::holds_alternative<NoAging>(law.aging) &&
                      !(isotropized != nullptr && isotropized->edge == CutoffShape::Exponential);
    const bool falls_anyway = law.cutoff || (law.energy_break && law.energy_break->step > 0.001);
    return {aged && !falls_anyway ? 1.001 : 1.0, 7.0};
}

double microwave_field_ug(double redshift) {
    return 3.25 * (1 + redshift) * (1 + redshift);
}

double isotropized_loss_rate(double field_uG, double redshift) {
    const double microwave = microwave_field_ug(redshift);
    return 2.0 / 3 * loss_constant() * (field_uG * field_uG + microwave * microwave);
}

double fixed_pitch_loss_rate(double field_uG, double sine, double redshift) {
    const double microwave = microwave_field_ug(redshift);
    const double across = field_uG * sine;
    return loss_constant() * (across * across + 2.0 / 3 * microwave * microwave);
}

double loss_rate(const ElectronLaw& law) {
    return std::holds_alternative<FixedPitchAging>(law.aging)
               ? fixed_pitch_loss_rate(law.field_uG, 1, law.redshift)
               : isotropized_loss_rate(law.field_uG, law.redshift);
}

Frequency break_frequency(double field_uG, double redshift, double age_Myr) {
    FOREGLOW_EXPECTS(age_Myr > 0);
    return critical_frequency(1 / (isotropized_loss_rate(field_uG, redshift) * age_Myr), field_uG);
}

double break_age(double field_uG, double redshift, Frequency emitted_break) {
    return 1 / (isotropized_loss_rate(field_uG, redshift) * energy_radiating_at(emitted_break, field_uG));
}

}  // namespace foreglow
