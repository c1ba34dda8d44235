// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/index_files.h"

#include <algorithm>
#include <array>
#include <cmath>

#include "base/build_info.h"
#include "base/constants.h"
#include "base/parallel.h"
#include "base/text.h"
#include "io/atomic_file.h"
#include "io/fits_map_write.h"
#include "io/json_value.h"
#include "jobs/manifest_parts.h"
#include "jobs/result_rows.h"

namespace foreglow {
namespace {

namespace fs = std::filesystem;

FitsMapLayout make_layout(const IndexResult& result, std::vector<FitsMapColumnName> columns,
                          const std::string& extname) {
    FitsMapLayout layout;
    layout.nside = result.spec.nside;
    layout.frame = result.spec.frame;
    layout.columns = std::move(columns);
    layout.extname = extname;
    auto& cards = layout.cards;
    cards.push_back(
        {"FREQ", result.spec.reference_frequency.hz(), "[Hz] reference frequency, where this holds"});
    cards.push_back(
        {"SKYFWHM", result.spec.beam_fwhm.degrees(), "[deg] FWHM of the surveys' common resolution"});
    cards.push_back({"ERRORS", std::string(result.common_errors ? "all" : "noise"),
                     "all: noise, calibration, zero levels"});
    cards.push_back({"CREATOR", "Foreglow " + version(), "program that made this map"});
    return layout;
}

void write_maps(const fs::path& path, const FitsMapLayout& layout,
                const std::vector<const std::vector<double>*>& maps) {
    std::vector<std::span<const double>> columns;
    columns.reserve(maps.size());
    for (const auto* map : maps)
        columns.emplace_back(*map);
    write_fits_map(path, layout, columns);
}

void write_index(const fs::path& path, const IndexResult& result) {
    std::vector<FitsMapColumnName> columns{{"INDEX", ""}, {"INDEX_ERROR", ""}};
    std::vector<const std::vector<double>*> maps{&result.maps.index, &result.maps.index_error};
    if (result.spec.curvature) {
        columns.push_back({"CURVATURE", ""});
        columns.push_back({"CURVATURE_ERROR", ""});
        maps.push_back(&result.maps.curvature);
        maps.push_back(&result.maps.curvature_error);
    }
    write_maps(path, make_layout(result, std::move(columns), "INDEX"), maps);
}

void write_amplitude(const fs::path& path, const IndexResult& result) {
    FitsMapLayout layout =
        make_layout(result, {{"AMPLITUDE", "K_RJ"}, {"AMPLITUDE_ERROR", "K_RJ"}}, "AMPLITUDE");
    layout.cards.push_back({"KSCALE", std::string("RJ"), "kelvin of Rayleigh-Jeans brightness"});
    write_maps(path, layout, {&result.maps.amplitude, &result.maps.amplitude_error});
}

std::string make_scatter_csv(const IndexResult& result) {
    ResultRows rows({"nside", "pixel", "lon_deg", "lat_deg", "frame", "low_Hz", "high_Hz", "pixels",
                     "correlation", "slope", "slope_error", "intercept_K_RJ", "intercept_error_K_RJ", "index",
                     "index_error", "index_forward", "index_reverse"});
    for (const ScatterCell& cell : result.cells) {
        JsonValue lon, lat;
        if (cell.nside > 0) {
            const Vector3 n = HealpixGrid(cell.nside).direction(cell.pixel);
            const double degrees = 180 / constants::pi;
            const double turn = std::atan2(n[1], n[0]) * degrees;
            lon = turn < 0 ? turn + 360 : turn;
            lat = std::atan2(n[2], std::hypot(n[0], n[1])) * degrees;
        }
        rows.add({cell.nside, cell.pixel, lon, lat, to_text(result.spec.frame),
                  result.smoothed.surveys[cell.low].frequency.hz(),
                  result.smoothed.surveys[cell.high].frequency.hz(), cell.pixels, cell.correlation,
                  cell.slope, cell.slope_error, cell.intercept, cell.intercept_error, cell.index,
                  cell.index_error, cell.index_forward, cell.index_reverse});
    }
    return rows.text(RowFormat::Csv);
}

double mean_of(const std::vector<double>& values) {
    double sum = 0;
    std::int64_t count = 0;
    for (const double value : values)
        if (std::isfinite(value)) {
            sum += value;
            ++count;
        }
    return count > 0 ? sum / static_cast<double>(count) : 0.0;
}

JsonValue describe_surveys(const IndexResult& result) {
    JsonValue::Array array;
    for (std::size_t s = 0; s < result.smoothed.surveys.size(); ++s) {
        const SmoothedSurvey& survey = result.smoothed.surveys[s];
        JsonValue::Object one{{"map", survey.name},
                              {"frequency_Hz", survey.frequency.hz()},
                              {"beam_fwhm_deg", result.spec.surveys[s].beam_fwhm.degrees()},
                              {"smoothed_with_fwhm_deg", survey.extra_beam.degrees()},
                              {"noise_rms_K_RJ", std::sqrt(mean_of(survey.variances))},
                              {"calibration_error", survey.calibration_error},
                              {"zero_level_K_RJ", survey.zero_level},
                              {"zero_level_error_K_RJ", survey.zero_level_error},
                              {"undefined_pixels", survey.undefined}};
        if (result.zero_levels) {
            one.emplace_back("fitted_zero_level_K_RJ", survey.zero_level + result.zero_levels->levels[s]);
            one.emplace_back("fitted_zero_level_error_K_RJ", std::sqrt(result.zero_levels->covariance(s, s)));
        }
        array.push_back(std::move(one));
    }
    return array;
}

JsonValue describe_method(const IndexResult& result) {
    const SmoothingReport& report = result.smoothed.report;
    return JsonValue::Object{
        {"smoothing", report.pixel_for_pixel
                          ? "none: all surveys are on the output's grid, frame and resolution"
                          : "through a_lm to one Gaussian beam"},
        {"lmax", report.lmax},
        {"common_window_at_lmax", report.window_at_lmax},
        {"fit", "log space where every brightness exceeds " + format_number(log_space_signal_to_noise, 3) +
                    " times its noise and zero-level error, else likelihood in linear space"},
        {"errors", result.common_errors ? "noise, calibration and zero levels" : "noise"},
        {"scatter",
         "errors on both axes in the ratio of the surveys' noise (Deming); symmetric without noise; errors "
         "by "
         "jackknife over 16 blocks of a cell"},
        {"scatter_nside", result.spec.scatter_nside}};
}

JsonValue describe_pixels(const IndexMaps& maps) {
    const auto count = [&](IndexVerdict verdict) { return maps.verdicts[static_cast<std::size_t>(verdict)]; };
    return JsonValue::Object{{"defined", count(IndexVerdict::Good)},
                             {"in_linear_space", maps.in_linear_space},
                             {"with_fewer_surveys", maps.with_fewer_surveys},
                             {"undefined_too_few_surveys", count(IndexVerdict::TooFew)},
                             {"undefined_not_positive", count(IndexVerdict::NotPositive)},
                             {"undefined_too_uncertain", count(IndexVerdict::Undecided)},
                             {"undefined_not_converged", count(IndexVerdict::NotConverged)}};
}

std::vector<fs::path> list_inputs(const SurveysSpec& spec) {
    std::vector<fs::path> inputs{spec.file};
    for (const SurveySpec& survey : spec.surveys) {
        inputs.push_back(survey.map.path);
        if (survey.noise_map) inputs.push_back(survey.noise_map->path);
    }
    std::sort(inputs.begin(), inputs.end());
    inputs.erase(std::unique(inputs.begin(), inputs.end()), inputs.end());
    return inputs;
}

}  // namespace

std::vector<std::string> write_index_files(const IndexResult& result, OutputFolder& folder) {
    write_index(folder.prepare("index.fits"), result);
    write_amplitude(folder.prepare("amplitude.fits"), result);
    write_text_file(folder.prepare("scatter.csv"), make_scatter_csv(result));
    return {"amplitude.fits", "index.fits", "scatter.csv"};
}

std::string describe_undefined(const IndexResult& result) {
    const std::string needed = result.spec.curvature ? "3" : "2";
    const std::array<std::string, index_verdicts> reasons{
        "", "lack defined values at " + needed + " frequencies",
        "are not positive at " + needed + " frequencies",
        "have an error of ln T above " + format_number(largest_log_error, 3), "did not converge"};
    std::string list;
    std::int64_t undefined = 0, all = 0;
    for (std::size_t v = 0; v < index_verdicts; ++v) {
        const std::int64_t count = result.maps.verdicts[v];
        all += count;
        if (v == 0 || count == 0) continue;
        undefined += count;
        list += (list.empty() ? "" : ", ") + std::to_string(count) + " " + reasons[v];
    }
    if (undefined == 0) return "";
    return std::to_string(undefined) + " of " + std::to_string(all) + " pixels are undefined: " + list;
}

std::string make_index_manifest(const IndexResult& result, const std::vector<std::string>& outputs,
                                const OutputFolder& folder, const Progress& progress) {
    const std::vector<fs::path> inputs = list_inputs(result.spec);
    JsonValue::Object manifest{
        {"program", "Foreglow"},
        {"version", version()},
        {"build", build_description()},
        {"command", "index"},
        {"title", result.spec.title},
        {"nside", result.spec.nside},
        {"reference_frequency_Hz", result.spec.reference_frequency.hz()},
        {"beam_fwhm_deg", result.spec.beam_fwhm.degrees()},
        {"conventions",
         JsonValue::Object{{"unit", "K_RJ"},
                           {"frame", to_text(result.spec.frame)},
                           {"ordering", "RING"},
                           {"index",
                            "beta: T ~ nu^beta, brightness temperature, local at the reference "
                            "frequency; flux index alpha = beta + 2"},
                           {"curvature", "c: T ~ (nu/nu0)^(beta + c ln(nu/nu0))"},
                           {"errors", "one sigma, marginal"},
                           {"T_CMB_K", constants::t_cmb}}},
        {"method", describe_method(result)},
        {"surveys", describe_surveys(result)},
        {"pixels", describe_pixels(result.maps)},
        {"warnings", describe_texts_without_folders(progress.warnings(), inputs)},
        {"notices", describe_texts_without_folders(progress.notices(), inputs)},
        {"inputs", describe_input_files(inputs)},
        {"outputs", describe_output_files(folder.path(), outputs, false)},
        {"threads", thread_count()},
        {"timings", describe_timings(progress)},
        {"surveys_file", without_absolute_paths(result.spec.source)}};
    return write_json(manifest);
}

}  // namespace foreglow
