// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/study_file.h"

#include <bit>
#include <cmath>
#include <limits>
#include <system_error>

#include "base/error.h"
#include "base/text.h"
#include "io/text_file.h"
#include "io/toml_reader.h"
#include "model/bundled_models.h"
#include "model/study_channels.h"
#include "model/study_patches.h"
#include "model/typed_keys.h"

namespace foreglow {
namespace {

constexpr std::int64_t largest_seed = std::numeric_limits<std::int64_t>::max();

/// Says what the nearest powers of two are, or what memory a map above the largest nside would want.
[[noreturn]] void fail_nside(const TomlReader& top, std::int64_t nside) {
    const std::string is = ", but is " + std::to_string(nside);
    if (nside < 1) top.fail("nside", "must be a power of two from 1 to 8192" + is);
    if (nside > HealpixGrid::max_nside) {
        const double bytes = 12.0 * static_cast<double>(nside) * static_cast<double>(nside) * 8;
        const std::string memory =
            bytes < 1e18 ? format_bytes(static_cast<std::uint64_t>(bytes)) : "more than 1 EiB";
        top.fail("nside", "must be at most 8192" + is + ", and one map of it would want " + memory);
    }
    const auto below = static_cast<std::int64_t>(std::bit_floor(static_cast<std::uint64_t>(nside)));
    top.fail("nside", "must be a power of two" + is + ": the nearest are " + std::to_string(below) + " and " +
                          std::to_string(2 * below));
}

std::optional<int> read_nside(TomlReader& top) {
    const auto nside = top.integer("nside", "nside = 256");
    if (!nside) return std::nullopt;
    const bool is_power = *nside > 0 && std::has_single_bit(static_cast<std::uint64_t>(*nside));
    if (!is_power || *nside > HealpixGrid::max_nside) fail_nside(top, *nside);
    return static_cast<int>(*nside);
}

void read_lmax(StudySpec& study, TomlReader& top, const std::optional<std::int64_t>& lmax) {
    study.lmax = 2 * study.nside;
    if (!lmax) return;
    if (*lmax < 1 || *lmax > 4LL * study.nside)
        top.fail("lmax", "must lie between 1 and 4 nside = " + std::to_string(4 * study.nside) + ", but is " +
                             std::to_string(*lmax));
    study.lmax = static_cast<int>(*lmax);
    if (2 * *lmax > 5LL * study.nside)
        study.warnings.push_back(top.place_of("lmax") + ": lmax = " + std::to_string(*lmax) +
                                 " is above 2.5 nside = " + format_number(2.5 * study.nside, 6) +
                                 ", where transforms of pixelized maps are not trustworthy");
}

std::optional<TruthLevel> read_truth(TomlReader& top) {
    const TomlValue* value = top.find("truth");
    if (value == nullptr) return std::nullopt;
    if (value->type == TomlValue::Type::Boolean) return value->boolean ? TruthLevel::Maps : TruthLevel::None;
    if (value->type == TomlValue::Type::String && to_lower(trim(value->text)) == "full")
        return TruthLevel::Full;
    top.fail("truth", "must be false, true or \"full\", but is " + describe(*value));
}

void read_model_key(StudySpec& study, TomlReader& top, const std::string& text,
                    const std::filesystem::path& folder) {
    study.model_place = top.place_of("model");
    study.model_is_bundled = find_bundled_model(text) != nullptr;
    study.model = text;
    if (study.model_is_bundled) return;
    const TomlValue& value = *top.find("model");
    const std::filesystem::path path = value.from_command_line ? std::filesystem::path(text) : folder / text;
    std::error_code code;
    if (!text.empty() && text.find('\0') == std::string::npos && std::filesystem::exists(path, code)) {
        study.model = resolve_path(top, "model", value, text, folder).string();
        return;
    }
    const std::vector<std::string> names = list_bundled_names();
    const std::string nearest = nearest_word(text, names);
    std::string list;
    for (const std::string& name : names)
        list += (list.empty() ? "" : ", ") + name;
    top.fail("model", "is '" + text + "', which is neither a bundled model nor a file" +
                          (value.from_command_line ? "" : " beside the study") +
                          (nearest.empty() ? " (the bundled models: " + list + "): correct the path"
                                           : ": did you mean \"" + nearest + "\"?"));
}

/// Reads the keys that have a default of their own.
void read_plain_keys(StudySpec& study, TomlReader& top, const std::filesystem::path& folder) {
    study.polarized = read_choice<bool>(top, "stokes", {{"I", false}, {"IQU", true}}).value_or(false);
    study.unit = read_unit(top, "unit").value_or(BrightnessUnit{});
    study.precision =
        read_choice<MapPrecision>(top, "precision",
                                  {{"float32", MapPrecision::Float32}, {"float64", MapPrecision::Float64}})
            .value_or(study.precision);
    study.frame = read_choice<Frame>(
                      top, "frame",
                      {{"galactic", Frame::Galactic}, {"icrs", Frame::Icrs}, {"ecliptic", Frame::Ecliptic}})
                      .value_or(study.frame);
    study.ordering =
        read_choice<Ordering>(top, "ordering", {{"ring", Ordering::Ring}, {"nested", Ordering::Nested}})
            .value_or(study.ordering);
    study.convention = read_choice<PolarizationConvention>(
                           top, "polarization_convention",
                           {{"COSMO", PolarizationConvention::Cosmo}, {"IAU", PolarizationConvention::Iau}})
                           .value_or(study.convention);
    study.remove_monopole =
        read_choice<bool>(top, "monopole", {{"keep", false}, {"remove", true}}).value_or(false);
    study.coverage = read_path(top, "coverage", folder);
    study.coverage_place = study.coverage ? top.place_of("coverage") : "";
    study.pixel_window = top.boolean("pixel_window").value_or(false);
    if (const auto accuracy = top.number("accuracy", "accuracy = 1e-5")) {
        if (!(*accuracy > 1e-9 && *accuracy < 0.1))
            top.fail("accuracy",
                     "must lie between 1e-9 and 0.1 (both left out), but is " + format_exact(*accuracy));
        study.accuracy = *accuracy;
    }
    study.seed =
        static_cast<std::uint64_t>(read_integer(top, "seed", 0, largest_seed, "seed = 20260101").value_or(0));
    study.realizations =
        static_cast<int>(read_integer(top, "realizations", 1, 1000000, "realizations = 1").value_or(1));
    study.truth = read_truth(top).value_or(study.truth);
}

}  // namespace

StudySpec make_study(const TomlValue& document, const std::filesystem::path& file) {
    const std::filesystem::path folder = file.parent_path();
    TomlReader top(document);
    StudySpec study;
    study.file = file;
    study.title = top.text("title", "title = \"Ridge array, design B\"").value_or(file.stem().string());
    const auto model = top.text("model", "model = \"disc-and-loops\"");
    const auto nside = read_nside(top);
    read_plain_keys(study, top, folder);
    const auto lmax = top.integer("lmax", "lmax = 512");
    const ChannelDefaults defaults = read_response_keys(top, {});
    const std::vector<TomlReader> channels = top.tables("channel");
    const std::optional<TomlReader> grid = top.table("channel_grid");
    const std::vector<TomlReader> patches = top.tables("patch");
    top.check_no_other_keys();
    if (!model) top.fail_missing("model", "model = \"disc-and-loops\"");
    if (!nside) top.fail_missing("nside", "nside = 256");
    study.nside = *nside;
    read_model_key(study, top, *model, folder);
    read_lmax(study, top, lmax);
    for (const TomlReader& channel : channels)
        study.channels.push_back(read_channel(channel, defaults, folder));
    if (grid)
        for (ChannelSpec& channel : read_channel_grid(*grid, defaults))
            study.channels.push_back(std::move(channel));
    if (study.channels.empty())
        top.fail_here(
            "there is no channel: add a [[channel]] with name = \"low\" and frequency = \"30 GHz\", or a "
            "[channel_grid]");
    check_channel_names(study.channels);
    for (const TomlReader& patch : patches)
        study.patches.push_back(read_patch(patch));
    check_patch_names(study.patches);
    return study;
}

StudySpec read_study(const std::filesystem::path& path, const std::vector<std::string>& overrides) {
    std::string source = read_text_file(path, "study file");
    TomlValue document = parse_toml(source, path.string());
    if (!overrides.empty() && !source.empty() && source.back() != '\n') source += '\n';
    for (const std::string& assignment : overrides) {
        apply_override(document, assignment);
        source += to_one_line("# --set " + assignment) + "\n";
    }
    StudySpec study = make_study(document, path);
    study.source = source;
    return study;
}

}  // namespace foreglow
