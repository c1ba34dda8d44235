// SPDX-License-Identifier: GPL-2.0-or-later
#include "estimate/survey_file.h"

#include <algorithm>
#include <set>

#include "base/error.h"
#include "base/text.h"
#include "io/text_file.h"
#include "io/toml_reader.h"
#include "model/model_sections.h"
#include "model/typed_keys.h"

namespace foreglow {
namespace {

// An inline table gives the noise map keys of its own; else they are those of the survey.
std::optional<MapSource> read_noise_map(TomlReader& reader, const MapSource& map,
                                        const std::filesystem::path& folder) {
    const TomlValue* value = reader.find("noise_map");
    if (value == nullptr) return std::nullopt;
    MapSource source = map;
    source.columns.clear();
    source.place = value->place;
    source.section = "[survey]: noise_map";
    if (value->type != TomlValue::Type::Table) {
        source.path = *read_path(reader, "noise_map", folder);
        return source;
    }
    TomlReader inner(*value, "noise_map of " + reader.section());
    const auto path = read_path(inner, "map", folder);
    MapSource own;
    read_map_layout(inner, own);
    inner.check_no_other_keys();
    if (!path) inner.fail_missing("map", "map = \"noise.fits\"");
    own.path = *path;
    own.place = source.place;
    own.section = source.section;
    if (!own.frame) own.frame = source.frame;
    if (!own.unit) own.unit = source.unit;
    if (!own.ordering) own.ordering = source.ordering;
    return own;
}

void check_positive(TomlReader& reader, const std::string& key, const std::optional<Brightness>& value) {
    if (value && !(value->value >= 0))
        reader.fail(key, "must be at least 0, for example \"0.3 K_RJ\", but is " +
                             format_exact(value->value) + " " + to_text(value->unit));
}

void read_errors(TomlReader& reader, SurveySpec& survey, const std::filesystem::path& folder) {
    survey.noise = read_brightness(reader, "noise");
    survey.noise_map = read_noise_map(reader, survey.map, folder);
    if (survey.noise && survey.noise_map)
        reader.fail("noise_map", "contradicts 'noise': keep one of the two");
    survey.calibration_error =
        read_number(reader, "calibration_error", 0, 1, "calibration_error = 0.05").value_or(0);
    survey.zero_level = read_brightness(reader, "zero_level");
    survey.zero_level_error = read_brightness(reader, "zero_level_error");
    check_positive(reader, "noise", survey.noise);
    check_positive(reader, "zero_level_error", survey.zero_level_error);
    if (!survey.noise && !survey.noise_map)
        reader.fail_missing("noise",
                            "noise = \"0.3 K_RJ\" (the rms per pixel of the map as given; or noise_map)");
}

SurveySpec read_survey(TomlReader reader, const std::filesystem::path& folder) {
    SurveySpec survey;
    survey.place = reader.place();
    const auto path = read_path(reader, "map", folder);
    if (path) reader.set_section("[[survey]] '" + path->filename().string() + "'");
    survey.map.section = "[survey]";
    survey.map.place = reader.place_of("map");
    read_map_layout(reader, survey.map);
    const auto frequency = read_frequency(reader, "frequency");
    const auto beam = read_beam_fwhm(reader, "beam_fwhm");
    if (!path) reader.fail_missing("map", "map = \"survey.fits\"");
    survey.map.path = *path;
    read_errors(reader, survey, folder);
    reader.check_no_other_keys();
    if (!frequency) reader.fail_missing("frequency", "frequency = \"408 MHz\"");
    if (!beam) reader.fail_missing("beam_fwhm", "beam_fwhm = \"51 arcmin\"");
    survey.frequency = *frequency;
    survey.beam_fwhm = *beam;
    if (survey.map.columns.empty()) survey.map.columns = {1};
    return survey;
}

int read_nside(TomlReader& reader, const std::string& key, std::int64_t highest) {
    const auto value = read_integer(reader, key, 1, highest, key + " = 128");
    if (!value) return 0;
    if (!is_valid_nside(*value)) reader.fail(key, "must be a power of two, but is " + std::to_string(*value));
    return static_cast<int>(*value);
}

void check_surveys(TomlReader& top, const SurveysSpec& spec) {
    std::set<double> frequencies;
    for (const SurveySpec& survey : spec.surveys)
        frequencies.insert(survey.frequency.hz());
    const std::size_t needed = spec.curvature ? 3 : 2;
    if (frequencies.size() < needed)
        top.fail_here("surveys at " + std::to_string(needed) + " different frequencies are needed" +
                      (spec.curvature ? " for a curvature" : "") + ", and " +
                      std::to_string(frequencies.size()) + " are there: add [[survey]] sections");
    if (spec.surveys.size() > most_surveys)
        top.fail_here("there are " + std::to_string(spec.surveys.size()) + " surveys and at most " +
                      std::to_string(most_surveys) + " go into one fit: take some out");
    bool has_free_level = false;
    for (const SurveySpec& survey : spec.surveys) {
        has_free_level = has_free_level || (survey.zero_level_error && survey.zero_level_error->value > 0);
        if (survey.beam_fwhm.radians() > spec.beam_fwhm.radians() * (1 + 1e-9))
            throw InputError(survey.place + ": the survey " + survey.map.path.filename().string() +
                             " has a beam of " + to_text(survey.beam_fwhm) +
                             ", wider than the common one of " + to_text(spec.beam_fwhm) +
                             ": set `beam_fwhm` at the top of the file to at least the widest");
    }
    if (spec.fit_zero_levels && !has_free_level)
        top.fail("fit_zero_levels",
                 "asks to fit zero levels, but no survey has a zero_level_error, so all are taken as known: "
                 "add `zero_level_error = \"1 K_RJ\"` to those that are not");
}

}  // namespace

SurveysSpec make_surveys(const std::string& text, const std::filesystem::path& file) {
    const TomlValue document = parse_toml(text, file.string());
    TomlReader top(document);
    SurveysSpec spec;
    spec.file = file;
    spec.source = text;
    spec.title = top.text("title", "title = \"Index between two surveys\"").value_or(file.stem().string());
    const auto reference = read_frequency(top, "reference_frequency");
    spec.nside = read_nside(top, "nside", HealpixGrid::max_nside);
    spec.frame = read_choice<Frame>(
                     top, "frame",
                     {{"galactic", Frame::Galactic}, {"icrs", Frame::Icrs}, {"ecliptic", Frame::Ecliptic}})
                     .value_or(Frame::Galactic);
    const auto beam = read_beam_fwhm(top, "beam_fwhm");
    spec.curvature = top.boolean("curvature").value_or(false);
    spec.fit_zero_levels = top.boolean("fit_zero_levels").value_or(false);
    spec.scatter_nside = read_nside(top, "scatter_nside", spec.nside > 0 ? spec.nside : 1);
    for (const TomlReader& reader : top.tables("survey"))
        spec.surveys.push_back(read_survey(reader, file.parent_path()));
    top.check_no_other_keys();
    if (!reference) top.fail_missing("reference_frequency", "reference_frequency = \"1 GHz\"");
    if (spec.nside == 0) top.fail_missing("nside", "nside = 128");
    if (!beam) top.fail_missing("beam_fwhm", "beam_fwhm = \"1 deg\"");
    spec.reference_frequency = *reference;
    spec.beam_fwhm = *beam;
    if (spec.scatter_nside == 0) spec.scatter_nside = std::max(1, spec.nside / 16);
    check_surveys(top, spec);
    std::stable_sort(spec.surveys.begin(), spec.surveys.end(),
                     [](const SurveySpec& a, const SurveySpec& b) { return a.frequency < b.frequency; });
    return spec;
}

SurveysSpec read_surveys(const std::filesystem::path& path) {
    return make_surveys(read_text_file(path, "surveys file"), path);
}

}  // namespace foreglow
