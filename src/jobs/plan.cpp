// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/plan.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <cstdio>

#include "base/error.h"
#include "base/text.h"
#include "jobs/make_patches.h"
#include "jobs/manifest.h"
#include "jobs/output_folder.h"
#include "jobs/resources.h"
#include "model/model_file.h"
#include "picture/typeface.h"

namespace foreglow {
namespace {

ModelSpec read_study_model(const StudySpec& study) {
    return study.model_is_bundled ? read_bundled_model(study.model) : read_model(study.model);
}

bool has_polarization(const ModelSpec& model) {
    return model.sketch.has_value() || model.galaxy.has_value() || model.polarization.has_value();
}

void check_polarization(const StudySpec& study, const ModelSpec& model) {
    if (!study.polarized || has_polarization(model)) return;
    throw InputError(study.model_place + ": the study asks for stokes = \"IQU\" but the model " + model.name +
                     " has no [polarization]: add one to the model, or set `stokes = \"I\"`");
}

std::string number_of(std::int64_t value, int width) {
    std::array<char, 32> buffer{};
    std::snprintf(buffer.data(), buffer.size(), "%0*lld", width, static_cast<long long>(value));
    return buffer.data();
}

std::string describe_channel(const Channel& channel, const StudySpec& study) {
    std::string text = std::string(study.polarized ? "I, Q, U" : "I") + " at " + to_text(channel.reference);
    if (channel.bandwidth) text += ", bandwidth " + to_text(*channel.bandwidth);
    if (channel.beam_fwhm)
        text += ", beam " + to_text(*channel.beam_fwhm);
    else if (channel.beam)
        text += ", tabulated beam";
    return text + ", " + to_text(study.unit);
}

std::vector<FitsMapColumnName> map_columns(const StudySpec& study) {
    if (study.polarized) return {{"I_STOKES", ""}, {"Q_STOKES", ""}, {"U_STOKES", ""}};
    return {{"I_STOKES", ""}};
}

void list_files(Plan& plan) {
    const StudySpec& study = plan.study;
    const Coverage* coverage = plan.coverage ? &*plan.coverage : nullptr;
    const std::int64_t map_bytes =
        fits_map_file_bytes(make_study_layout(study, coverage, map_columns(study), study.polarized));
    for (const int r : plan.realizations)
        for (const Channel& channel : plan.channels)
            plan.files.push_back({"maps/" + map_stem(plan, channel.name, r) + ".fits",
                                  describe_channel(channel, study), map_bytes});
    if (study.truth != TruthLevel::None) {
        const std::int64_t one =
            fits_map_file_bytes(make_study_layout(study, coverage, {{"INDEX", ""}}, false));
        // Where nothing is random, one truth serves all realizations.
        const bool each = is_random(plan.model);
        const std::size_t sets = each ? plan.realizations.size() : 1;
        for (std::size_t k = 0; k < sets; ++k) {
            const auto name = [&](const std::string& what) {
                return "truth/" + (each ? map_stem(plan, what, plan.realizations[k]) : what) + ".fits";
            };
            plan.files.push_back(
                {name("amplitude"), "amplitude at the reference frequency, K_RJ, before beams", map_bytes});
            plan.files.push_back({name("index"), "tangent index there", one});
            plan.files.push_back({name("curvature"), "curvature there", one});
            if (study.truth == TruthLevel::Full)
                for (const Channel& channel : plan.channels)
                    plan.files.push_back(
                        {name("channels/" + channel.name), "the channel's sky before its beam", map_bytes});
        }
    }
    list_patches(plan);
    plan.files.push_back({"report.html", "what a person looks at first", 0});
    plan.files.push_back({"run.json", "manifest, written last", 0});
    for (const PlannedFile& file : plan.files)
        plan.disk_bytes += file.bytes;
}

void check_room(const Plan& plan) {
    const Resources resources = available_resources(plan.out);
    if (plan.memory_bytes > resources.memory_bytes)
        throw InputError("the study wants about " +
                         format_bytes(static_cast<std::uint64_t>(plan.memory_bytes)) + " of memory and " +
                         format_bytes(static_cast<std::uint64_t>(resources.memory_bytes)) +
                         " are free: lower `nside` or `lmax`, or leave the beams away");
    if (plan.disk_bytes > resources.disk_bytes)
        throw InputError("the run would write " + format_bytes(static_cast<std::uint64_t>(plan.disk_bytes)) +
                         " to " + plan.out.string() + " and " +
                         format_bytes(static_cast<std::uint64_t>(resources.disk_bytes)) +
                         " are free there: use another folder, fewer channels, or `precision = \"float32\"`");
}

// --replace takes an earlier run's files away, so that none of them can be read for the new one.
void check_inputs_stay(const Plan& plan) {
    const auto outputs = list_manifest_outputs(plan.out / "run.json");
    for (const std::filesystem::path& input : list_plan_inputs(plan))
        for (const std::string& output : outputs) {
            std::error_code code;
            if (std::filesystem::equivalent(input, plan.out / output, code))
                throw InputError(
                    "--replace would remove " + input.string() +
                    ", which this study reads: give another folder with --out, or copy that file");
        }
}

void add_warnings(Plan& plan) {
    plan.warnings = plan.study.warnings;
    if (plan.coverage && !plan.coverage->says_its_frame)
        plan.warnings.push_back("the coverage " + plan.study.coverage->filename().string() +
                                " does not say its frame (COORDSYS); it is taken to be " +
                                to_text(plan.study.frame));
    plan.warnings.insert(plan.warnings.end(), plan.model.warnings.begin(), plan.model.warnings.end());
    const auto& beam = plan.model.sketch
                           ? std::optional<Angle>(Angle::from_degrees(1.0))
                           : (plan.model.intensity ? plan.model.intensity->beam_fwhm : std::nullopt);
    const double pixel = std::sqrt(HealpixGrid(plan.study.nside).pixel_area());
    for (const Channel& channel : plan.channels) {
        if (!channel.beam_fwhm) continue;
        if (channel.beam_fwhm->radians() < 2.5 * pixel)
            plan.warnings.push_back("channel " + channel.name + ": its beam of " +
                                    to_text(*channel.beam_fwhm) + " is narrower than 2.5 pixels of nside " +
                                    std::to_string(plan.study.nside) +
                                    ", so the map does not hold all of it: raise `nside`");
        if (beam && !plan.model.detail && *channel.beam_fwhm < *beam)
            plan.warnings.push_back("channel " + channel.name + ": its beam of " +
                                    to_text(*channel.beam_fwhm) + " is finer than the template's " +
                                    to_text(*beam) + ", so there is no structure between the two");
    }
}

}  // namespace

std::string map_stem(const Plan& plan, const std::string& channel, int realization) {
    if (plan.study.realizations <= 1) return channel;
    return channel + "_r" + number_of(realization, 4);
}

namespace {

void check_patches(const StudySpec& study, const ModelSpec& model) {
    if (study.patches.empty() || !model.galaxy) return;
    throw InputError(study.file.string() +
                     ": [[patch]] continues a template below its pixels, which the model " + model.name +
                     " has not: it is a Galaxy integrated pixel by pixel; take the patches out");
}

}  // namespace

Plan make_plan(PlanRequest request) {
    check_typeface();  // else a run would fail at its end, at the report
    Plan plan;
    plan.study = std::move(request.study);
    plan.model = read_study_model(plan.study);
    check_polarization(plan.study, plan.model);
    check_patches(plan.study, plan.model);
    plan.channels = make_channels(plan.study);
    plan.model_maps = check_model_maps(plan.model, HealpixGrid(plan.study.nside), plan.study.lmax,
                                       plan.study.polarized, plan.channels);
    plan.cache = std::move(request.cache);
    for (const Channel& channel : plan.channels)
        plan.per_pixel.push_back(is_made_per_pixel(channel, plan.study, plan.model_maps.frame));
    if (plan.study.pixel_window) static_cast<void>(read_pixel_window(plan.study.nside, plan.study.lmax));
    if (plan.study.coverage) plan.coverage = read_study_coverage(plan.study);
    for (int r = 0; r < plan.study.realizations; ++r)
        if (!request.realization || *request.realization == r) plan.realizations.push_back(r);
    if (plan.realizations.empty())
        throw InputError("--realization " + std::to_string(*request.realization) +
                         ": the study has realizations 0 to " + std::to_string(plan.study.realizations - 1) +
                         ": set `realizations` higher, or ask for one of these");
    const std::string stem = plan.study.file.empty() ? "foreglow" : plan.study.file.stem().string();
    plan.out = request.out.value_or(stem + "-out");
    check_output_folder(plan.out, request.replace);
    if (request.replace) check_inputs_stay(plan);
    list_files(plan);
    add_warnings(plan);
    estimate_costs(plan);
    check_room(plan);
    return plan;
}

std::string describe_plan(const Plan& plan) {
    const StudySpec& study = plan.study;
    std::string text;
    const auto line = [&](const std::string& one) { text += one + "\n"; };
    const auto per_pixel = std::count(plan.per_pixel.begin(), plan.per_pixel.end(), true);
    line("study      " + (study.title.empty() ? std::string("(no title)") : study.title));
    line("model      " + plan.model.name + ": " + plan.model.title);
    line("grid       nside " + std::to_string(study.nside) + ", " + to_text(study.frame) + ", " +
         (study.ordering == Ordering::Ring ? "RING" : "NESTED") +
         (plan.coverage ? ", partial sky: " + std::to_string(plan.coverage->ring_pixels.size()) + " pixels"
                        : ", full sky"));
    line("stokes     " + std::string(study.polarized ? "I, Q, U (" : "I") +
         (study.polarized ? (study.convention == PolarizationConvention::Cosmo ? "COSMO)" : "IAU)") : ""));
    line("unit       " + to_text(study.unit) + ", " +
         (study.precision == MapPrecision::Float64 ? "float64" : "float32"));
    line("channels   " + std::to_string(plan.channels.size()) + ": " + std::to_string(per_pixel) +
         " by the law in each pixel, " +
         std::to_string(static_cast<std::ptrdiff_t>(plan.channels.size()) - per_pixel) +
         " through a_lm up to l = " + std::to_string(study.lmax));
    line("accuracy   " + format_number(study.accuracy, 3) +
         " asked for (rms of the error over rms of the map; in maps without beams of every pixel)");
    line("output     " + plan.out.string() + ": " + std::to_string(plan.files.size()) + " files");
    line("disk       " + format_bytes(static_cast<std::uint64_t>(plan.disk_bytes)) +
         " and a few MiB for the report");
    line("memory     about " + format_bytes(static_cast<std::uint64_t>(plan.memory_bytes)));
    line("time       about " + format_number(plan.seconds, 2) + " s on two cores");
    for (const std::string& warning : plan.warnings)
        line("warning    " + warning);
    line("files");
    for (const PlannedFile& file : plan.files)
        line("  " + file.name + "  " +
             (file.bytes > 0 ? format_bytes(static_cast<std::uint64_t>(file.bytes)) + "  " : "") + file.what);
    return text;
}

}  // namespace foreglow
