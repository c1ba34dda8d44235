// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/detail_draw.h"

#include <algorithm>
#include <cmath>

#include "base/constants.h"
#include "sphere/gaussian_field.h"

namespace foreglow {
namespace {

RandomKey random_key(const DrawKey& key, DrawnField field) {
    return {key.seed, static_cast<std::uint32_t>(key.realization), static_cast<std::uint32_t>(field)};
}

// sqrt(C_l) (rho_l eta_T + sqrt(1 - rho_l^2) eta), eta_T those of the intensity.
Alm draw_correlated(std::span<const double> cl, std::span<const double> correlation, DrawnField field,
                    int lmax, const DrawKey& key) {
    std::vector<double> shared(cl.size()), own(cl.size()), sign(cl.size());
    bool any = false;
    for (std::size_t l = 0; l < cl.size(); ++l) {
        const double rho = correlation[l];
        shared[l] = rho * rho * cl[l];
        own[l] = std::max(0.0, 1 - rho * rho) * cl[l];
        sign[l] = rho < 0 ? -1.0 : 1.0;
        any = any || shared[l] > 0;
    }
    Alm alm = make_gaussian_alm(own, lmax, random_key(key, field));
    if (!any) return alm;
    Alm common = make_gaussian_alm(shared, lmax, random_key(key, DrawnField::Intensity));
    multiply_by_l(common, sign);
    add_scaled(alm, 1.0, common);
    return alm;
}

}  // namespace

Alm draw_intensity(std::span<const double> tt, int lmax, const DrawKey& key) {
    return make_gaussian_alm(tt, lmax, random_key(key, DrawnField::Intensity));
}

AlmEB draw_polarization(const DetailSpectra& spectra, int lmax, const DrawKey& key) {
    return {draw_correlated(spectra.ee, spectra.correlation, DrawnField::PolarizationE, lmax, key),
            make_gaussian_alm(spectra.bb, lmax, random_key(key, DrawnField::PolarizationB))};
}

Alm draw_scatter(const ScatterSpec& scatter, DrawnField field, int lmax, const DrawKey& key) {
    const std::vector<double> cl = scatter_spectrum(scatter);
    const std::vector<double> correlation(cl.size(), scatter.correlation);
    return draw_correlated(cl, correlation, field, std::min(lmax, scatter.lrange.last), key);
}

std::vector<double> scatter_spectrum(const ScatterSpec& scatter) {
    std::vector<double> cl(static_cast<std::size_t>(scatter.lrange.last) + 1);
    double variance = 0;
    for (int l = scatter.lrange.first; l <= scatter.lrange.last; ++l) {
        const double shape = std::pow(static_cast<double>(l), scatter.slope);
        cl[static_cast<std::size_t>(l)] = shape;
        variance += (2.0 * l + 1) * shape / (4 * constants::pi);
    }
    for (double& value : cl)
        value *= scatter.rms * scatter.rms / variance;
    return cl;
}

}  // namespace foreglow
