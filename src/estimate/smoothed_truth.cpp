// SPDX-License-Identifier: GPL-2.0-or-later
#include "estimate/smoothed_truth.h"

#include <cmath>

#include "base/error.h"
#include "model/filled_share.h"
#include "physics/spectral_law.h"
#include "sphere/beam.h"
#include "sphere/harmonics.h"
#include "sphere/regrid.h"

namespace foreglow {
namespace {

constexpr double tolerance = 1e-7;

SkyMap smooth(const SkyMap& like, std::vector<double> values, const BeamWindow& window) {
    SkyMap map{like.grid, like.frame, like.unit, std::move(values)};
    Alm alm = analyse_filled(map, window.lmax(), tolerance).alm;
    multiply_by_l(alm, window.temperature);
    map.values = synthesize(alm, map.grid);
    return map;
}

}  // namespace

void carry_laws(PixelLaws& laws, double log_ratio) {
    if (log_ratio == 0) return;
    for (std::size_t p = 0; p < laws.index.size(); ++p) {
        const SpectralParameters at{laws.index[p], laws.curvature[p]};
        laws.brightness.values[p] *= std::exp(log_brightness_ratio(at, log_ratio));
        laws.index[p] = local_index(at, log_ratio);
    }
}

PixelLaws smooth_laws(const PixelLaws& laws, Angle fwhm, int lmax) {
    FOREGLOW_EXPECTS(laws.index.size() == laws.brightness.values.size() &&
                     laws.curvature.size() == laws.index.size());
    if (fwhm.radians() == 0) return laws;
    const SkyMap& sky = laws.brightness;
    const BeamWindow window = make_gaussian_beam(fwhm, trusted_lmax(sky.grid, lmax));
    std::vector<double> first(sky.values), second(sky.values);
    for (std::size_t p = 0; p < first.size(); ++p) {
        first[p] *= laws.index[p];
        second[p] *= laws.index[p] * laws.index[p] + 2 * laws.curvature[p];
    }
    PixelLaws out;
    out.brightness = smooth(sky, sky.values, window);
    out.index = smooth(sky, std::move(first), window).values;
    out.curvature = smooth(sky, std::move(second), window).values;
    const FilledShare filled(sky.grid, sky.frame, sky.values, fwhm);
    const std::vector<double> share =
        filled.any() ? filled.under_beam(fwhm, sky.frame) : std::vector<double>(sky.values.size());
    for (std::size_t p = 0; p < out.index.size(); ++p) {
        double& brightness = out.brightness.values[p];
        if (share[p] > largest_filled_share) brightness = undefined_pixel;
        out.index[p] /= brightness;
        out.curvature[p] = 0.5 * (out.curvature[p] / brightness - out.index[p] * out.index[p]);
    }
    return out;
}

}  // namespace foreglow
