// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/grade_output.h"

#include <cmath>

#include "base/build_info.h"
#include "base/error.h"
#include "base/parallel.h"
#include "base/text.h"
#include "io/atomic_file.h"
#include "io/fits_map_read.h"
#include "jobs/manifest_parts.h"
#include "model/map_file.h"
#include "sphere/regrid.h"

namespace foreglow {
namespace {

namespace fs = std::filesystem;

std::optional<fs::path> output_folder(const GradeOptions& options, const GradeSource& source) {
    if (options.out) return options.out;
    if (source.is_run) return options.source / "grade";
    return std::nullopt;
}

}  // namespace

GradeOutput::GradeOutput(const GradeOptions& options, const GradeSource& source)
    : options_(options),
      source_(source),
      spectra_({"map", "column", "cut_deg", "l", "residual_cl", "truth_cl"}) {
    if (const auto folder = output_folder(options, source))
        folder_ = std::make_unique<OutputFolder>(*folder, options.replace);
}

void GradeOutput::write_residual(const std::string& name, const HealpixGrid& grid, const std::string& column,
                                 const std::string& unit, std::span<const double> values,
                                 std::vector<FitsCard> cards) {
    if (!folder_) return;
    StudySpec study = source_.study;
    study.nside = grid.nside();
    FitsMapLayout layout = make_study_layout(study, nullptr, {{column, unit}}, false);
    layout.extname = "RESIDUAL";
    layout.cards = std::move(cards);
    layout.cards.push_back({"CREATOR", "Foreglow " + version(), "program that made this map"});
    const std::vector<std::span<const double>> columns{values};
    write_fits_map(folder_->prepare(name + ".fits"), layout, columns);
    names_.push_back(name + ".fits");
}

void GradeOutput::add_spectrum(const std::string& map, const std::string& column, double cut,
                               std::span<const double> residual, std::span<const double> truth) {
    for (std::size_t l = 0; l < residual.size(); ++l)
        spectra_.add({map, column, cut, static_cast<std::int64_t>(l), residual[l], truth[l]});
}

void GradeOutput::finish(const ResultRows& rows, const std::string& kind, Progress& progress) {
    if (!folder_) return;
    write_text_file(folder_->prepare("rows.csv"), rows.text(RowFormat::Csv));
    write_text_file(folder_->prepare("spectra.csv"), spectra_.text(RowFormat::Csv));
    names_.emplace_back("rows.csv");
    names_.emplace_back("spectra.csv");
    std::vector<fs::path> inputs(options_.recovered);
    if (options_.mask) inputs.push_back(*options_.mask);
    std::erase_if(inputs, [](const fs::path& path) { return fs::is_directory(path); });
    const JsonValue::Object manifest{
        {"program", "Foreglow"},
        {"version", version()},
        {"build", build_description()},
        {"command", "grade"},
        {"title", source_.study.title},
        {"kind", kind},
        {"nside", options_.nside.value_or(source_.study.nside)},
        {"unit", to_text(source_.study.unit)},
        {"fit", options_.linear ? "linear" : "log"},
        {"tilt", options_.tilt},
        {"common_beam_deg", options_.common_beam ? JsonValue(options_.common_beam->degrees()) : JsonValue()},
        {"weights", source_.channels.front().noise ? "the channels' noise" : "uniform"},
        {"warnings", describe_texts_without_folders(progress.warnings(), inputs)},
        {"notices", describe_texts_without_folders(progress.notices(), inputs)},
        {"inputs", describe_input_files(inputs)},
        {"outputs", describe_output_files(folder_->path(), names_, false)},
        {"threads", thread_count()},
        {"timings", describe_timings(progress)}};
    write_text_file(folder_->prepare("run.json"), write_json(manifest));
    folder_->keep();
    progress.notice("residual maps, spectra.csv, rows.csv and run.json are in " + folder_->path().string());
}

PixelSelection read_grade_mask(const fs::path& path, const HealpixGrid& grid, Frame frame,
                               Progress& progress) {
    FitsMapRequest request;
    request.path = path;
    request.place = "--mask";
    FitsMap map = read_fits_map(request);
    for (const std::string& notice : map.notices)
        progress.notice(notice);
    if (!map.frame)
        progress.notice(path.filename().string() + " does not say its frame; it is taken to be " +
                        to_text(frame));
    SkyMap mask{map.grid, map.frame.value_or(frame), "", std::move(map.columns[0].values)};
    for (double& value : mask.values)
        value = is_defined(value) && value != 0 ? 1.0 : 0.0;
    if (mask.grid.nside() > grid.nside()) {
        mask.values = degrade(mask.grid, mask.values, grid);
        mask.grid = grid;
    }
    const Matrix3 turn = rotation_between(frame, mask.frame);
    PixelSelection out(static_cast<std::size_t>(grid.npix()));
    std::int64_t kept = 0;
    for (std::int64_t p = 0; p < grid.npix(); ++p) {
        const std::int64_t there = mask.grid == grid && mask.frame == frame
                                       ? p
                                       : mask.grid.pixel_at(rotate(turn, grid.direction(p)));
        const bool keep = mask.values[static_cast<std::size_t>(there)] >= 0.5;
        out[static_cast<std::size_t>(p)] = keep ? 1 : 0;
        kept += keep ? 1 : 0;
    }
    if (kept == 0)
        throw InputError("--mask " + path.string() +
                         " keeps no pixel: pixels that are defined and not zero are kept");
    return out;
}

PixelSelection both_of(const PixelSelection& a, const PixelSelection& b) {
    if (a.empty()) return b;
    if (b.empty()) return a;
    PixelSelection out(a.size());
    for (std::size_t p = 0; p < a.size(); ++p)
        out[p] = a[p] != 0 && b[p] != 0 ? 1 : 0;
    return out;
}

}  // namespace foreglow
