// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/galaxy_loops.h"

#include <algorithm>
#include <cmath>

#include "base/constants.h"
#include "physics/synchrotron_kernel.h"

namespace foreglow {
namespace {

constexpr double degree = constants::pi / 180;
constexpr double reference_hz = 408e6;
constexpr double tangled_share = 1.0 / 3;  // of the shell's field energy against the uniform one
constexpr double field_longitude = 80;     // deg, of the local field

double dot(const Vector3& a, const Vector3& b) {
    return a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
}

Vector3 direction_of(double lon, double lat) {
    return {std::cos(lat) * std::cos(lon), std::cos(lat) * std::sin(lon), std::sin(lat)};
}

double root_of(double x) {
    return x > 0 ? std::sqrt(x) : 0.0;
}

}  // namespace

LoopLight loop_light(const GalaxyLoop& loop, const GalaxyRay& ray) {
    const Vector3& n = ray.direction;
    const double lon = loop.longitude * degree;
    const double lat = loop.latitude * degree;
    const Vector3 centre = direction_of(lon, lat);
    const double cosine = dot(n, centre);
    const double radius = loop.distance * std::sin(0.5 * loop.diameter * degree);
    const double inner = radius * (1 - loop.thickness);
    const double miss2 = loop.distance * loop.distance * (1 - cosine * cosine);
    if (cosine <= 0 || miss2 >= radius * radius) return {};
    const double half_outer = root_of(radius * radius - miss2);
    const double half_inner = root_of(inner * inner - miss2);
    const double longest = root_of(radius * radius - inner * inner);
    const Vector3 north = {-std::sin(lat) * std::cos(lon), -std::sin(lat) * std::sin(lon), std::cos(lat)};
    const Vector3 east = {-std::sin(lon), std::cos(lon), 0};
    const double side = std::atan2(dot(east, n), dot(north, n)) - loop.bright_angle * degree;
    const double bright =
        loop.faint_side + (1 - loop.faint_side) * std::pow(0.5 * (1 + std::cos(side)), loop.contrast);
    LoopLight light;
    light.brightness = loop.brightness * (half_outer - half_inner) / longest * bright;
    const Vector3 ambient = direction_of(field_longitude * degree, 0);
    for (const double sign : {-1.0, 1.0}) {
        const double distance = loop.distance * cosine + sign * 0.5 * (half_outer + half_inner);
        Vector3 radial{};
        for (std::size_t i = 0; i < 3; ++i)
            radial[i] = distance * n[i] - loop.distance * centre[i];
        const double along = dot(ambient, radial) / dot(radial, radial);
        Vector3 field{};
        for (std::size_t i = 0; i < 3; ++i)
            field[i] = ambient[i] - along * radial[i];
        const double south = dot(field, ray.south);
        const double towards_east = dot(field, ray.east);
        const double share = 0.5 / (south * south + towards_east * towards_east + tangled_share);
        light.q_share -= share * (south * south - towards_east * towards_east);
        light.u_share -= share * 2 * south * towards_east;
    }
    return light;
}

LoopSpectra::LoopSpectra(const GalaxySpec& galaxy, const GalaxyTable& table,
                         std::span<const Frequency> frequencies) {
    for (const GalaxyLoop& loop : galaxy.shells) {
        const auto log_a = [&](double hz) {
            return std::log(hz / (critical_frequency_constant_hz() * loop.field));
        };
        std::vector<double> ratios, fractions;
        for (const Frequency frequency : frequencies) {
            const double a = log_a(frequency.hz());
            const double scale = reference_hz / frequency.hz();
            ratios.push_back(std::exp(table.log_old(a, 0) - table.log_old(log_a(reference_hz), 0)) * scale *
                             scale);
            const double s = 1 - 2 * table.slope_old(a, 0);
            fractions.push_back((s + 1) / (s + 7.0 / 3));
        }
        ratio.push_back(std::move(ratios));
        fraction.push_back(std::move(fractions));
    }
}

}  // namespace foreglow
