// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>
#include <optional>
#include <string>
#include <vector>

#include "io/toml_reader.h"
#include "model/study_spec.h"

namespace foreglow {

/// What channels take from the study where they do not say otherwise.
struct ChannelDefaults {
    ResponseWeights response_weights = ResponseWeights::Temperature;
    double reference_flux_index = 0;
};

/// Reads the keys response_weights and reference_flux_index, of a study or a channel.
[[nodiscard]] ChannelDefaults read_response_keys(TomlReader& reader, ChannelDefaults defaults);

/// Read a channel's name, which is a file's stem, and its noise level, which check_noise accepts.
[[nodiscard]] std::optional<std::string> read_channel_name(TomlReader& reader);
[[nodiscard]] std::optional<std::string> read_channel_noise(TomlReader& reader);

/// Reads one [[channel]].
/// @throws InputError with the place, as all functions here
[[nodiscard]] ChannelSpec read_channel(TomlReader reader, const ChannelDefaults& defaults,
                                       const std::filesystem::path& folder);

/// Reads a [channel_grid] and expands it into its channels NAME_0000, NAME_0001, ...
///
/// Linear: nu_i = first + i (last - first)/(count - 1); log: nu_i = first (last/first)^(i/(count - 1)).
/// "contiguous" bands have their edges halfway between neighbours, at geometric means on a log grid, and
/// those of the two ends mirrored. beam_scaling "diffraction": FWHM(nu) = beam_fwhm * beam_at/nu (common
/// practice).
[[nodiscard]] std::vector<ChannelSpec> read_channel_grid(TomlReader reader, const ChannelDefaults& defaults);

/// Checks that names differ in more than the case of letters, as some file systems need.
void check_channel_names(const std::vector<ChannelSpec>& channels);

/// Checks a noise level such as "5 uK_CMB arcmin": a positive number, a unit of brightness and one of angle.
/// @throws InputError where it is wrong; the message does not name the key
void check_noise(const std::string& text);

}  // namespace foreglow
