// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <filesystem>
#include <optional>
#include <string>
#include <vector>

#include "base/quantity.h"
#include "physics/brightness_unit.h"
#include "physics/response_weights.h"
#include "sphere/frame.h"
#include "sphere/grid.h"

namespace foreglow {

enum class MapPrecision { Float32, Float64 };
enum class TruthLevel { None, Maps, Full };

/// One channel as the study file asks for it; a [channel_grid] is expanded into these.
struct ChannelSpec {
    std::string name;
    std::string place;                   ///< FILE:LINE:COLUMN of the entry, for messages
    std::optional<Frequency> frequency;  ///< the reference; absent only with a response file
    std::optional<Frequency> bandwidth;  ///< full width of a flat response
    std::optional<Frequency> band_low,
        band_high;  ///< both or none: exact edges (grids); else frequency -+ bandwidth/2
    std::optional<std::filesystem::path> response;
    std::optional<Angle> beam_fwhm;
    std::optional<std::filesystem::path> beam_window;
    std::optional<std::string> noise;  ///< checked, "5 uK_CMB arcmin"
    ResponseWeights response_weights = ResponseWeights::Temperature;
    double reference_flux_index = 0;
};

/// A flat-sky close-up.
struct PatchSpec {
    static constexpr int most_pixels = 6000;  ///< a side, margins for beams included

    std::string name;
    std::string place;          ///< FILE:LINE:COLUMN of the entry
    Angle longitude, latitude;  ///< of its centre, in the study's frame
    Angle pixel;
    int pixels = 0;  ///< a side
};

/// A study as written, every key checked by itself and against the others.
struct StudySpec {
    std::filesystem::path file;  ///< empty where no file was given
    std::string source;          ///< the TOML text as read, with overrides listed behind it
    std::string title;
    std::string model;        ///< a bundled model's name, or the path of a model file
    std::string model_place;  ///< FILE:LINE:COLUMN of the key
    bool model_is_bundled = false;
    int nside = 0;
    bool polarized = false;
    BrightnessUnit unit;
    MapPrecision precision = MapPrecision::Float32;
    Frame frame = Frame::Galactic;
    Ordering ordering = Ordering::Ring;
    PolarizationConvention convention = PolarizationConvention::Cosmo;
    bool remove_monopole = false;
    std::optional<std::filesystem::path> coverage;
    std::string coverage_place;
    bool pixel_window = false;
    int lmax = 0;
    double accuracy = 1e-5;
    std::uint64_t seed = 0;
    int realizations = 1;
    TruthLevel truth = TruthLevel::Maps;
    std::vector<ChannelSpec> channels;
    std::vector<PatchSpec> patches;
    std::vector<std::string> warnings;  ///< e.g. lmax above 2.5 nside
};

}  // namespace foreglow
