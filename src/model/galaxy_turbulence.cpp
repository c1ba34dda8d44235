// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/galaxy_turbulence.h"

#include <algorithm>
#include <cmath>

#include "base/constants.h"
#include "base/random.h"
#include "sphere/gaussian_field.h"
#include "sphere/harmonics.h"

namespace foreglow {
namespace {

enum Field : std::uint32_t { BrightnessField = 1, EField = 2, BField = 3, IndexField = 4 };

constexpr double turnover =
    18;  // about pi times the distance of the emission over the turbulence's outer scale
constexpr double kolmogorov = 11.0 / 6;
constexpr double index_power = 1.3;
constexpr int summed = 20000;

// C_l ~ (l^2 + l0^2)^-power from l = 2 on, with the variance of its sum to infinity.
std::vector<double> make_spectrum(int lmax, double power, double variance) {
    const auto shape = [&](double l) { return std::pow(l * l + turnover * turnover, -power); };
    double sum = 0;
    for (int l = 2; l < summed; ++l)
        sum += (2.0 * l + 1) * shape(l);
    const double end = summed;  // beyond it the integral of 2 l (l^2 + l0^2)^-power
    sum += std::pow(end * end + turnover * turnover, 1 - power) / (power - 1);
    std::vector<double> cl(static_cast<std::size_t>(lmax) + 1, 0.0);
    for (std::size_t l = 2; l < cl.size(); ++l)
        cl[l] = variance * 4 * constants::pi / sum * shape(static_cast<double>(l));
    return cl;
}

}  // namespace

TurbulenceFields make_turbulence_fields(const GalaxySpec& galaxy, const HealpixGrid& grid, bool polarized) {
    const int lmax = 2 * grid.nside();
    const auto draw = [&](Field field, double power, double variance) {
        return make_gaussian_alm(make_spectrum(lmax, power, variance), lmax, {galaxy.seed, 0, field});
    };
    TurbulenceFields fields;
    if (galaxy.turbulence && galaxy.disc) {
        fields.brightness = synthesize(draw(BrightnessField, kolmogorov, 1), grid);
        if (polarized) {
            // q and u have unit variance each: E and B together have 2.
            StokesValues stokes = synthesize_spin2(
                {draw(EField, kolmogorov, 4.0 / 3), draw(BField, kolmogorov, 2.0 / 3)}, grid);
            fields.q = std::move(stokes.q);
            fields.u = std::move(stokes.u);
        }
    }
    if (galaxy.index_scatter > 0) fields.index = synthesize(draw(IndexField, index_power, 1), grid);
    return fields;
}

TurbulencePixel turbulence_of(const GalaxySpec& galaxy, const GalaxySightline& line, double g, double q,
                              double u) {
    if (!(line.emitting_length > 0)) return {};
    const double cells = std::sqrt(2 * galaxy.turbulence_length / line.emitting_length);
    const double sigma = std::min(0.6, 0.8 * cells);
    const double polarized = 0.6 * 0.75 * line.random_share * cells;
    return {std::exp(sigma * g - 0.5 * sigma * sigma), polarized * q, polarized * u};
}

}  // namespace foreglow
