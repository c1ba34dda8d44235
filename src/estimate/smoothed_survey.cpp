// SPDX-License-Identifier: GPL-2.0-or-later
#include "estimate/smoothed_survey.h"

#include <algorithm>
#include <cmath>

#include "base/error.h"
#include "base/text.h"
#include "estimate/noise_window.h"
#include "model/filled_share.h"
#include "model/map_source.h"
#include "sphere/beam.h"
#include "sphere/fill.h"
#include "sphere/harmonics.h"
#include "sphere/regrid.h"
#include "sphere/rotation.h"

namespace foreglow {
namespace {

constexpr double window_that_ends = 1e-4;  // of the common beam: what lies above that l is left out
constexpr double analysis_tolerance = 1e-6;
constexpr int most_refinements = 6;

double kelvin_of(const std::optional<Brightness>& level, Frequency frequency, const HealpixGrid& grid) {
    if (!level) return 0;
    return level->value * rayleigh_jeans_per_unit(level->unit, frequency, grid.pixel_area());
}

Angle extra_beam_of(const SurveysSpec& spec, const SurveySpec& survey) {
    const double ratio = survey.beam_fwhm.radians() / spec.beam_fwhm.radians();
    const double left = (1 - ratio) * (1 + ratio);
    return left < 1e-8 ? Angle() : Angle::from_radians(spec.beam_fwhm.radians() * std::sqrt(left));
}

/// A survey as read.
struct Survey {
    SkyMap map;                 ///< zero level subtracted
    std::vector<double> noise;  ///< variance per pixel, [npix] or [1]
};

void check_grids(const SurveySpec& spec, const SkyMap& map, const SkyMap& noise) {
    if (map.grid == noise.grid && map.frame == noise.frame) return;
    throw InputError(spec.noise_map->place + ": the noise map " + spec.noise_map->path.filename().string() +
                     " has nside " + std::to_string(noise.grid.nside()) + ", " + to_text(noise.frame) +
                     " but it is the rms per pixel of " + spec.map.path.filename().string() + ", nside " +
                     std::to_string(map.grid.nside()) + ", " + to_text(map.frame) +
                     ": give a noise map on the survey's own grid");
}

Survey read_survey(const SurveySpec& spec, Progress& progress) {
    Survey survey{read_brightness_map(spec.map, spec.frequency, progress), {}};
    const double level = kelvin_of(spec.zero_level, spec.frequency, survey.map.grid);
    for (double& value : survey.map.values)
        value -= level;
    if (spec.noise) {
        const double rms = kelvin_of(spec.noise, spec.frequency, survey.map.grid);
        survey.noise = {rms * rms};
        return survey;
    }
    SkyMap noise = read_brightness_map(*spec.noise_map, spec.frequency, progress);
    check_grids(spec, survey.map, noise);
    for (std::size_t i = 0; i < noise.values.size(); ++i) {
        if (!is_defined(noise.values[i])) survey.map.values[i] = undefined_pixel;
        if (noise.values[i] < 0)
            throw DataError(spec.noise_map->place + ": the noise map " +
                            spec.noise_map->path.filename().string() + " is negative in pixel " +
                            std::to_string(i) + " (RING), and an rms never is");
        noise.values[i] *= noise.values[i];
    }
    survey.noise = std::move(noise.values);
    return survey;
}

/// What all surveys are brought to.
struct Target {
    HealpixGrid grid{1};
    Frame frame = Frame::Galactic;
    int lmax = 0;
};

// The variance after smoothing: uniform noise in closed form, a map of it through the squared kernel.
std::vector<double> smooth_variance(const Survey& survey, std::span<const double> window,
                                    const Target& target) {
    const double area = survey.map.grid.pixel_area();
    const double total = area * squared_kernel_integral(window);
    if (survey.noise.size() == 1) return {survey.noise[0] * total};
    SkyMap variance{survey.map.grid, survey.map.frame, "", survey.noise};
    const auto defined = [](double v) { return is_defined(v); };
    if (std::none_of(variance.values.begin(), variance.values.end(), defined))
        throw DataError("a noise map has no defined pixel");
    fill_undefined(variance.grid, variance.values);
    const auto [low, high] = std::minmax_element(variance.values.begin(), variance.values.end());
    const double lowest = *low * total, highest = *high * total;
    // The squared kernel of a Gaussian is narrower by sqrt(2), so its window reaches further by that.
    const int lmax = trusted_lmax(variance.grid, 3 * target.lmax / 2);
    Alm alm = analyse(variance.grid, variance.values, lmax);
    std::vector<double> squared = make_squared_window(window, lmax);
    for (double& value : squared)
        value *= area;
    multiply_by_l(alm, squared);
    rotate_alm(alm, variance.frame, target.frame);
    std::vector<double> out = synthesize(alm, target.grid);
    for (double& value : out)
        value = std::clamp(value, lowest, highest);
    return out;
}

void undefine_filled(const SkyMap& map, Angle beam, const Target& target, std::vector<double>& values) {
    const Angle pixel = Angle::from_radians(std::sqrt(map.grid.pixel_area()));
    const Angle width = std::max(beam, pixel);
    const FilledShare filled(map.grid, map.frame, map.values, width);
    if (!filled.any()) return;
    const SkyMap share{map.grid, target.frame, "", filled.under_beam(width, target.frame)};
    std::vector<double> there(values.size());
    interpolate_pixels(share, target.grid, target.frame, 0, there);
    for (std::size_t i = 0; i < values.size(); ++i)
        if (there[i] > largest_filled_share) values[i] = undefined_pixel;
}

void smooth(const Survey& survey, const Target& target, SmoothedSurvey& out) {
    std::vector<double> filled = survey.map.values;
    if (count_undefined(filled) > 0) fill_undefined(survey.map.grid, filled);
    const BeamWindow window = make_gaussian_beam(out.extra_beam, target.lmax);
    ConvergenceOptions options;
    options.tolerance = analysis_tolerance;
    options.max_iterations = most_refinements;
    options.windows = {&window.temperature, 1};
    Alm alm = analyse_converged(survey.map.grid, filled, target.lmax, options).alm;
    multiply_by_l(alm, window.temperature);
    rotate_alm(alm, survey.map.frame, target.frame);
    out.values = synthesize(alm, target.grid);
    undefine_filled(survey.map, out.extra_beam, target, out.values);
    out.variances = smooth_variance(survey, window.temperature, target);
    out.noise_area = 1 / squared_kernel_integral(window.temperature);
}

int common_lmax(const SurveysSpec& spec, std::span<const Survey> surveys) {
    const double sigma = spec.beam_fwhm.radians() / std::sqrt(8 * std::log(2.0));
    const double wanted = std::sqrt(-2 * std::log(window_that_ends)) / sigma;
    int lmax = static_cast<int>(std::min(std::ceil(wanted), 4.0 * HealpixGrid::max_nside));
    lmax = std::max(lmax, 2);
    for (const Survey& survey : surveys)
        lmax = trusted_lmax(survey.map.grid, lmax);
    return lmax;
}

bool is_pixel_for_pixel(const SurveysSpec& spec, std::span<const Survey> surveys) {
    for (std::size_t i = 0; i < surveys.size(); ++i)
        if (surveys[i].map.grid.nside() != spec.nside || surveys[i].map.frame != spec.frame ||
            extra_beam_of(spec, spec.surveys[i]).radians() > 0)
            return false;
    return true;
}

void warn_about_cut(const SurveysSpec& spec, SmoothingReport& report, Progress& progress) {
    report.window_at_lmax = make_gaussian_beam(spec.beam_fwhm, report.lmax).temperature.back();
    if (report.window_at_lmax > 1e-2)
        progress.warn(
            "the coarsest survey ends at l = " + std::to_string(report.lmax) + ", where the common beam of " +
            to_text(spec.beam_fwhm) + " still has B_l = " + format_number(report.window_at_lmax, 2) +
            ": all surveys are cut there, and sharp structure rings; a wider `beam_fwhm` avoids it");
}

}  // namespace

SmoothedSurveys smooth_surveys(const SurveysSpec& spec, Progress& progress) {
    progress.begin("reading the surveys", static_cast<std::int64_t>(spec.surveys.size()));
    std::vector<Survey> surveys;
    surveys.reserve(spec.surveys.size());
    for (const SurveySpec& one : spec.surveys) {
        surveys.push_back(read_survey(one, progress));
        progress.step(static_cast<std::int64_t>(surveys.size()));
    }
    progress.end();
    SmoothedSurveys out;
    out.report.pixel_for_pixel = is_pixel_for_pixel(spec, surveys);
    out.report.lmax = common_lmax(spec, surveys);
    const Target target{HealpixGrid(spec.nside), spec.frame, out.report.lmax};
    if (!out.report.pixel_for_pixel) warn_about_cut(spec, out.report, progress);
    out.surveys.reserve(surveys.size());
    progress.begin("smoothing to the common beam", static_cast<std::int64_t>(surveys.size()));
    for (std::size_t i = 0; i < surveys.size(); ++i) {
        const SurveySpec& one = spec.surveys[i];
        const HealpixGrid& grid = surveys[i].map.grid;
        SmoothedSurvey smoothed;
        smoothed.name = one.map.path.filename().string();
        smoothed.frequency = one.frequency;
        smoothed.calibration_error = one.calibration_error;
        smoothed.zero_level = kelvin_of(one.zero_level, one.frequency, grid);
        smoothed.zero_level_error = kelvin_of(one.zero_level_error, one.frequency, grid);
        smoothed.extra_beam = extra_beam_of(spec, one);
        if (out.report.pixel_for_pixel) {
            smoothed.values = std::move(surveys[i].map.values);
            smoothed.variances = std::move(surveys[i].noise);
            smoothed.noise_area = grid.pixel_area();
        } else {
            smooth(surveys[i], target, smoothed);
            surveys[i] = {};  // read maps are large
        }
        smoothed.undefined = count_undefined(smoothed.values);
        out.surveys.push_back(std::move(smoothed));
        progress.step(static_cast<std::int64_t>(i) + 1);
    }
    progress.end();
    return out;
}

}  // namespace foreglow
