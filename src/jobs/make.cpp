// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/make.h"

#include <algorithm>
#include <optional>
#include <utility>

#include "base/interrupt.h"
#include "base/text.h"
#include "io/atomic_file.h"
#include "jobs/make_maps.h"
#include "jobs/make_patches.h"
#include "jobs/make_report.h"
#include "jobs/manifest.h"
#include "jobs/output_folder.h"
#include "model/detailed_sky.h"
#include "model/electron_sky.h"
#include "model/load_sky.h"

namespace foreglow {
namespace {

void warn_about_result(const Plan& plan, const MakeResult& result, Progress& progress) {
    for (std::size_t c = 0; c < plan.channels.size(); ++c) {
        const ChannelOutcome& outcome = result.channels[c];
        if (outcome.accuracy > 1.001 * plan.study.accuracy + 0x1p-24)
            progress.warn("channel " + plan.channels[c].name + " reached an accuracy of " +
                          format_number(outcome.accuracy, 2) + ", not the " +
                          format_number(plan.study.accuracy, 2) +
                          " asked for: lower `lmax`, raise `nside`, or ask for less");
    }
    if (result.has_harmonic && !result.harmonic.converged)
        progress.warn(
            "the transforms did not converge to what was asked for; the template has structure finer than "
            "lmax " +
            std::to_string(plan.study.lmax) + " that pixels of nside " + std::to_string(plan.study.nside) +
            " cannot tell from larger scales");
}

// A sky that is positive everywhere gets negative pixels when sharp structure is cut off at lmax.
void warn_about_ringing(const Plan& plan, const SkyModel& sky, const MakeResult& result, Progress& progress) {
    if (!result.has_harmonic || plan.study.remove_monopole) return;
    bool positive = true;
    for (const RingStrip& strip : cut_into_strips(sky.grid, std::int64_t{1} << 22)) {
        const SkyStrip values = make_sky_strip(sky, strip, false);
        positive = positive && std::none_of(values.intensity.begin(), values.intensity.end(),
                                            [](double v) { return v < 0; });
    }
    if (!positive) return;
    for (std::size_t c = 0; c < plan.channels.size(); ++c) {
        const ChannelOutcome& outcome = result.channels[c];
        if (outcome.per_pixel || outcome.i.negative == 0) continue;
        progress.warn("channel " + plan.channels[c].name + ": " + std::to_string(outcome.i.negative) +
                      " pixels of I became negative, down to " + format_number(outcome.i.lowest, 3) + " " +
                      to_text(plan.study.unit) +
                      ", though the template is positive: its structure is sharper than lmax " +
                      std::to_string(plan.study.lmax) + " can hold");
    }
}

std::string summarize(const Plan& plan, const MakeResult& result) {
    double worst = 0;
    for (const ChannelOutcome& outcome : result.channels)
        worst = std::max(worst, outcome.accuracy);
    std::string text = std::to_string(plan.channels.size()) + " channels, nside " +
                       std::to_string(plan.study.nside) + ", " + (plan.study.polarized ? "I Q U" : "I") +
                       ", " + to_text(plan.study.unit) + ", " + to_text(plan.study.frame) +
                       "; accuracy reached " + format_number(worst, 2) + "\n";
    text += "report    " + (plan.out / "report.html").string() + "\n";
    text += "maps      " + (plan.out / "maps").string() + "\n";
    if (plan.study.truth != TruthLevel::None) text += "truth     " + (plan.out / "truth").string() + "\n";
    text += "manifest  " + (plan.out / "run.json").string() + "\n";
    return text;
}

void warn_about_counts(const DetailCounts& counts, bool capped, Progress& progress) {
    if (counts.not_positive > 0)
        progress.warn(std::to_string(counts.not_positive) +
                      " pixels of the template are not positive: the lognormal detail is added there, not "
                      "multiplied");
    if (counts.too_polarized > 0)
        progress.warn(std::to_string(counts.too_polarized) +
                      " pixels have P > 0.75 I, more than synchrotron radiation gives" +
                      (capped ? std::string("; Q and U were scaled back there")
                              : std::string(": set cap_polarization = true in [detail] to scale them back")));
}

// Each realization is a sky of its own where something is random, and one sky serves all where nothing is.
// Returns the first one.
SkyModel make_realizations(const Plan& plan, const DetailedSky& sky, OutputFolder& folder, Progress& progress,
                           MakeResult& result) {
    if (sky.has_detail()) result.detail = sky.report();
    const auto& numbers = plan.realizations;
    const PatchWriter patches(plan, sky, progress);
    if (!sky.varies()) {
        SkyModel only = sky.realize(numbers.front());
        write_channel_maps(plan, only, numbers, folder, progress, result);
        write_truth_maps(plan, only, std::nullopt, folder, progress, result);
        for (const int number : numbers)
            patches.write(number, only, folder, result);
        return only;
    }
    SkyModel first = sky.realize(numbers.front(), &result.detail_counts);
    write_channel_maps(plan, first, {numbers.data(), 1}, folder, progress, result);
    write_truth_maps(plan, first, numbers.front(), folder, progress, result);
    if (!plan.study.patches.empty()) {
        progress.begin("writing the patches");
        patches.write(numbers.front(), first, folder, result);
        progress.end();
    }
    warn_about_counts(result.detail_counts, plan.model.detail && plan.model.detail->cap_polarization,
                      progress);
    if (numbers.size() == 1) return first;
    progress.begin("making the other realizations", static_cast<std::int64_t>(numbers.size()) - 1);
    Progress silent;  // a hundred realizations would say the same a hundred times
    for (std::size_t k = 1; k < numbers.size(); ++k) {
        check_interrupt();
        const SkyModel other = sky.realize(numbers[k]);
        write_channel_maps(plan, other, {&numbers[k], 1}, folder, silent, result);
        write_truth_maps(plan, other, numbers[k], folder, silent, result);
        patches.write(numbers[k], other, folder, result);
        progress.step(static_cast<std::int64_t>(k));
    }
    progress.end();
    return first;
}

}  // namespace

MakeSummary run_make(MakeOptions options, Progress& progress) {
    const bool replace = options.plan.replace;
    const Plan plan = make_plan(std::move(options.plan));
    for (const std::string& warning : plan.warnings)
        progress.warn(warning);
    const bool has_phases = plan.model.galaxy.has_value();  // of its own
    if (!has_phases) progress.begin("loading the sky");
    SkyModel loaded =
        load_sky(plan.model, HealpixGrid(plan.study.nside), plan.study.lmax, plan.study.polarized, progress,
                 {plan.channels, plan.study.accuracy, plan.cache});
    if (!has_phases) progress.end();
    const DetailedSky sky(plan.model, std::move(loaded), plan.study.seed, plan.study.polarized, progress);
    OutputFolder folder(plan.out, replace);
    MakeResult result;
    const SkyModel first = make_realizations(plan, sky, folder, progress, result);
    result.electrons = first.electrons;
    if (const std::string clamped = describe_clamped_pixels(first); !clamped.empty()) progress.warn(clamped);
    warn_about_result(plan, result, progress);
    warn_about_ringing(plan, first, result, progress);
    progress.begin("writing the report");
    write_text_file(folder.prepare("report.html"), make_report(plan, first, result, progress));
    result.outputs.emplace_back("report.html");
    progress.end();
    const std::string manifest = make_manifest(plan, result, progress, options.sha256);
    write_text_file(folder.prepare("run.json"), manifest);
    folder.keep();
    return {plan.out, summarize(plan, result)};
}

}  // namespace foreglow
