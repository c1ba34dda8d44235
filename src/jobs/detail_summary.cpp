// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/detail_summary.h"

#include <cmath>

#include "base/text.h"

namespace foreglow {
namespace {

std::string fit_text(const SpectrumFit& fit) {
    return "C_l ~ l^" + format_number(fit.slope, 3) + " +- " + format_number(fit.slope_error, 2);
}

std::string fit_note(const SpectrumFit& fit) {
    return "fitted over l = " + std::to_string(fit.lrange.first) + " to " + std::to_string(fit.lrange.last) +
           ", beam taken out; C_l = " + format_number(fit.amplitude, 3) +
           " K_RJ^2 at l = " + format_number(fit.pivot, 3) + " (+- " +
           format_number(100 * fit.log_amplitude_error, 2) + " %), reduced chi^2 " +
           format_number(fit.reduced_chi2, 2);
}

void add_fit_facts(const SpectrumFit& fit, const std::string& what, ReportContent& page) {
    page.facts.push_back({"Spectrum of the " + what, fit_text(fit), fit_note(fit)});
    if (fit.reduced_chi2 > 10)
        page.warnings.push_back(
            "The spectrum of the " + what + " is no power law over the range of its fit (reduced chi^2 " +
            format_number(fit.reduced_chi2, 2) + "): look at the chart, and choose `fit_lrange` with care.");
}

// About two hundred points, evenly spaced in ln l.
ChartSeries line_of(const std::vector<double>& cl, const std::string& label) {
    ChartSeries series;
    series.label = label;
    series.has_marks = false;
    double next = 2;
    for (std::size_t l = 2; l < cl.size(); ++l) {
        const auto ell = static_cast<double>(l);
        if (ell < next) continue;
        series.x.push_back(ell);
        series.y.push_back(cl[l]);
        next = ell * 1.03;
    }
    return series;
}

ChartSeries bins_of(const SpectrumFit& fit, const std::string& label) {
    ChartSeries series;
    series.label = label;
    series.has_line = false;
    for (const SpectrumBin& bin : fit.bins) {
        series.x.push_back(bin.l);
        series.y.push_back(bin.cl);
    }
    return series;
}

JsonValue describe_fit(const SpectrumFit& fit) {
    return JsonValue::Object{{"first_l", fit.lrange.first},
                             {"last_l", fit.lrange.last},
                             {"bins", static_cast<std::int64_t>(fit.bins.size())},
                             {"slope", fit.slope},
                             {"slope_error", fit.slope_error},
                             {"pivot", fit.pivot},
                             {"cl_at_pivot_K2", fit.amplitude},
                             {"relative_error", fit.log_amplitude_error},
                             {"reduced_chi2", fit.reduced_chi2},
                             {"effective_sky_fraction", fit.sky_fraction}};
}

}  // namespace

void add_detail(const Plan& plan, const MakeResult& result, ReportContent& page) {
    if (!result.detail) return;
    const DetailReport& detail = *result.detail;
    const DetailSpec& spec = *plan.model.detail;
    const bool lognormal = detail.form == DetailForm::Lognormal;
    page.facts.push_back(
        {"Structure below the beam", lognormal ? "random, lognormal" : "random, additive",
         "continues the sky's spectrum from the template's beam of " + to_text(detail.intensity_beam) +
             " to l = " + std::to_string(detail.lmax) + "; over " +
             (spec.latitude_cut.radians() > 0 ? "|b| > " + to_text(spec.latitude_cut) : "the whole sky") +
             " its rms is " + format_number(detail.rms_added, 3) + " K_RJ, " +
             format_number(detail.relative_rms, 2) + " of the template's"});
    page.facts.push_back({"Seed", std::to_string(plan.study.seed),
                          "each a_lm is a function of seed, realization, field, l and m"});
    if (detail.intensity_fit) add_fit_facts(*detail.intensity_fit, "intensity template", page);
    if (detail.polarization_fit) add_fit_facts(*detail.polarization_fit, "polarization template (EE)", page);
    ReportChart chart;
    chart.chart.title = "Spectra of the sky and of what was drawn";
    chart.chart.description =
        "C_l of the true sky as continued, and of the random part that completes the template";
    chart.chart.x = {"Multipole l", true, {}, {}};
    chart.chart.y = {"C_l [K_RJ^2]", true, {}, {}};
    auto& series = chart.chart.series;
    series.push_back(line_of(detail.sky.tt, "TT of the sky"));
    series.push_back(line_of(detail.added.tt, "TT drawn"));
    if (detail.intensity_fit) series.push_back(bins_of(*detail.intensity_fit, "TT measured"));
    if (!detail.sky.ee.empty()) {
        series.push_back(line_of(detail.sky.ee, "EE of the sky"));
        series.push_back(line_of(detail.added.ee, "EE drawn"));
        if (detail.polarization_fit) series.push_back(bins_of(*detail.polarization_fit, "EE measured"));
    }
    chart.caption =
        "At the reference frequencies, before beams. The template holds B_l^2 of the sky's power, the draw "
        "the rest; marks are the template's own spectrum with its beam taken out, over the range of the fit.";
    page.charts.push_back(std::move(chart));
}

JsonValue describe_detail(const Plan& plan, const MakeResult& result) {
    const DetailReport& detail = *result.detail;
    JsonValue::Object out{{"form", detail.form == DetailForm::Lognormal ? "lognormal" : "additive"},
                          {"lmax", detail.lmax},
                          {"latitude_cut_deg", plan.model.detail->latitude_cut.degrees()},
                          {"rms_added_K", detail.rms_added},
                          {"relative_rms", detail.relative_rms},
                          {"floored_share_of_sky", detail.floored}};
    if (detail.intensity_fit) out.emplace_back("intensity_fit", describe_fit(*detail.intensity_fit));
    if (detail.polarization_fit) out.emplace_back("polarization_fit", describe_fit(*detail.polarization_fit));
    if (detail.form == DetailForm::Lognormal) {
        out.emplace_back("not_positive_pixels", result.detail_counts.not_positive);
        out.emplace_back("clipped_power", detail.clipped);
        out.emplace_back("largest_rms_of_log", detail.steepest);
    }
    if (plan.study.polarized) {
        out.emplace_back("largest_te_correlation", detail.added.largest_correlation);
        out.emplace_back("capped_multipoles", detail.added.capped);
        out.emplace_back("modulation_overlap", detail.overlap);
        out.emplace_back("too_polarized_pixels", result.detail_counts.too_polarized);
    }
    return out;
}

}  // namespace foreglow
