// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/galaxy_pixels.h"

#include <algorithm>
#include <cmath>

#include "base/constants.h"

namespace foreglow {
namespace {

constexpr double degree = constants::pi / 180;
constexpr double near_plane = 5 * degree;
constexpr double thin_plane = 2 * degree;  // where the young disc is
constexpr int fine_nside = 128;
constexpr int most_parts = 8;  // along a pixel's side
constexpr double reference_hz = 408e6;

double latitude_of(const Vector3& n) {
    return std::asin(std::clamp(n[2], -1.0, 1.0));
}

void add(GalaxySightline& sum, const GalaxySightline& line, double weight) {
    for (std::size_t k = 0; k < sum.i.size(); ++k)
        sum.i[k] += weight * line.i[k];
    for (std::size_t k = 0; k < sum.q.size(); ++k) {
        sum.q[k] += weight * line.q[k];
        sum.u[k] += weight * line.u[k];
    }
    sum.depth += weight * line.depth;
    sum.dispersion += weight * line.dispersion;
    sum.emitting_length += weight * line.emitting_length;
    sum.random_share += weight * line.random_share;
    sum.largest_depth = std::max(sum.largest_depth, line.largest_depth);
}

}  // namespace

GalaxyPixels::GalaxyPixels(const GalaxySpec& galaxy, const GalaxyTable& table, const TurbulenceFields& fields,
                           const HealpixGrid& grid, bool polarized, std::span<const Frequency> frequencies)
    : galaxy_(galaxy),
      frequencies_(frequencies.begin(), frequencies.end()),
      integral_(galaxy, table, frequencies),
      spectra_(galaxy, table, frequencies),
      fields_(fields),
      grid_(grid),
      polarized_(polarized) {}

GalaxySightline GalaxyPixels::pixel(std::int64_t number, std::size_t place,
                                    const GalaxySampling& sampling) const {
    const Vector3 direction = grid_.direction(number);
    GalaxySightline line;
    if (galaxy_.disc) {
        line = mean_line(number, direction, sampling);
        add_turbulence(line, place);
    } else {
        line.i.assign(frequencies_.size(), 0.0);
        if (polarized_) line.q = line.u = line.i;
    }
    if (galaxy_.loops) add_loops(line, direction);
    tilt(line, place);
    return line;
}

GalaxySightline GalaxyPixels::line_of(const Vector3& direction, const GalaxySampling& sampling) const {
    const bool is_near = std::abs(latitude_of(direction)) < near_plane;
    return integral_.sightline(direction, is_near ? sampling.steps_near_plane : sampling.steps_elsewhere,
                               polarized_);
}

GalaxySightline GalaxyPixels::mean_line(std::int64_t number, const Vector3& direction,
                                        const GalaxySampling& sampling) const {
    const double reach = thin_plane + 0.5 * std::sqrt(grid_.pixel_area());
    if (grid_.nside() >= fine_nside || std::abs(latitude_of(direction)) > reach)
        return line_of(direction, sampling);
    const std::int64_t ratio = std::min(fine_nside / grid_.nside(), most_parts);
    const HealpixGrid fine(static_cast<int>(ratio) * grid_.nside());
    const std::int64_t children = ratio * ratio;
    const std::int64_t first = grid_.ring_to_nested(number) * children;
    GalaxySightline mean;
    mean.i.assign(frequencies_.size(), 0.0);
    if (polarized_) mean.q = mean.u = mean.i;
    for (std::int64_t c = 0; c < children; ++c)
        add(mean, line_of(fine.direction(fine.nested_to_ring(first + c)), sampling),
            1 / static_cast<double>(children));
    return mean;
}

void GalaxyPixels::add_turbulence(GalaxySightline& line, std::size_t p) const {
    if (fields_.brightness.empty()) return;
    const TurbulencePixel turbulence =
        turbulence_of(galaxy_, line, fields_.brightness[p], polarized_ ? fields_.q[p] : 0.0,
                      polarized_ ? fields_.u[p] : 0.0);
    for (std::size_t k = 0; k < line.i.size(); ++k) {
        line.i[k] *= turbulence.factor;
        if (!polarized_) continue;
        const double lambda = constants::speed_of_light / frequencies_[k].hz();
        const double left = std::exp(-0.5 * line.dispersion * lambda * lambda * lambda * lambda);
        line.q[k] = line.q[k] * turbulence.factor + line.i[k] * left * turbulence.q;
        line.u[k] = line.u[k] * turbulence.factor + line.i[k] * left * turbulence.u;
    }
}

void GalaxyPixels::add_loops(GalaxySightline& line, const Vector3& direction) const {
    const GalaxyRay ray(galaxy_, direction);
    for (std::size_t l = 0; l < galaxy_.shells.size(); ++l) {
        const LoopLight light = loop_light(galaxy_.shells[l], ray);
        if (light.brightness == 0) continue;
        for (std::size_t k = 0; k < line.i.size(); ++k) {
            const double brightness = light.brightness * spectra_.ratio[l][k];
            line.i[k] += brightness;
            if (!polarized_) continue;
            line.q[k] += brightness * spectra_.fraction[l][k] * light.q_share;
            line.u[k] += brightness * spectra_.fraction[l][k] * light.u_share;
        }
    }
}

void GalaxyPixels::tilt(GalaxySightline& line, std::size_t p) const {
    if (fields_.index.empty()) return;
    for (std::size_t k = 0; k < line.i.size(); ++k) {
        const double factor = std::exp(galaxy_.index_scatter * fields_.index[p] *
                                       std::log(frequencies_[k].hz() / reference_hz));
        line.i[k] *= factor;
        if (!polarized_) continue;
        line.q[k] *= factor;
        line.u[k] *= factor;
    }
}

}  // namespace foreglow
