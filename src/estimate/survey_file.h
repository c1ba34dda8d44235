// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>
#include <optional>
#include <string>
#include <vector>

#include "base/quantity.h"
#include "model/model_spec.h"
#include "physics/brightness_unit.h"
#include "sphere/frame.h"

namespace foreglow {

/// One survey as the file describes it.
struct SurveySpec {
    MapSource map;
    Frequency frequency;
    Angle beam_fwhm;
    std::optional<Brightness> noise;             ///< rms per pixel of the map as given; or
    std::optional<MapSource> noise_map;          ///< that rms as a map on the same grid
    double calibration_error = 0;                ///< relative, common to the whole map
    std::optional<Brightness> zero_level;        ///< subtracted
    std::optional<Brightness> zero_level_error;  ///< common to the whole map
    std::string place;                           ///< FILE:LINE:COLUMN of the entry
};

/// What `foreglow index` is asked for, every key checked by itself and against the others.
struct SurveysSpec {
    std::filesystem::path file;
    std::string source;  ///< the TOML text as read
    std::string title;
    Frequency reference_frequency;  ///< of the amplitude and of the index
    int nside = 0;                  ///< of the maps that come out
    Frame frame = Frame::Galactic;  ///< likewise
    Angle beam_fwhm;                ///< common resolution
    bool curvature = false;
    bool fit_zero_levels = false;
    int scatter_nside = 1;            ///< of the cells of the T-T estimate, at most nside
    std::vector<SurveySpec> surveys;  ///< ascending in frequency
};

/// The most surveys that one fit takes.
inline constexpr std::size_t most_surveys = 16;

/// Reads a surveys file; paths in it are relative to it and must exist, maps are not opened yet.
///
/// Defaults: frame galactic, scatter_nside = nside/16, at least 1.
/// @throws InputError "FILE:LINE:COLUMN: ..." where a key is wrong, frequencies do not suffice, or a survey's
/// beam is wider than the common one
[[nodiscard]] SurveysSpec read_surveys(const std::filesystem::path& path);

/// Makes them from TOML text, as read_surveys does.
/// @param file  stands in the places of messages; paths are relative to its folder
[[nodiscard]] SurveysSpec make_surveys(const std::string& text, const std::filesystem::path& file);

}  // namespace foreglow
