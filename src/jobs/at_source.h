// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <memory>
#include <optional>
#include <span>
#include <string>
#include <vector>

#include "jobs/at.h"
#include "model/point_values.h"

namespace foreglow {

/// One row that each position gets.
struct AtColumn {
    std::string channel;                 ///< "" where the row stands for a frequency
    std::optional<Frequency> frequency;  ///< none: an index map that does not say where it holds
    std::string unit;                    ///< "" without brightness
};

/// What a source of rows is; its pixels are read when asked for.
struct AtSource {
    HealpixGrid grid{1};
    Frame frame = Frame::Galactic;
    PolarizationConvention convention = PolarizationConvention::Cosmo;  ///< where none is asked for
    bool polarized = false;
    bool takes_nside = false;    ///< made of formulas, on any grid that is asked for
    bool has_own_slope = false;  ///< electron_slope is the law's, not that of a power law
    bool has_index = true, has_curvature = true, has_brightness = true;
    std::vector<AtColumn> columns;
    std::vector<std::string> notices;
    /// Reads what all columns share at RING pixels of the grid.
    std::function<void(std::span<const std::int64_t>)> load;
    /// Makes one column at the pixels loaded last, to be called once for each: COSMO, against the meridians
    /// of the source's frame.
    std::function<PointValues(std::size_t)> values;
};

/// Finds out what a source is and opens it.
/// @throws InputError where it is none of the five kinds, or lacks what is asked of it
[[nodiscard]] AtSource open_at_source(const AtOptions& options);

// The kinds of sources.
[[nodiscard]] AtSource open_model_at(const AtOptions& options);
[[nodiscard]] AtSource open_study_at(const AtOptions& options);
[[nodiscard]] AtSource open_run_at(const AtOptions& options);
/// Takes an index map, or the folder with index.fits and amplitude.fits that `foreglow index` left.
[[nodiscard]] AtSource open_index_map_at(const AtOptions& request);

/// Reads --frequency: single ones and log grids.
/// @throws InputError where one is wrong or outside 1 Hz to 10 THz
[[nodiscard]] std::vector<Frequency> read_at_frequencies(const std::vector<std::string>& texts);

}  // namespace foreglow
