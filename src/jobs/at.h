// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <filesystem>
#include <functional>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "base/quantity.h"
#include "jobs/row_format.h"
#include "sphere/frame.h"
#include "sphere/grid.h"

namespace foreglow {

/// What `foreglow at SOURCE` is asked for; what is left open is chosen from the source.
struct AtOptions {
    std::string source;                  ///< bundled model, model file, study, run's folder, or index map
    std::vector<std::string> positions;  ///< "LON,LAT" each
    std::vector<std::int64_t> pixels;
    std::optional<std::filesystem::path> positions_file;  ///< CSV; "-" is standard input
    std::optional<int> nside;                             ///< of the pixel numbers
    bool nested = false;                                  ///< pixel numbers, given and printed
    std::optional<Frame> frame;  ///< of positions and rows; galactic for positions, the source's for pixels
    std::optional<Angle> disc;   ///< radius; rows are means over the pixels within
    bool interpolate = false;    ///< bilinearly, else the pixel itself
    std::vector<std::string> frequencies;  ///< "70 MHz", or "first:last:count" on a log grid
    std::optional<std::string> unit;
    std::optional<PolarizationConvention> convention;
    std::optional<int> realization;  ///< of a run with several
    RowFormat format = RowFormat::Table;
    // Of an index map, where its file does not say:
    std::optional<std::string> column;  ///< number from 1, or name
    std::optional<int> hdu;
    std::optional<Frame> map_frame;
    std::optional<Ordering> map_ordering;
};

/// Answers at positions: rows are handed on as they are computed, a batch of them at a time.
/// @param write  takes text for standard output; returns false where no one reads any more, which ends the
/// job
/// @param note   takes one line each that the user must see: conventions, approximations
/// @throws InputError where the request is wrong; DataError, FileError where a file is broken
void run_at(const AtOptions& options, const std::function<bool(std::string_view)>& write,
            const std::function<void(const std::string&)>& note);

}  // namespace foreglow
