// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/beam.h"

#include <arr.h>
#include <error_handling.h>
#include <healpix_data_io.h>

#include <algorithm>
#include <cmath>
#include <cstdio>
#include <cstdlib>
#include <filesystem>
#include <iostream>
#include <string>
#include <utility>

#include "base/error.h"
#include "sphere/grid.h"
#include "sphere/silenced_stream.h"

namespace foreglow {
namespace {

void clear_below_two(std::vector<double>& window) {
    for (std::size_t l = 0; l < std::min<std::size_t>(2, window.size()); ++l)
        window[l] = 0;
}

std::filesystem::path pixel_window_path(int nside) {
    const char* folder = std::getenv("FOREGLOW_HEALPIX_DATA");
    std::string digits = std::to_string(nside);
    digits.insert(0, 4 - digits.size(), '0');
    return std::filesystem::path(folder != nullptr && *folder != '\0' ? folder : "/usr/share/healpy/data") /
           ("pixel_window_n" + digits + ".fits");
}

}  // namespace

BeamWindow make_gaussian_beam(Angle fwhm, int lmax) {
    FOREGLOW_EXPECTS(fwhm.radians() >= 0 && lmax >= 0);
    const double sigma = fwhm.radians() / std::sqrt(8.0 * std::log(2.0));
    BeamWindow out;
    out.temperature.resize(static_cast<std::size_t>(lmax) + 1);
    out.polarization.resize(out.temperature.size());
    for (std::size_t l = 0; l < out.temperature.size(); ++l) {
        const double ell = static_cast<double>(l);
        const double exponent = -0.5 * ell * (ell + 1.0) * sigma * sigma;
        out.temperature[l] = std::exp(exponent);
        out.polarization[l] = std::exp(exponent + 2.0 * sigma * sigma);
    }
    clear_below_two(out.polarization);
    return out;
}

BeamWindow make_tabulated_beam(std::vector<double> temperature, std::vector<double> polarization) {
    FOREGLOW_EXPECTS(!temperature.empty());
    if (polarization.empty()) polarization = temperature;
    FOREGLOW_EXPECTS(polarization.size() == temperature.size());
    clear_below_two(polarization);
    return {std::move(temperature), std::move(polarization)};
}

BeamWindow read_pixel_window(int nside, int lmax) {
    FOREGLOW_EXPECTS(is_valid_nside(nside) && lmax >= 0);
    if (nside == 1)
        throw InputError(
            "there is no pixel window for nside 1: leave pixel_window out or take a larger nside");
    if (lmax > 4 * nside)
        throw InputError("the pixel window of nside " + std::to_string(nside) + " ends at l = " +
                         std::to_string(4 * nside) + ", so lmax = " + std::to_string(lmax) + " is too high");
    const auto path = pixel_window_path(nside);
    // Looked for first: CFITSIO would read meaning into the name and HEALPix print its own complaint.
    std::FILE* file = std::fopen(path.c_str(), "rb");
    if (file == nullptr)
        throw InputError(
            "the pixel window file " + path.string() +
            " cannot be opened: install the package healpy-data, or name its folder in the environment "
            "variable FOREGLOW_HEALPIX_DATA");
    std::fclose(file);
    arr<double> temperature, polarization;
    try {
        const SilencedStream no_message(std::cerr);
        read_pixwin(path.string(), temperature, polarization);
    } catch (const PlanckError& error) {
        throw DataError("the pixel window file " + path.string() + " cannot be read: " + error.what());
    }
    const auto length = static_cast<std::size_t>(lmax) + 1;
    if (temperature.size() < length || polarization.size() < length)
        throw DataError("the pixel window file " + path.string() +
                        " ends before l = " + std::to_string(lmax));
    BeamWindow out;
    out.temperature.assign(temperature.begin(), temperature.begin() + static_cast<std::ptrdiff_t>(length));
    out.polarization.assign(polarization.begin(), polarization.begin() + static_cast<std::ptrdiff_t>(length));
    return out;
}

BeamWindow product(const BeamWindow& a, const BeamWindow& b) {
    BeamWindow out;
    const std::size_t length = std::min(a.temperature.size(), b.temperature.size());
    for (std::size_t l = 0; l < length; ++l) {
        out.temperature.push_back(a.temperature[l] * b.temperature[l]);
        out.polarization.push_back(a.polarization[l] * b.polarization[l]);
    }
    return out;
}

void apply_beam(const BeamWindow& beam, Alm& temperature) {
    multiply_by_l(temperature, beam.temperature);
}

void apply_beam(const BeamWindow& beam, AlmEB& polarization) {
    multiply_by_l(polarization.e, beam.polarization);
    multiply_by_l(polarization.b, beam.polarization);
}

int highest_l(const BeamWindow& beam, double threshold) {
    for (int l = beam.lmax(); l > 0; --l) {
        const auto i = static_cast<std::size_t>(l);
        if (std::abs(beam.temperature[i]) > threshold || std::abs(beam.polarization[i]) > threshold) return l;
    }
    return 0;
}

}  // namespace foreglow
