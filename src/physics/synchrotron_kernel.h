// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include "base/quantity.h"

namespace foreglow {

// The kernels below hold to a relative 1e-12 for 1e-12 < x < 700 and go on to their limits outside: x^(1/3)
// towards 0 (0 at 0), exp(-x) until it underflows to 0. x must not be negative; NaN stays NaN.

/// Returns F(x) = x integral from x to infinity of K_5/3, the spectrum of one electron in units of sqrt(3)
/// e^3 B sin(a)/(4 pi eps0 m c), at x = nu/nu_c (Rybicki & Lightman 1979, eq. 6.31c).
///
/// Limits: 2^(2/3) Gamma(2/3) x^(1/3) and sqrt(pi x/2) exp(-x).
[[nodiscard]] double kernel_f(double x);

/// Returns G(x) = x K_2/3(x): P_perp - P_par in the units of F (Rybicki & Lightman 1979, eq. 6.31d).
[[nodiscard]] double kernel_g(double x);

/// Returns R(x) = 1/2 integral of sin^2(a) F(x/sin a) da, the mean of sin(a) F over isotropic pitch angles.
///
/// R = 2 y^2 [K_4/3 K_1/3 - (3/5) y (K_4/3^2 - K_1/3^2)] at y = x/2 (Crusius & Schlickeiser 1986; closed form
/// as in Ghisellini, Guilbert & Svensson 1988).
[[nodiscard]] double kernel_r(double x);

/// Returns the same mean of sin(a) G: what would be polarized if all field directions were turned into one.
[[nodiscard]] double kernel_r_polarized(double x);

/// A kernel with its derivatives in ln x.
struct KernelDerivatives {
    double value = 0;
    double first = 0;   ///< x dK/dx
    double second = 0;  ///< (x d/dx)^2 K
};

/// Return the kernels with derivatives; d ln K/d ln x is first/value. For F it is 1 - x^2 K_5/3/F.
[[nodiscard]] KernelDerivatives kernel_f_derivatives(double x);
[[nodiscard]] KernelDerivatives kernel_g_derivatives(double x);
[[nodiscard]] KernelDerivatives kernel_r_derivatives(double x);

/// Return e^x times a kernel (or its derivatives), which do not underflow; 0 < x < infinity.
[[nodiscard]] double scaled_kernel_f(double x);
[[nodiscard]] double scaled_kernel_g(double x);
[[nodiscard]] double scaled_kernel_r(double x);
[[nodiscard]] double scaled_kernel_r_polarized(double x);
[[nodiscard]] KernelDerivatives scaled_kernel_f_derivatives(double x);
[[nodiscard]] KernelDerivatives scaled_kernel_g_derivatives(double x);
[[nodiscard]] KernelDerivatives scaled_kernel_r_derivatives(double x);

// Energies are total energies [GeV] of ultra-relativistic electrons, E = gamma m c^2; fields are in
// microgauss.

/// Returns c1 = 3 e/(4 pi m^3 c^5) = 16.0802491... MHz uG^-1 GeV^-2.
[[nodiscard]] double critical_frequency_constant_hz();

/// Returns nu_c = c1 B_perp E^2, the critical frequency (Rybicki & Lightman 1979, eq. 6.17c).
/// @param field_uG  B sin(a), the component across the electron's motion
[[nodiscard]] Frequency critical_frequency(double energy_GeV, double field_uG);

/// Returns the energy [GeV] of the electron whose critical frequency this is.
[[nodiscard]] double energy_radiating_at(Frequency frequency, double field_uG);

/// Returns sqrt(3) e^3/(4 pi eps0 m c) for 1 uG [W/Hz]: one electron radiates this times B sin(a) F(nu/nu_c).
[[nodiscard]] double power_per_hz_and_microgauss();

}  // namespace foreglow
