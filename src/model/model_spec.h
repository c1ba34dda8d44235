// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <filesystem>
#include <optional>
#include <string>
#include <variant>
#include <vector>

#include "base/quantity.h"
#include "model/detail_spec.h"
#include "model/galaxy_spec.h"
#include "physics/brightness_unit.h"
#include "physics/electron_law.h"
#include "sphere/frame.h"
#include "sphere/grid.h"

namespace foreglow {

/// A column by number (from 1) or by TTYPE name.
using ColumnRef = std::variant<int, std::string>;

/// A FITS map named by a model, with what the model says where the file does not.
struct MapSource {
    std::filesystem::path path;
    std::string place;    ///< FILE:LINE:COLUMN of the `map` key
    std::string section;  ///< "intensity", "index", ...
    std::vector<ColumnRef> columns;
    std::optional<int> hdu;
    std::optional<Ordering> ordering;
    std::optional<Frame> frame;
    std::optional<BrightnessUnit> unit;  ///< brightness maps only
    std::optional<PolarizationConvention> convention;
};

/// Parameters of the bundled invented sky, made from closed formulas (docs/models.md).
struct SketchSpec {
    bool disc = true, loops = true, texture = true;
    double pole_brightness = 10.0;   ///< of the disc layer at |b| = 90 deg, K_RJ at the reference frequency
    double plane_brightness = 60.0;  ///< added on the plane at the anticentre, K_RJ
    Angle plane_height = Angle::from_degrees(4.0);
    double texture_rms = 0.12;               ///< of ln T
    double index = -2.75, index_rms = 0.06;  ///< mean and scatter of the index at the reference frequency
    double curvature = -0.04, curvature_rms = 0.01;
    double polarized_fraction = 0.2;
    std::uint64_t seed = 1;  ///< of the sky itself, not of a study
};

/// A number everywhere, or a map.
using ValueOrMap = std::variant<double, MapSource>;

struct IntensitySpec {
    MapSource map;
    std::optional<Angle> beam_fwhm;
    std::optional<Brightness> zero_level;
};

/// Q and U from a map, or a fraction of the intensity with an angle map.
struct PolarizationSpec {
    std::optional<MapSource> map;        ///< two columns
    std::optional<ValueOrMap> fraction;  ///< with angle_map
    std::optional<MapSource> angle_map;  ///< degrees, in `convention`
    std::optional<Frequency> reference_frequency;
    std::optional<Angle> beam_fwhm;
    std::optional<ValueOrMap> index;  ///< own power law; else the intensity's own curve
};

struct IndexSpec {
    ValueOrMap value = -3.0;
    std::optional<Frequency> frequency;  ///< where it holds, if not at the reference frequency;
                                         ///< `between` is turned into the geometric mean
    std::optional<std::pair<Frequency, Frequency>> between;  ///< the chord's ends, low first
    std::optional<ScatterSpec> scatter;                      ///< added to it, at the frequency where it holds
};

/// The electrons behind the indices; a map stands for the law's one value.
struct ElectronsSpec {
    ElectronLaw law;
    std::optional<MapSource> field_map, break_energy_map, cutoff_energy_map;  ///< in uG and GeV
};

/// A model as written, every key checked by itself and against the others.
struct ModelSpec {
    std::filesystem::path file;  ///< empty for a bundled model
    std::string name;            ///< the bundled name, or the file's stem
    std::string source;          ///< the TOML text as read
    std::string title;
    Frequency reference_frequency;
    std::optional<SketchSpec> sketch;  ///< instead of the four below
    std::optional<GalaxySpec> galaxy;  ///< likewise
    std::optional<IntensitySpec> intensity;
    std::optional<PolarizationSpec> polarization;
    IndexSpec index;
    ValueOrMap curvature = 0.0;
    std::optional<ScatterSpec> curvature_scatter;
    std::optional<ElectronsSpec> electrons;  ///< instead of a curvature
    std::optional<DetailSpec> detail;        ///< structure below the template's beam
    std::vector<std::string> warnings;       ///< e.g. an index that looks like one of flux
};

/// Tells whether a study's seed and realizations matter to a model.
[[nodiscard]] inline bool is_random(const ModelSpec& model) {
    return model.detail || model.index.scatter || model.curvature_scatter;
}

}  // namespace foreglow
