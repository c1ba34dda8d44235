// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/angular_correlation.h"

#include <libsharp/sharp.h>
#include <libsharp/sharp_geomhelpers.h>

#include <cmath>
#include <complex>
#include <memory>

#include "base/constants.h"
#include "base/error.h"

namespace foreglow {
namespace {

struct DestroyGeometry {
    void operator()(sharp_geom_info* info) const { sharp_destroy_geom_info(info); }
};
struct DestroyAlmInfo {
    void operator()(sharp_alm_info* info) const { sharp_destroy_alm_info(info); }
};

// One pixel a ring and m = 0 only: what is left of a transform is the Legendre sum.
void run_zonal(sharp_jobtype type, int lmax, int nodes, std::vector<std::complex<double>>& alm,
               std::vector<double>& map) {
    sharp_geom_info* geometry = nullptr;
    sharp_make_gauss_geom_info(nodes, 1, 0.0, 1, 1, &geometry);
    const std::unique_ptr<sharp_geom_info, DestroyGeometry> geometry_owner(geometry);
    const ptrdiff_t start = 0;
    sharp_alm_info* info = nullptr;
    sharp_make_alm_info(lmax, 0, 1, &start, &info);
    const std::unique_ptr<sharp_alm_info, DestroyAlmInfo> info_owner(info);
    void* alm_pointer = alm.data();
    void* map_pointer = map.data();
    sharp_execute(type, 0, &alm_pointer, &map_pointer, geometry, info, SHARP_DP, nullptr, nullptr);
}

double norm_of(std::size_t l) {
    return std::sqrt((2 * static_cast<double>(l) + 1) / (4 * constants::pi));
}

}  // namespace

AngularCorrelation::AngularCorrelation(int lmax, int nodes) : lmax_(lmax), nodes_(nodes) {
    FOREGLOW_EXPECTS(lmax >= 0 && nodes > lmax);
}

std::vector<double> AngularCorrelation::from_spectrum(std::span<const double> cl) const {
    FOREGLOW_EXPECTS(cl.size() <= static_cast<std::size_t>(lmax_) + 1);
    std::vector<std::complex<double>> alm(static_cast<std::size_t>(lmax_) + 1);
    for (std::size_t l = 0; l < cl.size(); ++l)
        alm[l] = norm_of(l) * cl[l];
    std::vector<double> xi(static_cast<std::size_t>(nodes_));
    run_zonal(SHARP_ALM2MAP, lmax_, nodes_, alm, xi);
    return xi;
}

std::vector<double> AngularCorrelation::to_spectrum(std::span<const double> xi) const {
    FOREGLOW_EXPECTS(xi.size() == static_cast<std::size_t>(nodes_));
    std::vector<double> map(xi.begin(), xi.end());
    std::vector<std::complex<double>> alm(static_cast<std::size_t>(lmax_) + 1);
    run_zonal(SHARP_MAP2ALM, lmax_, nodes_, alm, map);
    std::vector<double> cl(alm.size());
    for (std::size_t l = 0; l < cl.size(); ++l)
        cl[l] = alm[l].real() / norm_of(l);
    return cl;
}

double variance_of_spectrum(std::span<const double> cl) {
    double sum = 0;
    for (std::size_t l = 0; l < cl.size(); ++l)
        sum += (2 * static_cast<double>(l) + 1) * cl[l];
    return sum / (4 * constants::pi);
}

}  // namespace foreglow
