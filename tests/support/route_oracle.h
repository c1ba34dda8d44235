// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cmath>
#include <vector>

#include "model/harmonic_route.h"
#include "model/transform_plan.h"
#include "physics/band_law.h"
#include "sphere/converged_analysis.h"
#include "sphere/fill.h"
#include "sphere/harmonics.h"
#include "sphere/power_spectrum.h"
#include "sphere/rotation.h"
#include "support/sky_builder.h"

namespace foreglow::testing {

[[nodiscard]] inline ConvergenceOptions hard() {
    ConvergenceOptions options;
    options.tolerance = 1e-13;
    options.max_iterations = 60;
    return options;
}

/// The oracle: the band sum in each pixel, its a_lm after very many refinements, beam, rotation, and back.
struct Oracle {
    ChannelMaps maps;
    Alm t;
    AlmEB eb;
};

[[nodiscard]] inline Oracle make_oracle(const SkyModel& sky, const Channel& channel,
                                        const HarmonicOptions& options) {
    const SkyStrip strip = make_sky_strip(sky, whole_sky(sky.grid), options.polarized);
    const BeamWindow window = channel_window(channel, options);
    Oracle oracle;
    auto map = strip.intensity;
    for (std::size_t p = 0; p < map.size(); ++p)
        map[p] *= exact_band_value(channel.band, sky.reference, strip.index[p], strip.curvature[p]);
    fill_undefined(sky.grid, map);
    oracle.t = analyse_converged(sky.grid, map, options.lmax, hard()).alm;
    multiply_by_l(oracle.t, window.temperature);
    rotate_alm(oracle.t, sky.frame, options.frame);
    oracle.maps.i = synthesize(oracle.t, sky.grid);
    if (!options.polarized) return oracle;
    auto q = strip.q, u = strip.u;
    for (std::size_t p = 0; p < q.size(); ++p) {
        const double f =
            exact_band_value(channel.band, sky.polarization->reference, strip.index_of_polarization()[p],
                             strip.curvature_of_polarization()[p]);
        q[p] *= f;
        u[p] *= f;
    }
    fill_undefined(sky.grid, q);
    fill_undefined(sky.grid, u);
    oracle.eb = analyse_converged_spin2(sky.grid, q, u, options.lmax, hard()).alm;
    multiply_by_l(oracle.eb.e, window.polarization);
    multiply_by_l(oracle.eb.b, window.polarization);
    rotate_alm(oracle.eb, sky.frame, options.frame);
    StokesValues values = synthesize_spin2(oracle.eb, sky.grid);
    oracle.maps.q = std::move(values.q);
    oracle.maps.u = std::move(values.u);
    return oracle;
}

[[nodiscard]] inline double rms(const std::vector<double>& values) {
    double sum = 0, count = 0;
    for (const double value : values)
        if (is_defined(value)) {
            sum += value * value;
            count += 1;
        }
    return std::sqrt(sum / count);
}

[[nodiscard]] inline std::vector<double> difference(const std::vector<double>& a,
                                                    const std::vector<double>& b) {
    std::vector<double> out(a.size());
    for (std::size_t i = 0; i < a.size(); ++i)
        out[i] = a[i] - b[i];
    return out;
}

/// rms(error)/rms(map), the larger of I and (Q, U), monopole and dipole of I removed (of the error only where
/// no pixel is undefined).
[[nodiscard]] inline double true_error(const ChannelMaps& found, const Oracle& oracle,
                                       const HealpixGrid& grid) {
    const auto off = difference(found.i, oracle.maps.i);
    const double size = rms_of_spectrum(power_spectrum(oracle.t));
    const bool whole = testing::undefined_count(off) == 0;
    double error =
        (whole ? rms_of_spectrum(power_spectrum(analyse(grid, off, oracle.t.lmax()))) : rms(off)) / size;
    if (found.q.empty()) return error;
    const double error_p =
        std::hypot(rms(difference(found.q, oracle.maps.q)), rms(difference(found.u, oracle.maps.u)));
    return std::max(error, error_p / std::hypot(rms(oracle.maps.q), rms(oracle.maps.u)));
}

}  // namespace foreglow::testing
