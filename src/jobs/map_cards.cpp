// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/map_cards.h"

#include "base/build_info.h"
#include "base/text.h"

namespace foreglow {
namespace {

using Kind = BrightnessUnit::Kind;

std::string scale_card(const BrightnessUnit& unit) {
    if (unit.kind == Kind::RayleighJeans) return "RJ";
    if (unit.kind == Kind::Thermodynamic) return "CMB";
    return "";
}

std::vector<FitsMapColumnName> stokes_columns(bool polarized, const std::string& unit) {
    if (polarized) return {{"I_STOKES", unit}, {"Q_STOKES", unit}, {"U_STOKES", unit}};
    return {{"I_STOKES", unit}};
}

void add_origin(FitsMapLayout& layout, const Plan& plan, const SkyModel& sky) {
    layout.cards.push_back({"CREATOR", "Foreglow " + version(), "program that made this map"});
    layout.cards.push_back({"SKYMODEL", plan.model.name, "model of the sky"});
    for (const std::string& label : sky.labels)
        layout.cards.push_back({"SKYNOTE", label.substr(0, 66), ""});
    layout.cards.push_back(
        {"SEED", static_cast<std::int64_t>(plan.study.seed), "of the study's random parts"});
}

}  // namespace

FitsMapLayout make_channel_layout(const Plan& plan, const SkyModel& sky, const Channel& channel,
                                  int realization, double accuracy, bool with_beam) {
    const StudySpec& study = plan.study;
    const Coverage* coverage = plan.coverage ? &*plan.coverage : nullptr;
    FitsMapLayout layout = make_study_layout(
        study, coverage, stokes_columns(study.polarized, to_text(study.unit)), study.polarized);
    layout.extname = "SKY";
    auto& cards = layout.cards;
    if (const std::string scale = scale_card(study.unit); !scale.empty())
        cards.push_back(
            {"KSCALE", scale,
             scale == "RJ" ? "kelvin of Rayleigh-Jeans brightness" : "kelvin of the CMB, linearised"});
    cards.push_back({"CHANNEL", channel.name, "name in the study"});
    cards.push_back({"FREQ", channel.reference.hz(), "[Hz] reference frequency"});
    if (channel.bandwidth)
        cards.push_back({"BANDWID", channel.bandwidth->hz(), "[Hz] full width of the response"});
    if (with_beam && channel.beam_fwhm)
        cards.push_back({"BEAMFWHM", channel.beam_fwhm->degrees(), "[deg] FWHM of the channel's beam"});
    if (sky.beam_fwhm)
        cards.push_back({"SKYFWHM", sky.beam_fwhm->degrees(), "[deg] FWHM of the template's own beam"});
    if (study.pixel_window && with_beam)
        cards.push_back({"PIXWIN", true, "multiplied by HEALPix's pixel window"});
    if (study.remove_monopole && with_beam)
        cards.push_back({"MONOPOLE", "removed", "mean of the defined pixels of I"});
    add_origin(layout, plan, sky);
    cards.push_back({"REALIZ", static_cast<std::int64_t>(realization), "realization"});
    cards.push_back({"ACCURACY", accuracy, "reached: rms(error)/rms(map), or of each pixel"});
    return layout;
}

FitsMapLayout make_truth_layout(const Plan& plan, const SkyModel& sky, std::vector<FitsMapColumnName> columns,
                                bool polarized, std::optional<int> realization) {
    const Coverage* coverage = plan.coverage ? &*plan.coverage : nullptr;
    const bool is_brightness = !columns.front().unit.empty();
    FitsMapLayout layout = make_study_layout(plan.study, coverage, std::move(columns), polarized);
    layout.extname = "TRUTH";
    if (is_brightness) layout.cards.push_back({"KSCALE", "RJ", "kelvin of Rayleigh-Jeans brightness"});
    layout.cards.push_back({"FREQ", sky.reference.hz(), "[Hz] reference frequency, where this holds"});
    if (sky.beam_fwhm)
        layout.cards.push_back(
            {"SKYFWHM", sky.beam_fwhm->degrees(), "[deg] FWHM of the template's own beam"});
    add_origin(layout, plan, sky);
    if (realization)
        layout.cards.push_back({"REALIZ", static_cast<std::int64_t>(*realization), "realization"});
    return layout;
}

}  // namespace foreglow
