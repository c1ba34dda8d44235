// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/make_report.h"

#include <algorithm>
#include <cmath>

#include "base/build_info.h"
#include "base/text.h"
#include "jobs/detail_summary.h"
#include "picture/report_page.h"
#include "picture/sky_picture.h"

namespace foreglow {
namespace {

constexpr int picture_width = 640;

std::string unit_sentence(const BrightnessUnit& unit) {
    switch (unit.kind) {
        case BrightnessUnit::Kind::RayleighJeans:
            return "Rayleigh-Jeans brightness temperature";
        case BrightnessUnit::Kind::Thermodynamic:
            return "CMB temperature difference, linearised at T_CMB = 2.7255 K";
        case BrightnessUnit::Kind::MegajanskyPerSteradian:
            return "specific intensity";
        case BrightnessUnit::Kind::JanskyPerPixel:
            return "flux density of one pixel";
    }
    return "";
}

void add_facts(const Plan& plan, const SkyModel& sky, ReportContent& page) {
    const StudySpec& study = plan.study;
    page.facts.push_back({"Model", plan.model.name, plan.model.title});
    page.facts.push_back(
        {"Reference frequency", to_text(sky.reference), "where amplitude, index and curvature hold"});
    page.facts.push_back({"Grid", "nside " + std::to_string(study.nside),
                          (study.ordering == Ordering::Ring ? "RING order" : "NESTED order") +
                              std::string(plan.coverage ? ", partial sky" : ", full sky")});
    page.facts.push_back({"Channels", std::to_string(plan.channels.size()), ""});
    if (sky.beam_fwhm)
        page.facts.push_back(
            {"Template's own beam", to_text(*sky.beam_fwhm), "there is no structure below it"});
    page.conventions.push_back({"Unit", to_text(study.unit), unit_sentence(study.unit)});
    page.conventions.push_back(
        {"Frame", to_text(study.frame), std::string("COORDSYS = ") + coordsys_letter(study.frame)});
    if (study.polarized)
        page.conventions.push_back({"Sign of U",
                                    study.convention == PolarizationConvention::Cosmo ? "COSMO" : "IAU",
                                    "written as POLCCONV; pictures on this page are in COSMO"});
    page.conventions.push_back(
        {"Index", "T ~ nu^beta", "of brightness temperature; the flux index is alpha = beta + 2"});
    page.conventions.push_back(
        {"Curvature", "T ~ (nu/nu0)^(beta + c ln(nu/nu0))", "beta is the local index at nu0"});
}

void add_pictures(const Plan& plan, const MakeResult& result, ReportContent& page) {
    AllSkyPainter painter;
    for (const Preview& preview : result.previews) {
        const auto draw = [&](const SkyMap& map, const std::string& quantity, ScaleKind scale) {
            if (std::none_of(map.values.begin(), map.values.end(), [](double v) { return is_defined(v); }))
                return;
            PictureOptions options;
            options.title = preview.channel + ": " + quantity;
            options.quantity = quantity;
            options.width = picture_width;
            options.few_colours = true;
            options.scale.kind = scale;
            Picture picture = painter.draw(map, options);
            ReportFigure figure;
            figure.png = std::move(picture.png);
            figure.width = picture.width;
            figure.height = picture.height;
            figure.caption = quantity + " of channel " + preview.channel + ", " + to_text(plan.study.unit) +
                             ", " + to_text(plan.study.frame) + " frame; longitude grows to the left.";
            figure.alternative = "All-sky map of " + quantity + " in channel " + preview.channel;
            page.figures.push_back(std::move(figure));
        };
        const SkyMap& i = preview.columns.front();
        const bool positive = std::none_of(i.values.begin(), i.values.end(), [](double v) { return v <= 0; });
        draw(i, "I", positive ? ScaleKind::Log : ScaleKind::Signed);
        if (preview.columns.size() < 3) continue;
        SkyMap p = i;
        for (std::size_t n = 0; n < p.values.size(); ++n) {
            const double q = preview.columns[1].values[n], u = preview.columns[2].values[n];
            p.values[n] = std::sqrt(q * q + u * u);
        }
        draw(p, "P", ScaleKind::Log);
        if (&preview == &result.previews.front()) {
            draw(preview.columns[1], "Q", ScaleKind::Signed);
            draw(preview.columns[2], "U", ScaleKind::Signed);
        }
    }
}

void add_chart(const Plan& plan, const MakeResult& result, ReportContent& page) {
    if (plan.channels.size() < 2) return;
    ReportChart chart;
    chart.chart.title = "Brightness against frequency";
    chart.chart.description = "rms over the sky of I, and of P where there is polarization, for each channel";
    chart.chart.x = {"Frequency [GHz]", true, {}, {}};
    chart.chart.y = {"rms over the sky [" + to_text(plan.study.unit) + "]", true, {}, {}};
    ChartSeries i, p;
    i.label = "I";
    p.label = "P";
    std::vector<std::size_t> order(plan.channels.size());
    for (std::size_t c = 0; c < order.size(); ++c)
        order[c] = c;
    std::stable_sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) {
        return plan.channels[a].reference < plan.channels[b].reference;
    });
    for (const std::size_t c : order) {
        const double ghz = plan.channels[c].reference.ghz();
        i.x.push_back(ghz);
        i.y.push_back(result.channels[c].i.rms());
        p.x.push_back(ghz);
        p.y.push_back(std::hypot(result.channels[c].q.rms(), result.channels[c].u.rms()));
        const double half = plan.channels[c].bandwidth ? 0.5 * plan.channels[c].bandwidth->ghz() : 0.0;
        i.half_widths.push_back(half);
    }
    if (order.size() > 50) i.has_marks = p.has_marks = false;
    chart.chart.series.push_back(std::move(i));
    if (plan.study.polarized) chart.chart.series.push_back(std::move(p));
    chart.caption =
        "rms over the defined pixels, monopole included, after band and beam; bars show the bandwidths.";
    page.charts.push_back(std::move(chart));
}

void add_accuracy(const Plan& plan, const MakeResult& result, ReportContent& page) {
    double worst = 0;
    for (const ChannelOutcome& outcome : result.channels)
        worst = std::max(worst, outcome.accuracy);
    page.accuracy.push_back({"Asked for", format_number(plan.study.accuracy, 2), "`accuracy` in the study"});
    page.accuracy.push_back(
        {"Reached by the worst channel", format_number(worst, 2),
         "rms(error)/rms(map) against the exact law; maps without beams: relative error of every pixel"});
    if (!result.has_harmonic) return;
    page.accuracy.push_back(
        {"Component maps", std::to_string(result.harmonic.intensity_components),
         plan.study.polarized
             ? "for I, and " + std::to_string(result.harmonic.polarized_components) + " for Q, U"
             : "for I"});
    page.accuracy.push_back({"Left by the transforms", format_number(result.harmonic.transform_error, 2),
                             "ring weights; refinements: " + std::to_string(result.harmonic.iterations) +
                                 " of " + std::to_string(result.harmonic.refined) + " component maps"});
}

void add_tables(const Plan& plan, const MakeResult& result, ReportContent& page) {
    ReportTable table;
    table.title = "Channels";
    table.note = "Numbers of the maps as written, in " + to_text(plan.study.unit) + ".";
    table.header = {"Channel",  "Frequency", "Bandwidth", "Beam FWHM", "Mean I",
                    "Lowest I", "Highest I", "Undefined", "Accuracy"};
    constexpr std::size_t most_rows = 60;
    for (std::size_t c = 0; c < std::min(plan.channels.size(), most_rows); ++c) {
        const Channel& channel = plan.channels[c];
        const ChannelOutcome& outcome = result.channels[c];
        table.rows.push_back(
            {channel.name, to_text(channel.reference),
             channel.bandwidth ? to_text(*channel.bandwidth) : "single",
             channel.beam_fwhm ? to_text(*channel.beam_fwhm) : (channel.beam ? "tabulated" : "none"),
             format_number(outcome.i.mean(), 4), format_number(outcome.i.lowest, 4),
             format_number(outcome.i.highest, 4), std::to_string(outcome.i.undefined),
             format_number(outcome.accuracy, 2)});
    }
    if (plan.channels.size() > most_rows)
        table.note += " The first " + std::to_string(most_rows) + " of " +
                      std::to_string(plan.channels.size()) + " channels; run.json has all.";
    page.tables.push_back(std::move(table));
}

}  // namespace

std::string make_report(const Plan& plan, const SkyModel& sky, const MakeResult& result,
                        const Progress& progress) {
    const StudySpec& study = plan.study;
    ReportContent page;
    page.title = study.title.empty() ? "Foreglow: simulated sky maps" : study.title;
    page.subtitles.push_back(std::to_string(plan.channels.size()) + " channels, nside " +
                             std::to_string(study.nside) + ", " + (study.polarized ? "I, Q, U" : "I") + ", " +
                             to_text(study.unit));
    for (const std::string& label : sky.labels)
        page.subtitles.push_back(label);
    page.warnings = progress.warnings();
    add_facts(plan, sky, page);
    add_pictures(plan, result, page);
    add_detail(plan, result, page);
    add_chart(plan, result, page);
    add_accuracy(plan, result, page);
    add_tables(plan, result, page);
    constexpr std::size_t most_files = 40;
    for (const PlannedFile& file : plan.files) {
        if (page.files.size() == most_files) break;
        ReportFile entry{file.name, file.what, std::nullopt};
        if (file.bytes > 0) entry.bytes = static_cast<std::uint64_t>(file.bytes);
        page.files.push_back(std::move(entry));
    }
    const std::string first = plan.files.front().name;
    page.how_to_open.push_back({"in Python", "healpy.read_map(\"" + first + "\", field=None)"});
    page.how_to_open.push_back({"a picture", "foreglow draw " + first});
    page.footer = "Foreglow " + version();
    return write_report_page(page);
}

}  // namespace foreglow
