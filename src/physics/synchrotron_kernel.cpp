// SPDX-License-Identifier: GPL-2.0-or-later
#include "physics/synchrotron_kernel.h"

#include <cmath>

#include "base/constants.h"
#include "base/error.h"
#include "physics/synchrotron_kernel_tables.h"

namespace foreglow {
namespace {

using synchrotron_tables::Table;

constexpr int series_terms = 12;  // (x/2)^24/(12!)^2 < 1e-24 at x = 1, the series' last

// sum over k of (x/2)^2k/(k! Gamma(k + nu + 1)), times Gamma(nu + 1); `divisor` shifts an antiderivative's
// 1/(2k + d).
double bessel_sum(double nu, double quarter_square, double divisor = 0) {
    double term = 1;
    double sum = divisor == 0 ? 1 : 1 / divisor;
    for (int k = 1; k < series_terms; ++k) {
        term *= quarter_square / (k * (k + nu));
        sum += divisor == 0 ? term : term / (2 * k + divisor);
    }
    return sum;
}

// K_nu = (pi/2)/sin(nu pi) (I_-nu - I_nu) for 0 < x <= 1, nu no integer (Abramowitz & Stegun 1964, 9.6.2).
double bessel_k_small(double nu, double x) {
    const double q = 0.25 * x * x;
    const double power = std::pow(0.5 * x, nu);
    const double scale = 0.5 * constants::pi / std::sin(nu * constants::pi);
    return scale * (bessel_sum(-nu, q) / (power * std::tgamma(1 - nu)) -
                    bessel_sum(nu, q) * power / std::tgamma(1 + nu));
}

// The integral of the two series for K_5/3 term by term; at infinity only -pi/sqrt(3) is left of them.
double kernel_f_small(double x) {
    const double nu = 5.0 / 3.0;
    const double q = 0.25 * x * x;
    const double half = 0.5 * x;
    const double minus = 2 * std::pow(half, 1 - nu) / std::tgamma(1 - nu) * bessel_sum(-nu, q, 1 - nu);
    const double plus = 2 * std::pow(half, 1 + nu) / std::tgamma(1 + nu) * bessel_sum(nu, q, 1 + nu);
    return x * constants::pi / std::sqrt(3.0) * (minus - plus - 1);
}

// Sums residues of the Mellin transform 2^(s-1) sqrt(pi)/2 Gamma(s/2+3/2) Gamma(s/2+5/6) Gamma(s/2+1/6)/
// Gamma(s/2+2), which is that of G (Rybicki & Lightman 1979, eq. 6.35b) times the angles' mean of sin^(s+2).
double kernel_r_polarized_small(double x) {
    const auto residues = [x](double pole, double other, double another) {
        double sum = 0;
        double sign_over_factorial = 1;
        for (int k = 0; k < series_terms; ++k) {
            const double half_s = -pole - k;
            sum += sign_over_factorial * std::tgamma(half_s + other) * std::tgamma(half_s + another) /
                   std::tgamma(half_s + 2) * std::pow(0.5 * x, -2 * half_s);
            sign_over_factorial /= -(k + 1.0);
        }
        return sum;
    };
    const double sum =
        residues(1.0 / 6, 1.5, 5.0 / 6) + residues(5.0 / 6, 1.5, 1.0 / 6) + residues(1.5, 5.0 / 6, 1.0 / 6);
    return 0.5 * std::sqrt(constants::pi) * sum;
}

// Clenshaw's sum of the tabulated e^x f(x) x^-p for x >= 1.
double table_value(const Table& table, double x) {
    const double u = 1 / x;
    constexpr std::array<double, 4> ends{0, 1.0 / 16, 0.25, 1};
    const std::size_t piece = u > ends[2] ? 2 : u > ends[1] ? 1 : 0;
    const double t = (2 * u - ends[piece] - ends[piece + 1]) / (ends[piece + 1] - ends[piece]);
    const auto& c = table.pieces[piece];
    double a = 0;
    double b = 0;
    for (int k = table.terms[piece] - 1; k > 0; --k) {
        const double next = 2 * t * a - b + c[static_cast<std::size_t>(k)];
        b = a;
        a = next;
    }
    return t * a - b + c[0];
}

struct BesselPair {
    double four_thirds = 0, one_third = 0;
};
BesselPair small_pair(double y) {
    return {bessel_k_small(4.0 / 3, y), bessel_k_small(1.0 / 3, y)};
}

double scaled_bessel_53(double x) {
    return x <= 1 ? bessel_k_small(5.0 / 3, x) * std::exp(x)
                  : table_value(synchrotron_tables::bessel_53, x) / std::sqrt(x);
}

// At and beyond the ends 0, infinity and NaN no formula is asked.
double fall(double x, double (*scaled)(double)) {
    FOREGLOW_EXPECTS(!(x < 0));
    if (std::isnan(x)) return x;
    return x > 0 && x < 750 ? scaled(x) * std::exp(-x) : 0;
}
KernelDerivatives fall(double x, KernelDerivatives (*scaled)(double)) {
    FOREGLOW_EXPECTS(!(x < 0));
    if (std::isnan(x)) return {x, x, x};
    if (!(x > 0 && x < 750)) return {};
    const KernelDerivatives d = scaled(x);
    const double e = std::exp(-x);
    return {d.value * e, d.first * e, d.second * e};
}

}  // namespace

double scaled_kernel_f(double x) {
    return x <= 1 ? kernel_f_small(x) * std::exp(x)
                  : table_value(synchrotron_tables::kernel_f, x) * std::sqrt(x);
}

double scaled_kernel_g(double x) {
    return x <= 1 ? x * bessel_k_small(2.0 / 3, x) * std::exp(x)
                  : table_value(synchrotron_tables::kernel_g, x) * std::sqrt(x);
}

double scaled_kernel_r(double x) {
    if (x > 1) return table_value(synchrotron_tables::kernel_r, x);
    const double y = 0.5 * x;
    const auto [a, b] = small_pair(y);
    return 2 * y * y * (a * b - 0.6 * y * (a * a - b * b)) * std::exp(x);
}

double scaled_kernel_r_polarized(double x) {
    return x <= 1 ? kernel_r_polarized_small(x) * std::exp(x)
                  : table_value(synchrotron_tables::polarized_r, x);
}

// With D = x d/dx: D F = F - x^2 K_5/3, D(x^2 K_5/3) = x^2 K_5/3/3 - x^2 G (recurrence of K_nu, A&S 9.6.26).
KernelDerivatives scaled_kernel_f_derivatives(double x) {
    const double f = scaled_kernel_f(x);
    const double k = x * x * scaled_bessel_53(x);
    return {f, f - k, f - 4.0 / 3 * k + x * x * scaled_kernel_g(x)};
}

KernelDerivatives scaled_kernel_g_derivatives(double x) {
    const double g = scaled_kernel_g(x);
    const double k = x * x * scaled_bessel_53(x);
    return {g, 5.0 / 3 * g - k, 25.0 / 9 * g - 2 * k + x * x * g};
}

// S = 2 y^2 K_4/3 K_1/3 and V = 2 y^3 (K_4/3^2 + K_1/3^2): D R = 2 R - S, D S = S - V.
KernelDerivatives scaled_kernel_r_derivatives(double x) {
    const double r = scaled_kernel_r(x);
    double s = 0;
    double v = 0;
    if (x > 1) {
        s = table_value(synchrotron_tables::product, x) * x;
        v = table_value(synchrotron_tables::squares, x) * x * x;
    } else {
        const double y = 0.5 * x;
        const double e = std::exp(x);
        const auto [a, b] = small_pair(y);
        s = 2 * y * y * a * b * e;
        v = 2 * y * y * y * (a * a + b * b) * e;
    }
    return {r, 2 * r - s, 4 * r - 3 * s + v};
}

double kernel_f(double x) {
    return fall(x, scaled_kernel_f);
}
double kernel_g(double x) {
    return fall(x, scaled_kernel_g);
}
double kernel_r(double x) {
    return fall(x, scaled_kernel_r);
}
double kernel_r_polarized(double x) {
    return fall(x, scaled_kernel_r_polarized);
}
KernelDerivatives kernel_f_derivatives(double x) {
    return fall(x, scaled_kernel_f_derivatives);
}
KernelDerivatives kernel_g_derivatives(double x) {
    return fall(x, scaled_kernel_g_derivatives);
}
KernelDerivatives kernel_r_derivatives(double x) {
    return fall(x, scaled_kernel_r_derivatives);
}

double critical_frequency_constant_hz() {
    using namespace constants;
    const double tesla = 1e-10;                    // of one microgauss
    const double joule = 1e9 * elementary_charge;  // of one GeV
    const double rest = electron_mass * speed_of_light * speed_of_light;
    const double gamma = joule / rest;
    return 3 / (4 * pi) * elementary_charge * tesla / electron_mass * gamma * gamma;
}

Frequency critical_frequency(double energy_GeV, double field_uG) {
    return Frequency::from_hz(critical_frequency_constant_hz() * field_uG * energy_GeV * energy_GeV);
}

double energy_radiating_at(Frequency frequency, double field_uG) {
    FOREGLOW_EXPECTS(field_uG > 0);
    return std::sqrt(frequency.hz() / (critical_frequency_constant_hz() * field_uG));
}

double power_per_hz_and_microgauss() {
    using namespace constants;
    const double e3 = elementary_charge * elementary_charge * elementary_charge;
    return std::sqrt(3.0) * e3 * 1e-10 / (4 * pi * vacuum_permittivity * electron_mass * speed_of_light);
}

}  // namespace foreglow
