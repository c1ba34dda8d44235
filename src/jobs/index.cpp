// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/index.h"

#include <cmath>

#include "base/error.h"
#include "base/text.h"
#include "io/atomic_file.h"
#include "jobs/index_files.h"
#include "jobs/manifest.h"
#include "model/map_statistics.h"
#include "physics/spectral_law.h"

namespace foreglow {
namespace {

namespace fs = std::filesystem;

// --replace takes an earlier run's files away, so that none of them can be read for the new one.
void check_inputs_stay(const SurveysSpec& spec, const fs::path& out) {
    const auto outputs = list_manifest_outputs(out / "run.json");
    const auto check = [&](const fs::path& input) {
        for (const std::string& output : outputs) {
            std::error_code code;
            if (fs::equivalent(input, out / output, code))
                throw InputError("--replace would take away " + (out / output).string() +
                                 ", which the surveys file reads: give another folder with --out");
        }
    };
    for (const SurveySpec& survey : spec.surveys) {
        check(survey.map.path);
        if (survey.noise_map) check(survey.noise_map->path);
    }
}

IndexFitSetup make_setup(const IndexResult& result) {
    IndexFitSetup setup;
    setup.log_ratios.reserve(result.smoothed.surveys.size());
    setup.calibration_errors.reserve(result.smoothed.surveys.size());
    for (const SmoothedSurvey& survey : result.smoothed.surveys) {
        setup.log_ratios.push_back(log_frequency_ratio(survey.frequency, result.spec.reference_frequency));
        setup.calibration_errors.push_back(survey.calibration_error);
    }
    setup.zero_level_covariance = result.zero_levels ? result.zero_levels->covariance
                                                     : stated_zero_level_covariance(result.smoothed.surveys);
    setup.curvature = result.spec.curvature;
    setup.common_errors = result.common_errors;
    return setup;
}

void fit_levels(IndexResult& result, Progress& progress) {
    const HealpixGrid grid(result.spec.nside);
    result.zero_levels = fit_zero_levels(grid, result.smoothed.surveys, result.spec.scatter_nside);
    if (!result.zero_levels->converged)
        progress.warn("the fit of the zero levels did not settle; its last values are used");
    for (std::size_t s = 0; s < result.smoothed.surveys.size(); ++s) {
        SmoothedSurvey& survey = result.smoothed.surveys[s];
        const double level = result.zero_levels->levels[s];
        for (double& value : survey.values)
            value -= level;
        progress.notice("zero level of " + survey.name + ": " + format_number(survey.zero_level + level, 5) +
                        " +- " + format_number(std::sqrt(result.zero_levels->covariance(s, s)), 2) + " K_RJ");
    }
}

double scatter_of(const MapStatistics& s) {
    return s.defined > 0 ? std::sqrt(std::max(
                               0.0, s.sum_of_squares / static_cast<double>(s.defined) - s.mean() * s.mean()))
                         : 0.0;
}

void add_map_row(ResultRows& rows, const IndexResult& result, const std::string& quantity,
                 const std::string& unit, const std::vector<double>& values,
                 const std::vector<double>& errors) {
    MapStatistics value, error;
    value.add(values);
    error.add(errors);
    rows.add({quantity, unit, result.spec.surveys.front().frequency.hz(),
              result.spec.surveys.back().frequency.hz(), value.defined, value.mean(), scatter_of(value),
              error.mean()});
}

std::string make_rows(const IndexResult& result, RowFormat format) {
    ResultRows rows({"quantity", "unit", "low_Hz", "high_Hz", "pixels", "value", "scatter", "error"});
    const IndexMaps& maps = result.maps;
    add_map_row(rows, result, "index", "1", maps.index, maps.index_error);
    if (result.spec.curvature)
        add_map_row(rows, result, "curvature", "1", maps.curvature, maps.curvature_error);
    add_map_row(rows, result, "amplitude", "K_RJ", maps.amplitude, maps.amplitude_error);
    for (const ScatterCell& cell : result.cells)
        if (cell.nside == 0)
            rows.add({"index_scatter_plot", "1", result.smoothed.surveys[cell.low].frequency.hz(),
                      result.smoothed.surveys[cell.high].frequency.hz(), cell.pixels, cell.index, JsonValue(),
                      cell.index_error});
    return rows.text(format);
}

}  // namespace

IndexSummary run_index(const IndexOptions& options, Progress& progress) {
    IndexResult result;
    result.spec = read_surveys(options.surveys);
    result.common_errors = !options.noise_errors_only;
    const fs::path out = options.out.value_or(options.surveys.stem().string() + "-out");
    check_output_folder(out, options.replace);
    if (options.replace) check_inputs_stay(result.spec, out);
    result.smoothed = smooth_surveys(result.spec, progress);
    progress.begin("fitting the index");
    if (result.spec.fit_zero_levels) fit_levels(result, progress);
    result.maps = make_index_maps(make_setup(result), result.smoothed.surveys);
    result.cells = make_scatter_cells(HealpixGrid(result.spec.nside), result.smoothed.surveys,
                                      result.spec.scatter_nside, result.common_errors);
    progress.end();
    if (const std::string text = describe_undefined(result); !text.empty()) progress.notice(text);
    if (result.maps.verdicts[static_cast<std::size_t>(IndexVerdict::Good)] == 0)
        throw InputError(options.surveys.string() + ": the surveys say nothing of the index in any pixel (" +
                         describe_undefined(result) + "): see that units, zero levels and errors are right");
    progress.begin("writing the maps");
    OutputFolder folder(out, options.replace);
    const std::vector<std::string> outputs = write_index_files(result, folder);
    progress.end();
    write_text_file(folder.prepare("run.json"), make_index_manifest(result, outputs, folder, progress));
    folder.keep();
    progress.notice("index.fits, amplitude.fits, scatter.csv and run.json are in " + out.string());
    return {out, make_rows(result, options.format)};
}

}  // namespace foreglow
