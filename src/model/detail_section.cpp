// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/detail_section.h"

#include "base/error.h"
#include "base/text.h"
#include "model/typed_keys.h"

namespace foreglow {
namespace {

constexpr std::int64_t highest_l = 32768;  // 4 nside of the finest grid

std::optional<LRange> read_lrange(TomlReader& reader, const std::string& key, std::int64_t lowest) {
    const TomlValue* value = reader.find(key);
    if (value == nullptr) return std::nullopt;
    const std::string wanted = "must be the first and the last l, for example " + key + " = [30, 90]";
    const auto is_l = [](const TomlValue& one) { return one.type == TomlValue::Type::Integer; };
    if (value->type != TomlValue::Type::Array || value->items.size() != 2 || !is_l(value->items[0]) ||
        !is_l(value->items[1]))
        reader.fail(key, wanted + ", but is " + describe(*value));
    const std::int64_t first = value->items[0].integer, last = value->items[1].integer;
    if (first < lowest || last > highest_l || first > last)
        reader.fail(key, "must rise and lie between " + std::to_string(lowest) + " and " +
                             std::to_string(highest_l) + ", but is [" + std::to_string(first) + ", " +
                             std::to_string(last) + "]");
    return LRange{static_cast<int>(first), static_cast<int>(last)};
}

std::optional<SquaredBrightness> read_squared(TomlReader& reader, const std::string& key) {
    const auto text = reader.text(key, key + " = \"0.01 K_RJ^2\"");
    if (!text) return std::nullopt;
    const std::string bare(trim(*text));
    const auto refuse = [&] {
        reader.fail(key,
                    "must be a squared brightness such as \"0.01 K_RJ^2\" (D_l = l(l+1)C_l/2pi), but is '" +
                        *text + "'");
    };
    if (bare.size() < 3 || bare.substr(bare.size() - 2) != "^2") refuse();
    Brightness brightness;
    try {
        brightness = parse_brightness(bare.substr(0, bare.size() - 2));
    } catch (const InputError&) {
        refuse();
    }
    if (brightness.unit.kind == BrightnessUnit::Kind::JanskyPerPixel)
        reader.fail(key,
                    "must not be in Jy/pixel, which depends on a grid: write for example \"0.01 K_RJ^2\"");
    if (!(brightness.value >= 0)) reader.fail(key, "must not be negative: it is a variance");
    return SquaredBrightness{brightness.value, brightness.unit};
}

std::optional<Angle> read_angle_up_to(TomlReader& reader, const std::string& key, double highest_deg) {
    const auto text = reader.text(key, key + " = \"20 deg\"");
    if (!text) return std::nullopt;
    Angle angle;
    try {
        angle = parse_angle(*text);
    } catch (const InputError& error) {
        reader.fail(key, error.what());
    }
    if (!(angle.degrees() >= 0 && angle.degrees() <= highest_deg))
        reader.fail(key,
                    "must lie between 0 and " + format_exact(highest_deg) + " deg, but is '" + *text + "'");
    return angle;
}

// A slope and an amplitude belong together.
std::optional<PowerLawSpec> read_power_law(TomlReader& reader, const std::string& prefix,
                                           const std::optional<double>& pivot) {
    const auto slope = read_number(reader, prefix + "slope", -6, 0, prefix + "slope = -2.7");
    const auto amplitude = read_squared(reader, prefix + "amplitude");
    if (!slope && !amplitude) return std::nullopt;
    if (!slope)
        reader.fail(prefix + "amplitude",
                    "stands alone: add " + prefix + "slope = -2.7, or take both out to have them fitted");
    if (!amplitude)
        reader.fail(prefix + "slope",
                    "stands alone: add " + prefix +
                        "amplitude = \"0.01 K_RJ^2\", or take both out to have them fitted");
    PowerLawSpec law{*slope, *amplitude, 80};
    law.pivot = pivot.value_or(law.pivot);
    return law;
}

void refuse_together(TomlReader& reader, const char* key, std::initializer_list<const char*> others) {
    if (!reader.has(key)) return;
    for (const char* other : others)
        if (reader.has(other))
            reader.fail(other, std::string("contradicts '") + key + "': keep one of the two");
}

}  // namespace

DetailSpec read_detail(TomlReader reader, const std::filesystem::path& folder) {
    DetailSpec detail;
    detail.place = reader.place();
    detail.fit_lrange = read_lrange(reader, "fit_lrange", 2);
    const auto pivot = read_number(reader, "pivot", 2, highest_l, "pivot = 80");
    detail.intensity = read_power_law(reader, "", pivot);
    detail.polarization = read_power_law(reader, "polarization_", pivot);
    detail.spectrum = read_path(reader, "spectrum", folder);
    if (const auto lmax = read_integer(reader, "lmax", 2, highest_l, "lmax = 640"))
        detail.lmax = static_cast<int>(*lmax);
    const auto number = [&](const char* key, double low, double high, double& value) {
        value = read_number(reader, key, low, high, std::string(key) + " = " + format_exact(value))
                    .value_or(value);
    };
    number("modulation", 0, 3, detail.modulation);
    number("modulation_floor", 0, 1, detail.modulation_floor);
    number("b_to_e", 0, 10, detail.b_to_e);
    number("te_correlation", -1, 1, detail.te_correlation);
    detail.polarization_modulation =
        read_choice<ModulationSource>(
            reader, "polarization_modulation",
            {{"polarized", ModulationSource::Polarized}, {"intensity", ModulationSource::Intensity}})
            .value_or(detail.polarization_modulation);
    detail.envelope_fwhm = read_beam_fwhm(reader, "envelope_fwhm").value_or(detail.envelope_fwhm);
    detail.latitude_cut = read_angle_up_to(reader, "latitude_cut", 75).value_or(detail.latitude_cut);
    detail.form =
        read_choice<DetailForm>(reader, "form",
                                {{"additive", DetailForm::Additive}, {"lognormal", DetailForm::Lognormal}})
            .value_or(detail.form);
    detail.cap_polarization = reader.boolean("cap_polarization").value_or(detail.cap_polarization);
    reader.check_no_other_keys();
    refuse_together(reader, "fit_lrange", {"slope", "amplitude", "spectrum"});
    refuse_together(reader, "spectrum",
                    {"slope", "amplitude", "pivot", "polarization_slope", "polarization_amplitude"});
    if (reader.has("pivot") && !detail.intensity && !detail.polarization)
        reader.fail("pivot",
                    "belongs to a slope and an amplitude, but there are none: add them, or take it out");
    return detail;
}

std::optional<ScatterSpec> read_scatter(TomlReader& reader, double largest) {
    ScatterSpec scatter;
    const auto rms = read_number(reader, "scatter", 0, largest, "scatter = 0.1");
    const auto length = read_number(reader, "decorrelation_length", 1, 1e6, "decorrelation_length = 20");
    const auto slope = read_number(reader, "scatter_slope", -6, 2, "scatter_slope = -2.6");
    const auto lrange = read_lrange(reader, "scatter_lrange", 1);
    const auto correlation = read_number(reader, "scatter_correlation", -1, 1, "scatter_correlation = 0.3");
    refuse_together(reader, "scatter", {"decorrelation_length"});
    if (!rms && !length) {
        for (const char* key : {"scatter_slope", "scatter_lrange", "scatter_correlation"})
            if (reader.has(key))
                reader.fail(key,
                            "belongs to a scatter, but there is none: add scatter = 0.1, or take it out");
        return std::nullopt;
    }
    scatter.rms = rms ? *rms : 1 / *length;
    scatter.slope = slope.value_or(scatter.slope);
    scatter.lrange = lrange.value_or(scatter.lrange);
    scatter.correlation = correlation.value_or(0.0);
    if (scatter.rms == 0) return std::nullopt;
    return scatter;
}

}  // namespace foreglow
