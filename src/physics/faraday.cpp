// SPDX-License-Identifier: GPL-2.0-or-later
#include "physics/faraday.h"

#include <cmath>

#include "base/constants.h"

namespace foreglow {

double lambda_squared(Frequency frequency) {
    const double lambda = constants::speed_of_light / frequency.hz();
    return lambda * lambda;
}

double rotation_measure(double density_cm3, double field_uG, double length_pc) {
    using namespace constants;
    constexpr double parsec = 3.0856775814913673e16;  // m, IAU 2015 B2
    constexpr double per_cm3 = 1e6;
    constexpr double microgauss = 1e-10;  // T
    const double e3 = elementary_charge * elementary_charge * elementary_charge;
    const double c3 = speed_of_light * speed_of_light * speed_of_light;
    const double k = e3 / (8 * pi * pi * vacuum_permittivity * electron_mass * electron_mass * c3);
    return k * (density_cm3 * per_cm3) * (field_uG * microgauss) * (length_pc * parsec);
}

std::complex<double> screen_factor(double depth, double lambda2) {
    const double turn = 2 * depth * lambda2;
    return {std::cos(turn), std::sin(turn)};
}

double screen_dispersion(double sigma, double lambda2) {
    return std::exp(-2 * sigma * sigma * lambda2 * lambda2);
}

std::complex<double> slab_factor(double depth, double sigma, double lambda2) {
    const std::complex<double> s(2 * sigma * sigma * lambda2 * lambda2, -2 * depth * lambda2);
    if (std::abs(s) < 0.5) {  // where 1 - exp(-s) would lose digits: 1 - s/2! + s^2/3! - ...
        std::complex<double> sum = 1;
        std::complex<double> term = 1;
        for (int n = 2; n < 18; ++n) {
            term *= -s / static_cast<double>(n);
            sum += term;
        }
        return sum;
    }
    return (1.0 - std::exp(-s)) / s;
}

std::complex<double> faraday_factor(FaradayEmission emission, double depth, double sigma, double lambda2) {
    if (emission == FaradayEmission::Mixed) return slab_factor(depth, sigma, lambda2);
    return screen_dispersion(sigma, lambda2) * screen_factor(depth, lambda2);
}

std::complex<double> band_factor(const BandSum& band, FaradayEmission emission, double depth, double sigma) {
    std::complex<double> sum = 0;
    double total = 0;
    for (std::size_t i = 0; i < band.hz.size(); ++i) {
        sum += band.weights[i] *
               faraday_factor(emission, depth, sigma, lambda_squared(Frequency::from_hz(band.hz[i])));
        total += band.weights[i];
    }
    return sum / total;
}

}  // namespace foreglow
