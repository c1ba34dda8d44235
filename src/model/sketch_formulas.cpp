// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/sketch_formulas.h"

#include <algorithm>
#include <array>
#include <cmath>

#include "base/constants.h"
#include "sphere/beam.h"

namespace foreglow {
namespace {

constexpr double degree = constants::pi / 180;

struct Loop {
    double lon, lat, diameter;  // deg, Berkhuijsen 1971
    double brightness;          // K_RJ of the ridge at the reference frequency, invented
    double bright_angle;        // deg from north through increasing longitude, invented
};
constexpr std::array<Loop, 4> loops{
    {{329, 17.5, 116, 22, 55}, {100, -32.5, 91, 5, 150}, {124, 15.5, 65, 9, 20}, {315, 48.5, 39.5, 4.5, 20}}};

Vector3 direction_of(double lon, double lat) {
    return {std::cos(lat) * std::cos(lon), std::cos(lat) * std::sin(lon), std::sin(lat)};
}

double dot(const Vector3& a, const Vector3& b) {
    return a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
}

// A ring as wide as 5 % of its radius, brighter towards one side of its centre.
double loop_brightness(const Loop& loop, const Vector3& n) {
    const double lon = loop.lon * degree;
    const double lat = loop.lat * degree;
    const Vector3 centre = direction_of(lon, lat);
    const Vector3 north = {-std::sin(lat) * std::cos(lon), -std::sin(lat) * std::sin(lon), std::cos(lat)};
    const Vector3 east = {-std::sin(lon), std::cos(lon), 0};
    const double radius = 0.5 * loop.diameter * degree;
    const double separation = std::acos(std::clamp(dot(n, centre), -1.0, 1.0));
    const double position_angle = std::atan2(dot(n, east), dot(n, north));
    const double side = 0.5 * (1 + std::cos(position_angle - loop.bright_angle * degree));
    const double width = std::max(0.05 * radius, 1.5 * degree);
    const double offset = (separation - radius) / width;
    return loop.brightness * (0.15 + 0.85 * side * side) * std::exp(-0.5 * offset * offset);
}

// C_l ~ (l^2 + l0^2)^-power from l = 2 on, unit variance when summed to infinity, so that it is the same
// field at every nside.
std::vector<double> unit_spectrum(int lmax, double l0, double power) {
    const BeamWindow finest = make_gaussian_beam(Angle::from_degrees(sketch_finest_scale_deg), 2048);
    std::vector<double> cl(static_cast<std::size_t>(2049));
    double variance = 0;
    for (std::size_t l = 2; l < cl.size(); ++l) {
        const double ell = static_cast<double>(l);
        cl[l] = std::pow(ell * ell + l0 * l0, -power) * finest.temperature[l] * finest.temperature[l];
        variance += (2 * ell + 1) / (4 * constants::pi) * cl[l];
    }
    for (double& c : cl)
        c /= variance;
    cl.resize(std::min(cl.size(), static_cast<std::size_t>(lmax) + 1));
    return cl;
}

}  // namespace

double sketch_brightness(const SketchSpec& sketch, const Vector3& n) {
    const double sine = n[2];
    constexpr double softening = 0.12;  // of sin b, keeps the cosecant finite in the plane
    double t = 0;
    if (sketch.disc) {
        t += sketch.pole_brightness *
             std::sqrt((1 + softening * softening) / (sine * sine + softening * softening));
        const double latitude = std::asin(std::clamp(sine, -1.0, 1.0)) / sketch.plane_height.radians();
        const double towards_centre = 0.5 * (1 + n[0] / std::max(std::hypot(n[0], n[1]), 1e-12));
        const double bulge = std::pow(towards_centre, 4);
        t += sketch.plane_brightness * (1 + 4 * bulge) / std::cosh(latitude);
    }
    if (sketch.loops)
        for (const Loop& loop : loops)
            t += loop_brightness(loop, n);
    return t;
}

int sketch_lmax(const HealpixGrid& grid) {
    return std::min(2048, 2 * grid.nside());
}

Alm make_sketch_alm(const SketchSpec& sketch, const HealpixGrid& grid, SketchField field) {
    const bool is_law = field == SketchField::Index || field == SketchField::Curvature;
    const int lmax = sketch_lmax(grid);
    // l0: structure grows down to about 10 degrees
    const auto cl = unit_spectrum(lmax, 18, is_law ? 1.3 : 11.0 / 6);
    Alm alm = make_gaussian_alm(cl, lmax, {sketch.seed, 0, static_cast<std::uint32_t>(field)});
    if (field == SketchField::B)
        multiply_by_l(alm, std::vector<double>(static_cast<std::size_t>(lmax) + 1, std::sqrt(0.5)));
    return alm;
}

double sketch_intensity(const SketchSpec& sketch, const Vector3& n, double texture) {
    const double rms =
        sketch.texture ? sketch.texture_rms : 0.0;  // without a texture its mean needs no correction
    return sketch_brightness(sketch, n) * std::exp(rms * texture - 0.5 * rms * rms);
}

std::array<double, 2> sketch_stokes(const SketchSpec& sketch, const Vector3& n, double intensity,
                                    double random_q, double random_u) {
    constexpr double highest_fraction = 0.7;  // below the 75 % that no electron distribution exceeds by much
    const double latitude = std::asin(std::clamp(n[2], -1.0, 1.0)) / degree;
    const double fraction =
        sketch.polarized_fraction * (1 - 0.75 * std::exp(-0.5 * latitude * latitude / 36));
    const double q = fraction * (0.8 + 0.5 * random_q);
    const double u = fraction * 0.5 * random_u;
    const double cap = std::min(1.0, highest_fraction / std::max(std::hypot(q, u), 1e-30));
    return {intensity * cap * q, intensity * cap * u};
}

}  // namespace foreglow
