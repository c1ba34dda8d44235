// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <optional>
#include <variant>

#include "base/quantity.h"

namespace foreglow {

/// How the field lies: across the line of sight, every electron radiating at sin(a) = 1; or in all
/// directions, averaged over isotropic pitch angles, which leaves no net polarization.
enum class FieldGeometry { Ordered, Tangled };

/// How a spectrum ends: N ~ exp(-E/E_c), or nothing above E_c.
enum class CutoffShape { Exponential, Sharp };

/// The slope rises by `step` above the energy, sharply.
struct EnergyBreak {
    double energy_GeV = 0;
    double step = 1;
};

struct EnergyCutoff {
    double energy_GeV = 0;
    CutoffShape shape = CutoffShape::Exponential;
};

// Ageing acts on the whole injected law N0 through the losses dE/dt = -b E^2: an electron of injected energy
// E0 has E = E0/(1 + b E0 t), so that N(E, t) = N0(E/y) y^-2 with y = 1 - b E t (Kardashev 1962; Pacholczyk
// 1970, ch. 6).

struct NoAging {};
/// Injection at a constant rate over the age: the mean of N(E, t') over 0 < t' < t (Pacholczyk 1970).
struct ContinuousInjection {
    double age_Myr = 0;
};
/// One injection; pitch angles keep being mixed, b = (2/3) c2 (B^2 + B_IC^2) (Jaffe & Perola 1973). With
/// edge = Exponential the losses end the spectrum as exp(-b E t) instead.
struct IsotropizedAging {
    double age_Myr = 0;
    CutoffShape edge = CutoffShape::Sharp;
};
/// One injection; each electron keeps its pitch angle a, b = c2 (B^2 sin^2(a) + (2/3) B_IC^2) (Kardashev
/// 1962; Pacholczyk 1970).
struct FixedPitchAging {
    double age_Myr = 0;
};
using Aging = std::variant<NoAging, ContinuousInjection, IsotropizedAging, FixedPitchAging>;

/// An electron distribution but for its slope s, which is that of N(E) ~ E^-s below break and cut-off:
/// injected N0 = E^-s (E/E_b)^-step above E_b, times the cut-off, then aged.
struct ElectronLaw {
    double field_uG = 5;  ///< across the line of sight (ordered) or total (tangled)
    FieldGeometry geometry = FieldGeometry::Ordered;
    std::optional<EnergyBreak> energy_break;
    std::optional<EnergyCutoff> cutoff;
    Aging aging;
    double redshift = 0;  ///< frequencies are observed ones: the electrons radiate at (1 + z) nu
};

/// The slopes that a law may take: 1 to 7; from 1.001 on where an aged spectrum without cut-off would hold
/// infinitely many electrons at its edge.
struct SlopeLimits {
    double low = 1, high = 7;
};
[[nodiscard]] SlopeLimits slope_limits(const ElectronLaw& law);

/// Returns B_IC = 3.25 (1 + z)^2 uG, the field as strong as the microwave background (by definition here; T0
/// = 2.7255 K gives 3.239).
[[nodiscard]] double microwave_field_ug(double redshift);

/// Returns b of dE/dt = -b E^2 with mixed pitch angles: (2/3) c2 (B^2 + B_IC^2), c2 = 2 e^4/(3 m^4 c^7) [cgs]
/// = 0.119714453 GeV^-1 Gyr^-1 uG^-2 (Pacholczyk 1970).
/// @return GeV^-1 Myr^-1
[[nodiscard]] double isotropized_loss_rate(double field_uG, double redshift);
/// Returns b at one pitch angle: c2 (B^2 sin^2(a) + (2/3) B_IC^2) [GeV^-1 Myr^-1].
[[nodiscard]] double fixed_pitch_loss_rate(double field_uG, double sine, double redshift);
/// Returns the b that this law's electrons lose by; where it depends on the pitch angle, at sin(a) = 1.
[[nodiscard]] double loss_rate(const ElectronLaw& law);

/// Returns nu_b = c1 B E_T^2 with E_T = 1/(b t), mixed pitch angles and sin(a) = 1, as emitted (divide by 1 +
/// z for the observed one). Common practice writes t = 1590 sqrt(B)/((B^2 + B_IC^2) sqrt(nu_b)) Myr, uG and
/// GHz.
[[nodiscard]] Frequency break_frequency(double field_uG, double redshift, double age_Myr);
/// Returns the age [Myr] of that break.
[[nodiscard]] double break_age(double field_uG, double redshift, Frequency emitted_break);

}  // namespace foreglow
