// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/galaxy_turbulence.h"

#include <algorithm>
#include <cmath>

#include "base/constants.h"
#include "base/random.h"
#include "model/strip_points.h"
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

TurbulenceWaves::TurbulenceWaves(const GalaxySpec& galaxy, const HealpixGrid& grid, bool polarized)
    : grid_(grid) {
    const int lmax = 2 * grid.nside();
    const auto draw = [&](Field field, double power, double variance) {
        return make_gaussian_alm(make_spectrum(lmax, power, variance), lmax, {galaxy.seed, 0, field});
    };
    if (galaxy.turbulence && galaxy.disc) {
        brightness_ = draw(BrightnessField, kolmogorov, 1);
        // q and u have unit variance each: E and B together have 2.
        if (polarized) stokes_ = AlmEB{draw(EField, kolmogorov, 4.0 / 3), draw(BField, kolmogorov, 2.0 / 3)};
    }
    if (galaxy.index_scatter > 0) index_ = draw(IndexField, index_power, 1);
}

TurbulenceFields TurbulenceWaves::everywhere() const {
    TurbulenceFields fields;
    if (brightness_) fields.brightness = synthesize(*brightness_, grid_);
    if (index_) fields.index = synthesize(*index_, grid_);
    if (!stokes_) return fields;
    StokesValues stokes = synthesize_spin2(*stokes_, grid_);
    fields.q = std::move(stokes.q);
    fields.u = std::move(stokes.u);
    return fields;
}

TurbulenceFields TurbulenceWaves::at(std::span<const std::int64_t> pixels) const {
    TurbulenceFields fields;
    fields.brightness.resize(brightness_ ? pixels.size() : 0);
    fields.index.resize(index_ ? pixels.size() : 0);
    fields.q.resize(stokes_ ? pixels.size() : 0);
    fields.u.resize(fields.q.size());
    for (const RingPlaces& group : sort_by_ring(grid_, pixels)) {
        const HealpixGrid::Ring ring = grid_.ring(group.ring);
        const RingStrip strip{group.ring, 1, false};
        std::vector<double> values(static_cast<std::size_t>(ring.pixels)), others(values.size());
        const auto pick = [&](const std::vector<double>& from, std::vector<double>& to) {
            for (const std::size_t place : group.places)
                to[place] = from[static_cast<std::size_t>(pixels[place] - ring.first_pixel)];
        };
        if (brightness_) {
            synthesize_strip(*brightness_, grid_, strip, values);
            pick(values, fields.brightness);
        }
        if (index_) {
            synthesize_strip(*index_, grid_, strip, values);
            pick(values, fields.index);
        }
        if (!stokes_) continue;
        synthesize_strip_spin2(*stokes_, grid_, strip, values, others);
        pick(values, fields.q);
        pick(others, fields.u);
    }
    return fields;
}

TurbulenceFields make_turbulence_fields(const GalaxySpec& galaxy, const HealpixGrid& grid, bool polarized) {
    return TurbulenceWaves(galaxy, grid, polarized).everywhere();
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
