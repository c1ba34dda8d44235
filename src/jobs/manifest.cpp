// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/manifest.h"

#include <algorithm>

#include "base/build_info.h"
#include "base/error.h"
#include "base/parallel.h"
#include "io/json_value.h"
#include "jobs/detail_summary.h"
#include "jobs/manifest_parts.h"

namespace foreglow {
namespace {

namespace fs = std::filesystem;

void add_source(const std::optional<MapSource>& source, std::vector<fs::path>& inputs) {
    if (source) inputs.push_back(source->path);
}

void add_value(const ValueOrMap& value, std::vector<fs::path>& inputs) {
    if (const auto* source = std::get_if<MapSource>(&value)) inputs.push_back(source->path);
}

// Over which slopes the sky's electrons range, and how many indices were out of reach.
JsonValue describe_electrons(const ElectronSky& electrons) {
    const Interval& slope = electrons.shape->range().slope;
    return JsonValue::Object{{"lowest_slope", slope.low},
                             {"highest_slope", slope.high},
                             {"clamped_pixels", electrons.clamped_pixels}};
}

JsonValue describe_channels(const Plan& plan, const MakeResult& result) {
    JsonValue::Array array;
    for (std::size_t c = 0; c < plan.channels.size(); ++c) {
        const Channel& channel = plan.channels[c];
        const ChannelOutcome& outcome = result.channels[c];
        JsonValue::Object one{{"name", channel.name}, {"frequency_Hz", channel.reference.hz()}};
        if (channel.bandwidth) one.emplace_back("bandwidth_Hz", channel.bandwidth->hz());
        if (channel.beam_fwhm) one.emplace_back("beam_fwhm_deg", channel.beam_fwhm->degrees());
        one.emplace_back("route", outcome.per_pixel ? "law in each pixel" : "a_lm");
        one.emplace_back("accuracy", outcome.accuracy);
        one.emplace_back("mean", outcome.i.mean());
        one.emplace_back("rms", outcome.i.rms());
        one.emplace_back("lowest", outcome.i.lowest);
        one.emplace_back("highest", outcome.i.highest);
        one.emplace_back("undefined_pixels", outcome.i.undefined);
        one.emplace_back("negative_pixels", outcome.i.negative);
        if (plan.study.remove_monopole) one.emplace_back("mean_removed", outcome.mean_removed);
        array.push_back(std::move(one));
    }
    return array;
}

JsonValue describe_accuracy(const Plan& plan, const MakeResult& result) {
    double worst = 0;
    for (const ChannelOutcome& outcome : result.channels)
        worst = std::max(worst, outcome.accuracy);
    JsonValue::Object accuracy{{"asked", plan.study.accuracy}, {"reached", worst}};
    if (result.has_harmonic) {
        accuracy.emplace_back("intensity_components",
                              static_cast<std::int64_t>(result.harmonic.intensity_components));
        accuracy.emplace_back("polarized_components",
                              static_cast<std::int64_t>(result.harmonic.polarized_components));
        accuracy.emplace_back("intensity_skeletons",
                              static_cast<std::int64_t>(result.harmonic.intensity_skeletons));
        accuracy.emplace_back("polarized_skeletons",
                              static_cast<std::int64_t>(result.harmonic.polarized_skeletons));
        accuracy.emplace_back("rank_error", result.harmonic.rank_error);
        accuracy.emplace_back("transform_error", result.harmonic.transform_error);
        accuracy.emplace_back("transform_refinements", result.harmonic.iterations);
        accuracy.emplace_back("refined_components", static_cast<std::int64_t>(result.harmonic.refined));
        accuracy.emplace_back("worst_cl_ratio", result.harmonic.worst_cl_ratio);
    }
    return accuracy;
}

JsonValue describe_conventions(const StudySpec& study) {
    JsonValue::Object conventions{{"unit", to_text(study.unit)},
                                  {"frame", to_text(study.frame)},
                                  {"ordering", study.ordering == Ordering::Ring ? "RING" : "NESTED"},
                                  {"index",
                                   "beta: T ~ nu^beta, brightness temperature, local at the reference "
                                   "frequency; flux index alpha = beta + 2"},
                                  {"curvature", "c: T ~ (nu/nu0)^(beta + c ln(nu/nu0))"},
                                  {"T_CMB_K", 2.7255}};
    if (study.polarized)
        conventions.emplace_back("polarization",
                                 study.convention == PolarizationConvention::Cosmo ? "COSMO" : "IAU");
    return conventions;
}

}  // namespace

std::vector<fs::path> list_plan_inputs(const Plan& plan) {
    std::vector<fs::path> inputs;
    if (!plan.study.file.empty()) inputs.push_back(plan.study.file);
    const ModelSpec& model = plan.model;
    if (!model.file.empty()) inputs.push_back(model.file);
    if (model.intensity) inputs.push_back(model.intensity->map.path);
    add_value(model.index.value, inputs);
    add_value(model.curvature, inputs);
    if (model.electrons) {
        add_source(model.electrons->field_map, inputs);
        add_source(model.electrons->break_energy_map, inputs);
        add_source(model.electrons->cutoff_energy_map, inputs);
    }
    if (model.polarization && plan.study.polarized) {
        add_source(model.polarization->map, inputs);
        add_source(model.polarization->angle_map, inputs);
        if (model.polarization->fraction) add_value(*model.polarization->fraction, inputs);
        if (model.polarization->index) add_value(*model.polarization->index, inputs);
    }
    if (model.detail && model.detail->spectrum) inputs.push_back(*model.detail->spectrum);
    for (const ChannelSpec& channel : plan.study.channels) {
        if (channel.response) inputs.push_back(*channel.response);
        if (channel.beam_window) inputs.push_back(*channel.beam_window);
    }
    if (plan.study.coverage) inputs.push_back(*plan.study.coverage);
    std::sort(inputs.begin(), inputs.end());
    inputs.erase(std::unique(inputs.begin(), inputs.end()), inputs.end());
    return inputs;
}

std::string make_manifest(const Plan& plan, const MakeResult& result, const Progress& progress,
                          bool with_sha256) {
    const std::vector<fs::path> inputs = list_plan_inputs(plan);
    JsonValue::Array realizations;
    for (const int r : plan.realizations)
        realizations.emplace_back(r);
    JsonValue::Object manifest{{"program", "Foreglow"},
                               {"version", version()},
                               {"build", build_description()},
                               {"title", plan.study.title},
                               {"sky_notes", describe_texts(result.labels)},
                               {"seed", plan.study.seed},
                               {"realizations", std::move(realizations)},
                               {"nside", plan.study.nside},
                               {"lmax", plan.study.lmax},
                               {"reference_frequency_Hz", plan.model.reference_frequency.hz()},
                               {"conventions", describe_conventions(plan.study)},
                               {"accuracy", describe_accuracy(plan, result)},
                               {"channels", describe_channels(plan, result)},
                               {"warnings", describe_texts_without_folders(progress.warnings(), inputs)},
                               {"notices", describe_texts_without_folders(progress.notices(), inputs)},
                               {"inputs", describe_input_files(inputs)},
                               {"outputs", describe_output_files(plan.out, result.outputs, with_sha256)},
                               {"threads", thread_count()},
                               {"timings", describe_timings(progress)},
                               {"study", without_absolute_paths(plan.study.source)},
                               {"model", without_absolute_paths(plan.model.source)}};
    if (result.detail) manifest.emplace_back("detail", describe_detail(plan, result));
    if (result.electrons) manifest.emplace_back("electrons", describe_electrons(*result.electrons));
    return write_json(manifest);
}

std::vector<std::string> list_manifest_outputs(const fs::path& manifest) {
    std::vector<std::string> names;
    std::error_code code;
    if (!fs::exists(manifest, code)) return names;
    try {
        const JsonValue json = read_json(manifest);
        const JsonValue* outputs = json.find("outputs");
        if (outputs == nullptr || outputs->array() == nullptr) return names;
        for (const JsonValue& file : *outputs->array())
            if (const JsonValue* name = file.find("name"); name != nullptr && name->text() != nullptr)
                names.push_back(*name->text());
    } catch (const Error&) {
        names.clear();  // a manifest that cannot be read tells nothing; the files it meant stay
    }
    return names;
}

}  // namespace foreglow
