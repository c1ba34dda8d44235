// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/detail_modulation.h"

#include <algorithm>
#include <cmath>

#include "base/error.h"
#include "base/normal_kernel.h"
#include "base/parallel.h"
#include "math/vector_exp.h"
#include "model/sky_region.h"
#include "sphere/beam.h"
#include "sphere/harmonics.h"
#include "sphere/regrid.h"

namespace foreglow {
namespace {

constexpr double envelope_tolerance = 1e-5;  // of its a_lm: an amplitude of structure that is random anyhow
constexpr double negligible_window = 1e-6;

struct Smoothing {
    BeamWindow window;  // from the own beam to the wider one
    int lmax = 0;
};

Smoothing make_smoothing(const HealpixGrid& grid, Angle own_fwhm, Angle fwhm) {
    const double own = own_fwhm.radians(), wide = fwhm.radians();
    FOREGLOW_EXPECTS(wide >= own);
    const Angle extra = Angle::from_radians(std::sqrt(wide * wide - own * own));
    const int most = trusted_lmax(grid, 5 * grid.nside() / 2);
    Smoothing out{make_gaussian_beam(extra, most), most};
    out.lmax = std::max(2, highest_l(out.window, negligible_window));
    return out;
}

FOREGLOW_WIDE
void powers_of(const double* brightness, double floor, double power, float* out, std::size_t count) {
    for (std::size_t i = 0; i < count; ++i) {
        const double x = brightness[i] > floor ? brightness[i] : floor;
        out[i] = static_cast<float>(vector_exp(power * kernel::natural_log(x)));
    }
}

}  // namespace

std::vector<double> make_envelope(const HealpixGrid& grid, std::span<const double> map, Angle own_fwhm,
                                  Angle fwhm) {
    const Smoothing smoothing = make_smoothing(grid, own_fwhm, fwhm);
    AnalysedMap result = analyse_filled(SkyMap{grid, Frame::Galactic, "", {map.begin(), map.end()}},
                                        smoothing.lmax, envelope_tolerance);
    apply_beam(smoothing.window, result.alm);
    return synthesize(result.alm, grid);
}

std::vector<double> make_polarized_envelope(const HealpixGrid& grid, std::span<const double> q,
                                            std::span<const double> u, Angle own_fwhm, Angle fwhm) {
    const Smoothing smoothing = make_smoothing(grid, own_fwhm, fwhm);
    AnalysedStokes result =
        analyse_filled(StokesMaps{grid, Frame::Galactic, "", {q.begin(), q.end()}, {u.begin(), u.end()}},
                       smoothing.lmax, envelope_tolerance);
    apply_beam(smoothing.window, result.alm);
    const StokesValues smooth = synthesize_spin2(result.alm, grid);
    std::vector<double> p(smooth.q.size());
    for (std::size_t i = 0; i < p.size(); ++i)
        p[i] = std::sqrt(smooth.q[i] * smooth.q[i] + smooth.u[i] * smooth.u[i]);
    return p;
}

Modulation make_modulation(std::span<const double> brightness, std::span<const double> region, double power,
                           double floor) {
    FOREGLOW_EXPECTS(brightness.size() == region.size());
    Modulation out;
    out.weights.assign(brightness.size(), 1.0F);
    if (std::none_of(region.begin(), region.end(), [](double w) { return w > 0; }))
        throw DataError("no pixel of the template is defined beyond the detail's latitude_cut: lower it");
    out.mean_brightness = region_mean(region, [&](std::size_t i) { return brightness[i]; });
    if (power == 0) return out;
    if (!(out.mean_brightness > 0))
        throw DataError(
            "the template's mean brightness beyond the detail's latitude_cut is not positive, so the detail "
            "cannot follow it: look at zero_level, or set modulation = 0");
    // The smallest positive floor keeps the logarithm finite where the model asks for none.
    const double lowest = std::max(floor, 1e-6) * out.mean_brightness;
    parallel_for_blocks(static_cast<std::int64_t>(brightness.size()), 65536,
                        [&](std::int64_t begin, std::int64_t end) {
                            powers_of(brightness.data() + begin, lowest, power, out.weights.data() + begin,
                                      static_cast<std::size_t>(end - begin));
                        });
    const double mean_square = region_mean(region, [&](std::size_t i) {
        const auto w = static_cast<double>(out.weights[i]);
        return w * w;
    });
    const auto scale = static_cast<float>(1 / std::sqrt(mean_square));
    for (float& w : out.weights)
        w *= scale;
    const auto low =
        std::count_if(brightness.begin(), brightness.end(), [&](double b) { return b < lowest; });
    out.floored = static_cast<double>(low) / static_cast<double>(brightness.size());
    return out;
}

}  // namespace foreglow
