// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/spectrum_fit.h"

#include <algorithm>
#include <cmath>

#include "base/error.h"
#include "base/text.h"
#include "model/sky_region.h"
#include "sphere/beam.h"
#include "sphere/converged_analysis.h"
#include "sphere/power_spectrum.h"
#include "sphere/regrid.h"

namespace foreglow {
namespace {

constexpr int usual_bin = 10;
constexpr std::size_t fewest_bins = 4;
// Taken out within a bin, whose mean would else lie above a steep law at its middle.
constexpr double usual_steepness = 2.5;
constexpr double smallest_beam_power = 0.3;
constexpr double flattest_slope = -1;
constexpr double analysis_tolerance = 1e-4;  // of a_lm; the bins' own errors are some per cent

std::vector<SpectrumBin> make_bins(std::span<const double> cl, const LRange& lrange, double sky_fraction) {
    const int count = lrange.last - lrange.first + 1;
    const int width = std::clamp(count / 6, 1, usual_bin);
    std::vector<SpectrumBin> bins;
    for (int first = lrange.first; first + width - 1 <= lrange.last; first += width) {
        double modes = 0, mean_l = 0, mean = 0;
        for (int l = first; l < first + width; ++l) {
            const double n = 2.0 * l + 1;
            modes += n;
            mean_l += n * l;
            mean += n * cl[static_cast<std::size_t>(l)] * std::pow(static_cast<double>(l), usual_steepness);
        }
        mean_l /= modes;
        const double mean_cl = mean / modes * std::pow(mean_l, -usual_steepness);
        if (mean_cl > 0) bins.push_back({mean_l, mean_cl, std::sqrt(2 / (modes * sky_fraction))});
    }
    return bins;
}

// A straight line by weighted least squares, centred so that the two parameters' errors come apart.
void fit_line(SpectrumFit& fit) {
    double s = 0, sx = 0, sy = 0;
    const auto x_of = [&](const SpectrumBin& bin) { return std::log(bin.l / fit.pivot); };
    const auto y_of = [](const SpectrumBin& bin) {
        return std::log(bin.cl) + 0.5 * bin.log_error * bin.log_error;  // E ln(chi^2_nu / nu) = -1/nu
    };
    for (const SpectrumBin& bin : fit.bins) {
        const double w = 1 / (bin.log_error * bin.log_error);
        s += w;
        sx += w * x_of(bin);
        sy += w * y_of(bin);
    }
    double sxx = 0, sxy = 0, chi2 = 0;
    for (const SpectrumBin& bin : fit.bins) {
        const double w = 1 / (bin.log_error * bin.log_error);
        sxx += w * (x_of(bin) - sx / s) * (x_of(bin) - sx / s);
        sxy += w * (x_of(bin) - sx / s) * (y_of(bin) - sy / s);
    }
    fit.slope = sxy / sxx;
    const double log_amplitude = sy / s - fit.slope * sx / s;
    fit.amplitude = std::exp(log_amplitude);
    for (const SpectrumBin& bin : fit.bins) {
        const double pull = (y_of(bin) - log_amplitude - fit.slope * x_of(bin)) / bin.log_error;
        chi2 += pull * pull;
    }
    fit.reduced_chi2 = chi2 / static_cast<double>(fit.bins.size() - 2);
    const double scale = std::sqrt(std::max(1.0, fit.reduced_chi2));
    fit.slope_error = scale / std::sqrt(sxx);
    fit.log_amplitude_error = scale * std::sqrt(1 / s + sx * sx / (s * s * sxx));
}

std::string range_text(const LRange& lrange) {
    std::string text("[");
    text += std::to_string(lrange.first);
    text += ", ";
    text += std::to_string(lrange.last);
    return text + "]";
}

void check_range(const LRange& lrange, Angle beam_fwhm, std::span<const double> window,
                 const HealpixGrid& grid, const std::string& place, const std::string& what) {
    const int default_last = default_fit_lrange(beam_fwhm).last;
    if (lrange.last > 2 * grid.nside())
        throw InputError(place + ": fit_lrange " + range_text(lrange) + " ends above 2 nside = " +
                         std::to_string(2 * grid.nside()) + " of the " + what + ": end it lower");
    const double b = window[static_cast<std::size_t>(lrange.last)];
    if (!(b * b > smallest_beam_power))
        throw InputError(place + ": fit_lrange " + range_text(lrange) + " ends where the beam of the " +
                         what + " lets less than 0.3 of the power through: end it at l = " +
                         std::to_string(default_last) + " or lower");
}

std::vector<double> without_beam(std::vector<double> cl, double mean_square, std::span<const double> window) {
    for (std::size_t l = 0; l < cl.size(); ++l)
        cl[l] = window[l] > 0 ? cl[l] / (mean_square * window[l] * window[l]) : 0.0;
    return cl;
}

int analysis_lmax(const HealpixGrid& grid, const LRange& lrange) {
    return trusted_lmax(grid, std::max(3 * lrange.last / 2, lrange.last + 50));
}

}  // namespace

LRange default_fit_lrange(Angle beam_fwhm) {
    const double sigma = beam_fwhm.radians() / std::sqrt(8 * std::log(2.0));
    // B_l^2 = exp(-l (l + 1) sigma^2) = 1/2.
    const int last = std::clamp(static_cast<int>(std::sqrt(std::log(2.0)) / std::max(sigma, 1e-9)), 8, 2000);
    return {last >= 60 ? 30 : std::max(2, last / 2), last};
}

SpectrumFit fit_power_law(std::span<const double> cl, const LRange& lrange, double sky_fraction,
                          const std::string& place, const std::string& what) {
    FOREGLOW_EXPECTS(lrange.first >= 1 && static_cast<std::size_t>(lrange.last) < cl.size());
    SpectrumFit fit;
    fit.lrange = lrange;
    fit.sky_fraction = sky_fraction;
    fit.pivot = std::sqrt(static_cast<double>(lrange.first) * lrange.last);
    fit.bins = make_bins(cl, lrange, sky_fraction);
    const std::string advice = ": choose another fit_lrange, or give slope and amplitude";
    if (fit.bins.size() < fewest_bins)
        throw InputError(place + ": the spectrum of the " + what + " over l = " + range_text(lrange) +
                         " has only " + std::to_string(fit.bins.size()) +
                         " bins with power, and a fit needs 4" + advice);
    fit_line(fit);
    if (fit.slope > flattest_slope)
        throw InputError(place + ": the spectrum of the " + what + " over l = " + range_text(lrange) +
                         " has the slope " + format_number(fit.slope, 3) +
                         ", too flat for the sky (noise, or sources): continued, it would grow without end" +
                         advice);
    return fit;
}

SpectrumFit fit_intensity(const SkyMap& map, Angle beam_fwhm, Angle latitude_cut, const LRange& lrange,
                          const std::string& place) {
    const int lmax = analysis_lmax(map.grid, lrange);
    const auto window = make_gaussian_beam(beam_fwhm, std::max(lmax, lrange.last)).temperature;
    check_range(lrange, beam_fwhm, window, map.grid, place, "intensity template");
    std::vector<double> weights = make_latitude_weights(map.grid, map.frame, latitude_cut);
    exclude_undefined(weights, map.values);
    const double mean = region_mean(weights, [&](std::size_t i) { return map.values[i]; });
    const RegionMoments moments = region_moments(weights);
    std::vector<double> masked(weights.size());
    for (std::size_t i = 0; i < masked.size(); ++i)
        masked[i] = weights[i] > 0 ? weights[i] * (map.values[i] - mean) : 0.0;
    ConvergenceOptions options;
    options.tolerance = analysis_tolerance;
    const auto result = analyse_converged(map.grid, masked, lmax, options);
    return fit_power_law(without_beam(power_spectrum(result.alm), moments.mean_square, window), lrange,
                         moments.effective_fraction(), place, "intensity template");
}

SpectrumFit fit_polarization(const StokesMaps& maps, Angle beam_fwhm, Angle latitude_cut,
                             const LRange& lrange, const std::string& place) {
    const int lmax = analysis_lmax(maps.grid, lrange);
    const auto window = make_gaussian_beam(beam_fwhm, std::max(lmax, lrange.last)).polarization;
    check_range(lrange, beam_fwhm, window, maps.grid, place, "polarization template");
    std::vector<double> weights = make_latitude_weights(maps.grid, maps.frame, latitude_cut);
    exclude_undefined(weights, maps.q);
    exclude_undefined(weights, maps.u);
    const RegionMoments moments = region_moments(weights);
    std::vector<double> q(weights.size()), u(weights.size());
    for (std::size_t i = 0; i < q.size(); ++i) {
        q[i] = weights[i] > 0 ? weights[i] * maps.q[i] : 0.0;
        u[i] = weights[i] > 0 ? weights[i] * maps.u[i] : 0.0;
    }
    ConvergenceOptions options;
    options.tolerance = analysis_tolerance;
    const auto result = analyse_converged_spin2(maps.grid, q, u, lmax, options);
    return fit_power_law(without_beam(power_spectrum(result.alm.e), moments.mean_square, window), lrange,
                         moments.effective_fraction(), place, "polarization template");
}

}  // namespace foreglow
