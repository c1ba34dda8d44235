// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/galaxy_integral.h"

#include <algorithm>
#include <cmath>

#include "base/constants.h"
#include "base/error.h"
#include "base/vector_width.h"
#include "math/vector_exp.h"
#include "math/vector_sin_cos.h"
#include "physics/synchrotron_kernel.h"

namespace foreglow {
namespace {

constexpr double kpc = 3.0856775814913673e19;  // m, IAU 2015 B2
constexpr std::size_t heights = GalaxyTable::height_points;

struct NodeRows {
    std::size_t count;  // a multiple of GalaxyNodes::lanes
    const double* old_disc;
    const double* young_disc;
    const double* lambda2;
};

// The sums of one line of sight, [count] each.
struct Sums {
    double* i;
    double* q;
    double* u;
    double* emission;  // of the last sample
};

FOREGLOW_INLINE double emission_exp(double x) {
    return vector_exp<ExpPrecision::Single>(x < -690.0 ? -690.0 : x);
}

// (1 - e^-z)/z with z = a + i b: the mean of e^-zx over 0 < x < 1.
struct SlabAverage {
    double real, imaginary;
};
FOREGLOW_INLINE SlabAverage slab_average(double a, double b) {
    const SinCos turn = vector_sin_cos(b);
    const double left = vector_exp(a > 690.0 ? -690.0 : -a);  // in full: 1 - left may be small
    const double real = 1 - left * turn.cos;
    const double imaginary = left * turn.sin;
    const double square = a * a + b * b;
    const double inverse = 1 / (square + 1e-300);
    // 1 - z/2 + z^2/6 - z^3/24 where the difference would lose digits; the next term is below 1e-9
    const double a2 = a * a;
    const double b2 = b * b;
    const double series_real = 1 - a / 2 + (a2 - b2) / 6 - a * (a2 - 3 * b2) / 24;
    const double series_imaginary = -b / 2 + a * b / 3 - b * (3 * a2 - b2) / 24;
    const bool is_thin = square < 1e-4;
    return {is_thin ? series_real : (real * a + imaginary * b) * inverse,
            is_thin ? series_imaginary : (imaginary * a - real * b) * inverse};
}

// Adds one sample to the sums of all frequencies; depth and dispersion are those in front of its step.
template <bool polarized>
FOREGLOW_INLINE void add_sample(const GalaxySamples& samples, std::size_t s, const NodeRows& nodes,
                                double depth, double dispersion, const Sums& sums) {
    const std::size_t count = nodes.count;
    const auto field = static_cast<std::size_t>(samples.field_place[s]);
    const auto height = static_cast<std::size_t>(samples.height_place[s]);
    const double* const __restrict row_0 = nodes.old_disc + (field * heights + height) * count;
    const double* const __restrict row_1 = row_0 + heights * count;
    const double* const __restrict row_2 = row_1 + heights * count;
    const double* const __restrict row_3 = row_2 + heights * count;
    const double* const __restrict young = nodes.young_disc + field * count;
    const double* const __restrict lambda2 = nodes.lambda2;
    double* const __restrict sum_i = sums.i;
    double* const __restrict sum_q = sums.q;
    double* const __restrict sum_u = sums.u;
    double* const __restrict emission = sums.emission;
    const double h0 = samples.height_weight[0][s];
    const double h1 = samples.height_weight[1][s];
    const double h2 = samples.height_weight[2][s];
    const double h3 = samples.height_weight[3][s];
    const double f0 = samples.field_weight[0][s];
    const double f1 = samples.field_weight[1][s];
    const double f2 = samples.field_weight[2][s];
    const double f3 = samples.field_weight[3][s];
    const double d0 = samples.field_slope[0][s] / GalaxyNodes::field_step;
    const double d1 = samples.field_slope[1][s] / GalaxyNodes::field_step;
    const double d2 = samples.field_slope[2][s] / GalaxyNodes::field_step;
    const double d3 = samples.field_slope[3][s] / GalaxyNodes::field_step;
    const double old_weight = samples.old_weight[s];
    const double young_weight = samples.young_weight[s];
    const double q_share = samples.q_share[s];
    const double u_share = samples.u_share[s];
    const double step_depth = samples.depth[s];
    const double step_dispersion = samples.dispersion[s];
    const std::size_t n1 = count;
    const std::size_t n2 = 2 * count;
    const std::size_t n3 = 3 * count;
    FOREGLOW_INDEPENDENT
    for (std::size_t k = 0; k < count; ++k) {
        const double v0 = h0 * row_0[k] + h1 * row_0[n1 + k] + h2 * row_0[n2 + k] + h3 * row_0[n3 + k];
        const double v1 = h0 * row_1[k] + h1 * row_1[n1 + k] + h2 * row_1[n2 + k] + h3 * row_1[n3 + k];
        const double v2 = h0 * row_2[k] + h1 * row_2[n1 + k] + h2 * row_2[n2 + k] + h3 * row_2[n3 + k];
        const double v3 = h0 * row_3[k] + h1 * row_3[n1 + k] + h2 * row_3[n2 + k] + h3 * row_3[n3 + k];
        const double y0 = young[k];
        const double y1 = young[n1 + k];
        const double y2 = young[n2 + k];
        const double y3 = young[n3 + k];
        const double old_part = old_weight * emission_exp(f0 * v0 + f1 * v1 + f2 * v2 + f3 * v3);
        const double young_part = young_weight * emission_exp(f0 * y0 + f1 * y1 + f2 * y2 + f3 * y3);
        const double both = old_part + young_part;
        sum_i[k] += both;
        emission[k] = both;
        if constexpr (polarized) {
            // d ln Phi/d ln B = -d ln Phi/d ln a
            const double slope = (old_part * (d0 * v0 + d1 * v1 + d2 * v2 + d3 * v3) +
                                  young_part * (d0 * y0 + d1 * y1 + d2 * y2 + d3 * y3)) /
                                 (both + 1e-300);
            const double fraction = (2 + 2 * slope) / (2 * slope + 10.0 / 3);  // s = 1 + 2 slope
            const double l2 = lambda2[k];
            const SlabAverage slab = slab_average(2 * step_dispersion * l2 * l2, 2 * step_depth * l2);
            const SinCos turn = vector_sin_cos(2 * depth * l2);
            const double p = both * fraction * emission_exp(-2 * dispersion * l2 * l2);
            // (q + iu) exp(-2 i depth l2) times the slab's average
            const double real = p * (slab.real * turn.cos + slab.imaginary * turn.sin);
            const double imaginary = p * (slab.imaginary * turn.cos - slab.real * turn.sin);
            sum_q[k] += q_share * real - u_share * imaginary;
            sum_u[k] += u_share * real + q_share * imaginary;
        }
    }
}

struct Accumulated {
    double depth = 0, largest_depth = 0, dispersion = 0;
    double emission = 0, emission_squared = 0, random = 0;  // at 408 MHz
};

template <bool polarized>
FOREGLOW_INLINE void add_samples(const GalaxySamples& samples, const NodeRows& nodes, std::size_t reference,
                                 const Sums& sums, Accumulated& line) {
    for (std::size_t s = 0; s < samples.count; ++s) {
        add_sample<polarized>(samples, s, nodes, line.depth, line.dispersion, sums);
        line.depth += samples.depth[s];
        line.largest_depth = std::max(line.largest_depth, std::abs(line.depth));
        line.dispersion += samples.dispersion[s];
        const double emission = sums.emission[reference];
        line.emission += emission;
        line.emission_squared += emission * emission / samples.step[s];
        line.random += emission * samples.random_share[s];
    }
}

FOREGLOW_WIDE
void add_intensity(const GalaxySamples& samples, const NodeRows& nodes, std::size_t reference,
                   const Sums& sums, Accumulated& line) {
    add_samples<false>(samples, nodes, reference, sums, line);
}

FOREGLOW_WIDE
void add_stokes(const GalaxySamples& samples, const NodeRows& nodes, std::size_t reference, const Sums& sums,
                Accumulated& line) {
    add_samples<true>(samples, nodes, reference, sums, line);
}

std::vector<Frequency> with_reference(std::span<const Frequency> frequencies) {
    std::vector<Frequency> all(frequencies.begin(), frequencies.end());
    all.push_back(Frequency::from_hz(408e6));
    return all;
}

}  // namespace

GalaxyIntegral::GalaxyIntegral(const GalaxySpec& galaxy, const GalaxyTable& table,
                               std::span<const Frequency> frequencies)
    : galaxy_(galaxy), shape_(galaxy), nodes_(table, with_reference(frequencies)) {
    for (std::size_t k = 0; k < nodes_.padded_count(); ++k) {
        const double hz = nodes_.frequencies()[std::min(k, nodes_.count() - 1)].hz();
        const double lambda = constants::speed_of_light / hz;
        lambda2_.push_back(lambda * lambda);
        kelvin_.push_back(power_per_hz_and_microgauss() / (4 * constants::pi) * kpc * lambda * lambda /
                          (2 * constants::boltzmann));
    }
}

GalaxySightline GalaxyIntegral::sightline(const Vector3& direction, std::size_t steps, bool polarized) const {
    FOREGLOW_EXPECTS(steps >= 1);
    const GalaxyRay ray(galaxy_, direction);
    const NodeRows nodes{nodes_.padded_count(), nodes_.old_disc().data(), nodes_.young_disc().data(),
                         lambda2_.data()};
    std::vector<double> buffer(4 * nodes.count);
    const Sums sums{&buffer[0], &buffer[nodes.count], &buffer[2 * nodes.count], &buffer[3 * nodes.count]};
    Accumulated line;
    GalaxySamples samples;
    for (std::size_t first = 0; first < steps; first += GalaxySamples::capacity) {
        make_samples(shape_, ray, first, steps, samples);
        (polarized ? add_stokes : add_intensity)(samples, nodes, count(), sums, line);
    }
    GalaxySightline out;
    out.depth = line.depth;
    out.largest_depth = line.largest_depth;
    out.dispersion = line.dispersion;
    if (line.emission_squared > 0) {
        out.emitting_length = line.emission * line.emission / line.emission_squared;
        out.random_share = line.random / line.emission;
    }
    const auto finish = [&](const double* sum) {
        std::vector<double> values(count());
        for (std::size_t k = 0; k < values.size(); ++k)
            values[k] = sum[k] * kelvin_[k];
        return values;
    };
    out.i = finish(sums.i);
    if (!polarized) return out;
    out.q = finish(sums.q);
    out.u = finish(sums.u);
    return out;
}

}  // namespace foreglow
