// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/grade_source.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <cstdio>

#include "base/constants.h"
#include "base/error.h"
#include "base/text.h"
#include "io/fits_map_read.h"
#include "io/hash.h"
#include "io/json_value.h"
#include "io/toml_document.h"
#include "jobs/make_maps.h"
#include "jobs/output_folder.h"
#include "jobs/plan.h"
#include "model/bundled_models.h"
#include "model/detailed_sky.h"
#include "model/filled_share.h"
#include "model/galaxy_cache.h"
#include "model/load_sky.h"
#include "model/study_file.h"
#include "sphere/harmonics.h"
#include "sphere/regrid.h"

namespace foreglow {
namespace {

namespace fs = std::filesystem;

constexpr int coarse_nside = 64;

void remove_key(TomlValue& table, const std::string& key) {
    for (std::size_t i = 0; i < table.keys.size(); ++i) {
        if (table.keys[i] != key) continue;
        table.keys.erase(table.keys.begin() + static_cast<std::ptrdiff_t>(i));
        table.items.erase(table.items.begin() + static_cast<std::ptrdiff_t>(i));
        return;
    }
}

TomlValue* find_item(TomlValue& table, const std::string& key) {
    for (std::size_t i = 0; i < table.keys.size(); ++i)
        if (table.keys[i] == key) return &table.items[i];
    return nullptr;
}

std::string text_of(const JsonValue& json, const std::string& key) {
    const JsonValue* value = json.find(key);
    return value != nullptr && value->text() != nullptr ? *value->text() : std::string();
}

// The SHA-256 that a run noted of an input of that name; "" where it noted none.
std::string noted_sum(const JsonValue& manifest, const std::string& name) {
    const JsonValue* inputs = manifest.find("inputs");
    if (inputs == nullptr || inputs->array() == nullptr) return "";
    for (const JsonValue& input : *inputs->array())
        if (text_of(input, "name") == name) return text_of(input, "sha256");
    return "";
}

// A table that the study names must be the very one that the run was made with.
void check_table(const TomlValue& channel, const std::string& key, const fs::path& folder,
                 const fs::path& run, const JsonValue& manifest) {
    const TomlValue* value = find_value(channel, key);
    if (value == nullptr || value->type != TomlValue::Type::String) return;
    const fs::path path = folder / value->text;
    const std::string start = "the run " + run.string() + " was made with the table " + value->text;
    std::error_code code;
    if (!fs::exists(path, code))
        throw InputError(start + ", which is not beside it: say with --study where its study file is");
    const std::string sum = noted_sum(manifest, fs::path(value->text).filename().string());
    if (!sum.empty() && sha256_of_file(path) != sum)
        throw InputError(start + ", and " + path.string() +
                         " has other content: say with --study where the right one is");
}

// The overrides that make lists behind the study's own text.
std::vector<std::string> listed_overrides(const std::string& text) {
    const std::string mark = "# --set ";
    std::vector<std::string> out;
    std::vector<std::string> lines = split(text, '\n');
    while (!lines.empty() && lines.back().empty())
        lines.pop_back();
    while (!lines.empty() && lines.back().rfind(mark, 0) == 0) {
        out.push_back(lines.back().substr(mark.size()));
        lines.pop_back();
    }
    std::reverse(out.begin(), out.end());
    return out;
}

StudySpec read_run_study(const GradeOptions& options) {
    const fs::path& run = options.source;
    const fs::path file = run / "run.json";
    std::error_code code;
    if (!fs::exists(file, code))
        throw InputError(run.string() +
                         " has no run.json, so it is no finished run: name the folder that make left");
    const JsonValue manifest = read_json(file);
    const std::string text = text_of(manifest, "study");
    if (text.empty())
        throw InputError(file.string() + " holds no study, so " + run.string() +
                         " is not what make left: name a run's folder or a study file");
    fs::path folder = (run / ".." / "").lexically_normal();
    if (options.study)
        folder = fs::is_directory(*options.study, code) ? *options.study : options.study->parent_path();
    TomlValue document = parse_toml(text, file.string() + " (study)");
    for (const std::string& assignment : listed_overrides(text))
        apply_override(document, assignment);
    // What is not needed to know the bands need not be there any more.
    for (const char* key : {"model", "coverage", "patch"})
        remove_key(document, key);
    TomlValue model;
    model.type = TomlValue::Type::String;
    model.text = list_bundled_names().front();
    document.keys.emplace_back("model");
    document.items.push_back(model);
    if (TomlValue* channels = find_item(document, "channel"); channels != nullptr)
        for (TomlValue& channel : channels->items) {
            if (!options.common_beam) remove_key(channel, "beam_window");
            for (const char* key : {"response", "beam_window"})
                check_table(channel, key, folder, run, manifest);
        }
    return make_study(document, folder / "run.json");
}

fs::path find_run_map(const fs::path& run, const std::string& name, std::optional<int> realization) {
    std::array<char, 16> suffix{};
    std::snprintf(suffix.data(), suffix.size(), "_r%04d", realization.value_or(0));
    std::error_code code;
    fs::path plain = run / "maps" / (name + ".fits");
    if (realization.value_or(0) == 0 && fs::exists(plain, code)) return plain;
    fs::path numbered = run / "maps" / (name + suffix.data() + ".fits");
    if (fs::exists(numbered, code)) return numbered;
    throw InputError("the run " + run.string() + " has no map of channel " + name +
                     (realization ? ", realization " + std::to_string(*realization) : "") +
                     ": was it moved away?");
}

double radians_of(double value, const std::string& unit) {
    return parse_angle(format_exact(value) + " " + unit).radians();
}

/// "5 uK_CMB arcmin" in the study's unit per pixel: its own unit's calibration over the band against the
/// study's.
double noise_per_pixel(const std::string& text, const StudySpec& study, std::size_t channel, double weight) {
    const NumberWithUnit quantity = parse_number_with_unit(text);
    const auto blank = quantity.unit.find_last_of(" \t");
    const auto unit = find_brightness_unit(trim(quantity.unit.substr(0, blank)));
    FOREGLOW_EXPECTS(unit.has_value());
    StudySpec other = study;
    other.unit = *unit;
    other.channels = {study.channels[channel]};
    other.channels[0].beam_window.reset();
    const double factor = weight / make_channels(other)[0].band.weights[0];
    const double angle = radians_of(quantity.value, quantity.unit.substr(blank + 1));
    return factor * angle / std::sqrt(HealpixGrid(study.nside).pixel_area());
}

void add_noise(GradeSource& source) {
    const auto has_noise = [](const ChannelSpec& channel) { return channel.noise.has_value(); };
    const auto& channels = source.study.channels;
    if (std::none_of(channels.begin(), channels.end(), has_noise)) return;
    for (std::size_t c = 0; c < channels.size(); ++c) {
        if (!channels[c].noise)
            throw InputError("channel " + channels[c].name +
                             " has no noise while others have, so there are no weights: give `noise` to all "
                             "channels or to none");
        source.channels[c].noise =
            noise_per_pixel(*channels[c].noise, source.study, c, source.channels[c].channel.band.weights[0]);
    }
}

void check_common_beam(const GradeOptions& options, const Channel& channel) {
    if (!channel.beam_fwhm || !options.common_beam) return;
    if (channel.beam_fwhm->radians() > options.common_beam->radians() * (1 + 1e-9))
        throw InputError("--common-beam " + to_text(*options.common_beam) + ": channel " + channel.name +
                         " has a wider beam of " + to_text(*channel.beam_fwhm) +
                         ": give one at least as wide as the widest");
}

GradeSource open_run(const GradeOptions& options) {
    GradeSource source;
    source.study = read_run_study(options);
    source.folder = options.source;
    source.is_run = true;
    for (Channel& channel : make_channels(source.study)) {
        check_common_beam(options, channel);
        fs::path map = find_run_map(source.folder, channel.name, options.realization);
        source.channels.push_back({std::move(channel), std::move(map), std::nullopt});
    }
    return source;
}

// In a temporary folder; every channel has the common beam from the start where one is asked for.
GradeSource make_run(const GradeOptions& options, Progress& progress) {
    GradeSource source;
    source.study = read_study(options.source);
    StudySpec& study = source.study;
    for (const Channel& channel : make_channels(study))
        check_common_beam(options, channel);
    study.nside = std::min(study.nside, options.nside.value_or(coarse_nside));
    study.lmax = std::min(study.lmax, 2 * study.nside);
    study.coverage.reset();
    study.realizations = 1;
    study.ordering = Ordering::Ring;
    study.precision = MapPrecision::Float64;
    study.polarized = false;
    study.warnings.clear();
    if (options.common_beam)
        for (ChannelSpec& channel : study.channels) {
            channel.beam_window.reset();
            channel.beam_fwhm = options.common_beam;
        }
    if (study.unit.kind == BrightnessUnit::Kind::JanskyPerPixel)
        progress.notice("Jy/pixel is that of pixels of nside " + std::to_string(study.nside));
    source.temporary = std::make_unique<TemporaryRun>();
    source.folder = source.temporary->path() / "run";
    const Plan plan = make_plan({study, source.folder, std::nullopt, false, default_cache_folder()});
    for (const std::string& warning : plan.warnings)
        progress.warn(warning);
    progress.notice("graded at nside " + std::to_string(study.nside) +
                    ", up to l = " + std::to_string(study.lmax) + " where there are beams");
    const bool has_phases = plan.model.galaxy.has_value();  // of its own
    if (!has_phases) progress.begin("loading the sky");
    SkyModel loaded = load_sky(plan.model, HealpixGrid(study.nside), study.lmax, false, progress,
                               {plan.channels, study.accuracy, plan.cache});
    if (!has_phases) progress.end();
    const DetailedSky detailed(plan.model, std::move(loaded), study.seed, false, progress);
    const SkyModel sky = detailed.realize(options.realization.value_or(0));
    OutputFolder folder(source.folder, false);
    MakeResult result;
    write_channel_maps(plan, sky, plan.realizations, folder, progress, result);
    folder.keep();
    for (const Channel& channel : plan.channels)
        source.channels.push_back({channel, source.folder / "maps" / (channel.name + ".fits"), std::nullopt});
    return source;
}

std::vector<double> smooth_to_common(const SkyMap& map, const Channel& channel, Angle common, int lmax) {
    const BeamWindow wanted = make_gaussian_beam(common, trusted_lmax(map.grid, lmax));
    std::vector<double> ratio = wanted.temperature;
    for (std::size_t l = 0; l < ratio.size() && channel.beam; ++l) {
        const double own = channel.beam->temperature[l];
        ratio[l] = std::abs(own) > 1e-6 ? ratio[l] / own : 0.0;
        if (ratio[l] > 1.001)
            throw InputError("--common-beam " + to_text(common) + ": channel " + channel.name +
                             " has a beam window below it at l = " + std::to_string(l) +
                             ": give a wider common beam");
    }
    Alm alm = analyse_filled(map, wanted.lmax(), 1e-8).alm;
    multiply_by_l(alm, ratio);
    std::vector<double> out = synthesize(alm, map.grid);
    const FilledShare filled(map.grid, map.frame, map.values, common);
    if (!filled.any()) return out;
    const std::vector<double> share = filled.under_beam(common, map.frame);
    for (std::size_t p = 0; p < out.size(); ++p)
        if (share[p] > largest_filled_share) out[p] = undefined_pixel;
    return out;
}

}  // namespace

GradeSource open_grade_source(const GradeOptions& options, Progress& progress) {
    std::error_code code;
    if (!fs::exists(options.source, code))
        throw InputError(options.source.string() +
                         " does not exist: name a finished run's folder or a study file");
    if (options.nside && !is_valid_nside(*options.nside))
        throw InputError("--nside " + std::to_string(*options.nside) + " is no power of two from 1 to 8192");
    const bool is_run = fs::is_directory(options.source, code);
    if (!is_run && !options.recovered.empty())
        throw InputError("recovered maps are compared with a finished run, and " + options.source.string() +
                         " is a study: make it first, and name its folder");
    GradeSource source = is_run ? open_run(options) : make_run(options, progress);
    if (is_run && options.nside && *options.nside > source.study.nside)
        throw InputError("--nside " + std::to_string(*options.nside) + " is finer than the run's " +
                         std::to_string(source.study.nside) + ": grade on its own grid or a coarser one");
    if (source.study.remove_monopole && options.recovered.empty())
        progress.warn(
            "the maps have their monopoles removed, so that what is left of a channel is no power law");
    add_noise(source);
    return source;
}

std::vector<double> read_grade_column(const fs::path& map, const std::string& column) {
    FitsMapRequest request;
    request.path = map;
    request.columns.emplace_back(column);
    return read_fits_map(request).columns[0].values;
}

std::vector<double> read_grade_channel(const GradeSource& source, const GradeOptions& options,
                                       std::size_t channel, const HealpixGrid& grid) {
    const HealpixGrid own(source.study.nside);
    SkyMap map{own, source.study.frame, "", read_grade_column(source.channels[channel].map, "I_STOKES")};
    if (options.common_beam && source.is_run)
        map.values =
            smooth_to_common(map, source.channels[channel].channel, *options.common_beam, source.study.lmax);
    if (grid == own) return std::move(map.values);
    return degrade(own, map.values, grid);
}

}  // namespace foreglow
