// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/study_channels.h"

#include <algorithm>
#include <map>

#include "base/error.h"
#include "base/text.h"
#include "io/text_file.h"
#include "model/typed_keys.h"

namespace foreglow {
namespace {

constexpr std::size_t longest_name = 100;

void check_band(const TomlReader& reader, const ChannelSpec& channel) {
    if (channel.bandwidth && channel.response)
        reader.fail("response", "contradicts 'bandwidth', a flat response: keep one of the two");
    if (!channel.frequency && channel.bandwidth)
        reader.fail("bandwidth",
                    "needs a 'frequency' at its centre: add a line such as frequency = \"30 GHz\"");
    if (!channel.frequency && !channel.response)
        reader.fail_missing("frequency", "frequency = \"30 GHz\" (or response = \"band.csv\")");
    if (channel.bandwidth && channel.bandwidth->hz() >= 2 * channel.frequency->hz())
        reader.fail("bandwidth", "is " + to_text(*channel.bandwidth) + " around " +
                                     to_text(*channel.frequency) +
                                     ", which reaches down to zero frequency: make it narrower than " +
                                     to_text(Frequency::from_hz(2 * channel.frequency->hz())));
}

void check_beam(const TomlReader& reader, const ChannelSpec& channel) {
    if (channel.beam_fwhm && channel.beam_window)
        reader.fail("beam_window", "contradicts 'beam_fwhm': keep one of the two");
}

}  // namespace

void check_noise(const std::string& text) {
    const std::string example = "write it as \"5 uK_CMB arcmin\"";
    const NumberWithUnit quantity = parse_number_with_unit(text);
    const auto blank = quantity.unit.find_last_of(" \t");
    if (blank == std::string::npos)
        throw InputError("needs a unit of brightness and one of angle, but is '" + text + "': " + example);
    const std::string angle = quantity.unit.substr(blank + 1);
    const std::string brightness(trim(quantity.unit.substr(0, blank)));
    if (angle != "arcmin" && angle != "deg" && angle != "arcsec")
        throw InputError("must end in arcmin, deg or arcsec, but is '" + text + "': " + example);
    const auto unit = find_brightness_unit(brightness);
    if (!unit || unit->kind == BrightnessUnit::Kind::JanskyPerPixel)
        throw InputError("has the unknown unit '" + brightness + "' in '" + text + "': " + example);
    if (!(quantity.value > 0)) throw InputError("must be above zero, but is '" + text + "'");
}

std::optional<std::string> read_channel_name(TomlReader& reader) {
    auto name = reader.text("name", "name = \"low\"");
    if (!name) return std::nullopt;
    const bool is_plain = std::all_of(name->begin(), name->end(), [](char c) {
        return (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z') || (c >= '0' && c <= '9') || c == '-' ||
               c == '_' || c == '.';
    });
    const std::string why =
        "is a file's name and may hold only letters, digits, '-', '_' and '.', for example \"low\"";
    if (name->empty()) reader.fail("name", "is empty: it " + why);
    if (!is_plain) reader.fail("name", why + ", but is '" + *name + "'");
    if (name->front() == '.') reader.fail("name", "must not begin with '.', but is '" + *name + "'");
    if (name->size() > longest_name)
        reader.fail("name", "has " + std::to_string(name->size()) + " characters: use at most " +
                                std::to_string(longest_name));
    return name;
}

std::optional<std::string> read_channel_noise(TomlReader& reader) {
    auto noise = reader.text("noise", "noise = \"5 uK_CMB arcmin\"");
    if (!noise) return std::nullopt;
    try {
        check_noise(*noise);
    } catch (const InputError& error) {
        reader.fail("noise", error.what());
    }
    return noise;
}

ChannelDefaults read_response_keys(TomlReader& reader, ChannelDefaults defaults) {
    const auto weights = read_choice<ResponseWeights>(reader, "response_weights",
                                                      {{"temperature", ResponseWeights::Temperature},
                                                       {"radiance", ResponseWeights::Radiance},
                                                       {"photon", ResponseWeights::Photon}});
    const auto index = read_number(reader, "reference_flux_index", -10, 10, "reference_flux_index = -1.0");
    return {weights.value_or(defaults.response_weights), index.value_or(defaults.reference_flux_index)};
}

ChannelSpec read_channel(TomlReader reader, const ChannelDefaults& defaults,
                         const std::filesystem::path& folder) {
    ChannelSpec channel;
    channel.place = reader.place();
    const auto name = read_channel_name(reader);
    if (name) reader.set_section("[[channel]] '" + *name + "'");
    channel.frequency = read_frequency(reader, "frequency");
    channel.bandwidth = read_frequency(reader, "bandwidth");
    channel.response = read_path(reader, "response", folder);
    channel.beam_fwhm = read_beam_fwhm(reader, "beam_fwhm");
    channel.beam_window = read_path(reader, "beam_window", folder);
    channel.noise = read_channel_noise(reader);
    const ChannelDefaults own = read_response_keys(reader, defaults);
    reader.check_no_other_keys();
    if (!name) reader.fail_missing("name", "name = \"low\"");
    channel.name = *name;
    channel.response_weights = own.response_weights;
    channel.reference_flux_index = own.reference_flux_index;
    check_band(reader, channel);
    check_beam(reader, channel);
    return channel;
}

void check_channel_names(const std::vector<ChannelSpec>& channels) {
    std::map<std::string, const ChannelSpec*> seen;
    for (const ChannelSpec& channel : channels) {
        const auto [entry, is_new] = seen.emplace(to_lower(channel.name), &channel);
        if (is_new) continue;
        throw InputError(
            to_one_line(channel.place + ": the channel name '" + channel.name + "' is already that of " +
                        entry->second->place +
                        (entry->second->name == channel.name ? "" : " but for upper and lower case") +
                        ": give each channel a name of its own"));
    }
}

}  // namespace foreglow
