// SPDX-License-Identifier: GPL-2.0-or-later
#include "physics/synchrotron_kernel.h"

#include <cmath>

#include "base/constants.h"
#include "base/error.h"
#include "physics/synchrotron_kernel_tables.h"

namespace foreglow {
namespace {

using synchrotron_tables::Table;

constexpr std::size_t series_terms = 12;  // (x/2)^24/(12!)^2 < 1e-24 at x = 1, the series' last

double polynomial(const std::array<double, series_terms>& c, double x) {
    double sum = 0;
    for (std::size_t k = series_terms; k-- > 0;)
        sum = sum * x + c[k];
    return sum;
}

// The coefficients of (x/2)^2k in I_nu (x/2)^-nu: 1/(k! Gamma(k + nu + 1)) (Abramowitz & Stegun
// 1964, 9.6.10).
std::array<double, series_terms> bessel_coefficients(double nu) {
    std::array<double, series_terms> c{};
    c[0] = 1 / std::tgamma(nu + 1);
    for (std::size_t k = 1; k < series_terms; ++k)
        c[k] = c[k - 1] / (static_cast<double>(k) * (static_cast<double>(k) + nu));
    return c;
}

/// K_nu = (pi/2)/sin(nu pi) (I_-nu - I_nu) for 0 < x <= 1, nu no integer (Abramowitz & Stegun 1964, 9.6.2).
class SmallBesselK {
  public:
    explicit SmallBesselK(double nu)
        : nu_(nu),
          scale_(0.5 * constants::pi / std::sin(nu * constants::pi)),
          minus_(bessel_coefficients(-nu)),
          plus_(bessel_coefficients(nu)) {}
    [[nodiscard]] double operator()(double x) const {
        const double power = std::pow(0.5 * x, nu_);
        const double q = 0.25 * x * x;
        return scale_ * (polynomial(minus_, q) / power - polynomial(plus_, q) * power);
    }

  private:
    double nu_, scale_;
    std::array<double, series_terms> minus_, plus_;
};

double small_bessel_k(int thirds, double x) {
    static const std::array<SmallBesselK, 4> functions{SmallBesselK(1.0 / 3), SmallBesselK(2.0 / 3),
                                                       SmallBesselK(4.0 / 3), SmallBesselK(5.0 / 3)};
    return functions[static_cast<std::size_t>(thirds > 2 ? thirds - 2 : thirds - 1)](x);
}

// The integral of the two series for K_5/3 term by term; at infinity only -pi/sqrt(3) is left of them.
double kernel_f_small(double x) {
    constexpr double nu = 5.0 / 3.0;
    const auto integrated = [](double order) {
        auto c = bessel_coefficients(order);
        for (std::size_t k = 0; k < series_terms; ++k)
            c[k] *= 2 / (2 * static_cast<double>(k) + order + 1);
        return c;
    };
    static const std::array<double, series_terms> minus = integrated(-nu);
    static const std::array<double, series_terms> plus = integrated(nu);
    const double q = 0.25 * x * x;
    const double cube_root = std::cbrt(0.5 * x);
    const double square = cube_root * cube_root;  // (x/2)^(1 - nu) is its inverse
    return x * constants::pi / std::sqrt(3.0) *
           (polynomial(minus, q) / square - polynomial(plus, q) * q * square - 1);
}

// Sums residues of the Mellin transform 2^(s-1) sqrt(pi)/2 Gamma(s/2+3/2) Gamma(s/2+5/6) Gamma(s/2+1/6)/
// Gamma(s/2+2), which is that of G (Rybicki & Lightman 1979, eq. 6.35b) times the angles' mean of sin^(s+2).
double kernel_r_polarized_small(double x) {
    const auto residues = [](double pole, double other, double another) {
        std::array<double, series_terms> c{};
        double sign_over_factorial = 0.5 * std::sqrt(constants::pi);
        for (std::size_t k = 0; k < series_terms; ++k) {
            const double half_s = -pole - static_cast<double>(k);
            c[k] = sign_over_factorial * std::tgamma(half_s + other) * std::tgamma(half_s + another) /
                   std::tgamma(half_s + 2);
            sign_over_factorial /= -(static_cast<double>(k) + 1.0);
        }
        return c;
    };
    static const auto third = residues(1.0 / 6, 1.5, 5.0 / 6);
    static const auto five_thirds = residues(5.0 / 6, 1.5, 1.0 / 6);
    static const auto cube = residues(1.5, 5.0 / 6, 1.0 / 6);
    const double half = 0.5 * x;
    const double q = half * half;
    const double root = std::cbrt(half);
    return root * polynomial(third, q) + root * root * half * polynomial(five_thirds, q) +
           q * half * polynomial(cube, q);
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
    return {small_bessel_k(4, y), small_bessel_k(1, y)};
}

double scaled_bessel_53(double x) {
    return x <= 1 ? small_bessel_k(5, x) * std::exp(x)
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
    return x <= 1 ? x * small_bessel_k(2, x) * std::exp(x)
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
