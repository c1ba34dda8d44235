// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/galaxy_samples.h"

#include <algorithm>
#include <cmath>

#include "base/constants.h"
#include "base/error.h"
#include "base/vector_width.h"
#include "math/cubic_b_spline.h"
#include "math/vector_exp.h"
#include "math/vector_log.h"
#include "math/vector_sin_cos.h"
#include "model/galaxy_table.h"

namespace foreglow {
namespace {

constexpr double degree = constants::pi / 180;
constexpr double infinity = 1e30;

// Distance at which |sun + d n| in the plane reaches the limit.
double exit_of_cylinder(double sun, double limit, const Vector3& n) {
    const double a = n[0] * n[0] + n[1] * n[1];
    if (a < 1e-20) return infinity;
    const double b = -sun * n[0];
    const double c = sun * sun - limit * limit;
    const double root = b * b - a * c;
    return root > 0 ? std::max((-b + std::sqrt(root)) / a, 0.0) : 0.0;
}

GalaxyShape::Layer layer(double sun, double scale, double core, double height) {
    return {core * core, std::sqrt(sun * sun + core * core) / scale, 1 / scale,
            height > 0 ? 1 / height : 0.0};
}

FOREGLOW_INLINE double bounded_exp(double x) {
    const double above = x < -690.0 ? -690.0 : x;
    return vector_exp<ExpPrecision::Single>(above > 690.0 ? 690.0 : above);
}

FOREGLOW_INLINE double tanh_of(double x) {
    const double bounded = x > 30.0 ? 30.0 : (x < -30.0 ? -30.0 : x);
    return 1 - 2 / (vector_exp<ExpPrecision::Single>(2 * bounded) + 1);
}

FOREGLOW_INLINE double value_of(const GalaxyShape::Layer& layer, double r2, double z) {
    return bounded_exp(layer.start - std::sqrt(r2 + layer.core2) * layer.inverse_scale -
                       z * layer.inverse_height);
}

FOREGLOW_INLINE double floor_of(double x) {
    constexpr double shift = 6755399441055744.0;  // 1.5 * 2^52: adding it rounds to an integer
    return ((x - 0.5) + shift) - shift;
}

struct Arms {
    double factor;  // a
};

FOREGLOW_INLINE double arm_factor(const GalaxyShape& g, double x, double y, double r2, double z) {
    const double inverse_r2 = 1 / r2;
    const double cos_2phi = (x * x - y * y) * inverse_r2;
    const double sin_2phi = 2 * x * y * inverse_r2;
    const double log_ratio = 0.5 * vector_log(r2 / (g.sun_radius * g.sun_radius));
    const SinCos turn = vector_sin_cos(g.twice_inverse_tan_pitch * log_ratio - g.twice_phase);
    const double wave = cos_2phi * turn.cos - sin_2phi * turn.sin;
    const double onset = 1 - bounded_exp(-r2 * g.inverse_arm_onset2);
    return 1 + g.arm * wave * onset * bounded_exp(-z * z * g.inverse_arm_height2);
}

// A place in a table of cubic splines: the first of its four points, and the fraction.
struct Knot {
    double first, fraction;
};
FOREGLOW_INLINE Knot knot_of(double at) {
    const double whole = floor_of(at);
    return {whole - 1, at - whole};
}

FOREGLOW_WIDE
void fill(const GalaxyShape& g, const GalaxyRay& ray, double first, double u_step, std::size_t count,
          GalaxySamples& out) {
    const Vector3 n = ray.direction;
    const Vector3 south = ray.south;
    const Vector3 east = ray.east;
    const double log_field_low = std::log(GalaxyNodes::field_low);
    const double log_field_high = std::log(GalaxyNodes::field_high);
    FOREGLOW_INDEPENDENT
    for (std::size_t s = 0; s < count; ++s) {
        const double grown = bounded_exp((first + static_cast<double>(static_cast<int>(s)) + 0.5) * u_step);
        const double distance = GalaxyRay::start * (grown - 1);
        const double step = GalaxyRay::start * grown * u_step;
        const double x = distance * n[0] - g.sun_radius;
        const double y = distance * n[1];
        const double signed_z = distance * n[2];
        const double z = signed_z < 0 ? -signed_z : signed_z;
        const double r2 = x * x + y * y + 1e-20;
        const double r = std::sqrt(r2);
        const double a = arm_factor(g, x, y, r2, z);

        const double disc = g.disc_strength * value_of(g.disc_field, r2, z) * a *
                            (1 - bounded_exp(-r2 * g.inverse_disc_onset2)) *
                            tanh_of((r - g.reversal_radius) * g.inverse_reversal_width);
        const double from_layer = (z - g.halo_height) * g.inverse_halo_width;
        const double ring = r * g.inverse_halo_radius;
        const double halo = g.halo_strength * tanh_of(signed_z * g.inverse_halo_onset) /
                            (1 + from_layer * from_layer) * ring * bounded_exp(1 - ring);
        const double along_r = disc * g.sin_pitch / r;
        const double along_phi = (halo - disc * g.cos_pitch) / r;
        const double bx = along_r * x - along_phi * y;
        const double by = along_r * y + along_phi * x;
        const double bz = g.vertical_strength * value_of(g.vertical_field, r2, z);
        const double to_observer = -(bx * n[0] + by * n[1] + bz * n[2]);
        const double to_south = bx * south[0] + by * south[1] + bz * south[2];
        const double to_east = bx * east[0] + by * east[1] + bz * east[2];
        const double random =
            g.random_strength * value_of(g.random_field, r2, z) * std::sqrt(a > 0.1 ? a : 0.1);

        const double random2 = random * random * (2.0 / 3);
        const double field2 = to_south * to_south + to_east * to_east + random2 + 1e-300;
        const double log_field = 0.5 * vector_log(field2);
        const double low = log_field < log_field_low ? log_field_low : log_field;
        const double bounded = low > log_field_high ? log_field_high : low;
        const double amount = std::sqrt(field2) * step;
        const double arms = 1 + g.young_arm_contrast * (a - 1);
        out.step[s] = step;
        out.old_weight[s] = amount * value_of(g.old_disc, r2, 0);
        out.young_weight[s] = amount * value_of(g.young_disc, r2, z) * (arms > 0 ? arms : 0.0);
        out.q_share[s] = (to_east * to_east - to_south * to_south) / field2;
        out.u_share[s] = -2 * to_south * to_east / field2;
        out.random_share[s] = random2 / field2;
        const double gas =
            g.thick_density * value_of(g.thick_gas, r2, z) + g.thin_density * value_of(g.thin_gas, r2, z) * a;
        out.depth[s] = depth_per_kpc * gas * to_observer * step;
        out.dispersion[s] = g.dispersion_factor * gas * gas * random * random * step;

        const Knot field = knot_of((bounded - log_field_low) / GalaxyNodes::field_step + GalaxyNodes::margin);
        const Knot height =
            knot_of(std::sqrt(z * g.inverse_height_limit) / GalaxyTable::height_step + GalaxyTable::margin);
        const BSplineWeights of_field = b_spline_weights(field.fraction);
        const BSplineWeights of_height = b_spline_weights(height.fraction);
        out.field_place[s] = field.first;
        out.height_place[s] = height.first;
#pragma GCC unroll 4
        for (std::size_t i = 0; i < 4; ++i) {
            out.field_weight[i][s] = of_field.value[i];
            out.field_slope[i][s] = of_field.slope[i];
            out.height_weight[i][s] = of_height.value[i];
        }
    }
}

}  // namespace

GalaxyRay::GalaxyRay(const GalaxySpec& galaxy, const Vector3& n) : direction(n) {
    const double in_plane = std::hypot(n[0], n[1]);
    const double cos_l = in_plane > 0 ? n[0] / in_plane : 1.0;
    const double sin_l = in_plane > 0 ? n[1] / in_plane : 0.0;
    south = {n[2] * cos_l, n[2] * sin_l, -in_plane};
    east = {-sin_l, cos_l, 0};
    length = std::min(exit_of_cylinder(galaxy.sun_radius, galaxy.radius_limit, n), galaxy.distance_limit);
    if (std::abs(n[2]) > 1e-20) length = std::min(length, galaxy.height_limit / std::abs(n[2]));
    stretched = std::log1p(length / start);
}

GalaxyShape::GalaxyShape(const GalaxySpec& g)
    : sun_radius(g.sun_radius),
      inverse_height_limit(1 / g.height_limit),
      old_disc(layer(g.sun_radius, g.radius, g.core, 0)),
      young_disc(layer(g.sun_radius, g.young_radius, g.young_core, g.young_height)),
      disc_field(layer(g.sun_radius, g.disc_radius, g.disc_core, g.disc_height)),
      vertical_field(layer(g.sun_radius, g.disc_radius, g.disc_core, 0)),
      random_field(layer(g.sun_radius, g.random_radius, g.random_core, g.random_height)),
      thick_gas(layer(g.sun_radius, g.thick_radius, g.thick_core, g.thick_height)),
      thin_gas(layer(g.sun_radius, g.thin_radius, g.thin_core, g.thin_height)),
      arm(g.arm),
      twice_inverse_tan_pitch(2 / std::tan(g.pitch * degree)),
      twice_phase(2 * g.arm_phase * degree),
      inverse_arm_onset2(1 / (g.arm_onset * g.arm_onset)),
      inverse_arm_height2(1 / (g.arm_height * g.arm_height)),
      young_arm_contrast(g.young_arm_contrast),
      disc_strength(g.disc_field),
      sin_pitch(std::sin(g.pitch * degree)),
      cos_pitch(std::cos(g.pitch * degree)),
      inverse_disc_onset2(1 / (g.disc_onset * g.disc_onset)),
      reversal_radius(g.reversal_radius),
      inverse_reversal_width(1 / g.reversal_width),
      halo_strength(g.halo_field),
      halo_height(g.halo_height),
      inverse_halo_width(1 / g.halo_width),
      inverse_halo_radius(1 / g.halo_radius),
      inverse_halo_onset(1 / g.halo_onset),
      vertical_strength(g.vertical_field),
      random_strength(g.random_field),
      thick_density(g.thick_density),
      thin_density(g.thin_density),
      dispersion_factor(depth_per_kpc * depth_per_kpc / 3 * g.turbulence_length) {}

void make_samples(const GalaxyShape& shape, const GalaxyRay& ray, std::size_t first, std::size_t steps,
                  GalaxySamples& out) {
    FOREGLOW_EXPECTS(first < steps);
    out.count = std::min(GalaxySamples::capacity, steps - first);
    fill(shape, ray, static_cast<double>(first), ray.stretched / static_cast<double>(steps), out.count, out);
}

}  // namespace foreglow
