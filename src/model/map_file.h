// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>
#include <span>
#include <string>
#include <vector>

#include "io/fits_map_write.h"
#include "model/study_spec.h"
#include "sphere/grid.h"

namespace foreglow {

/// The pixels of a study's `coverage`, for partial-sky files.
struct Coverage {
    std::vector<std::int64_t> ring_pixels;  ///< ascending
    bool says_its_frame = true;             ///< else it is taken to be in the study's
    std::vector<std::int64_t> file_pixels;  ///< in the study's ordering, ascending
};

/// Reads the coverage of a study.
/// @throws InputError where it is on another grid, in another frame, or empty
[[nodiscard]] Coverage read_study_coverage(const StudySpec& study);

/// One map file of a run, written from pieces in RING order and COSMO; it turns them into the file's ordering
/// and convention.
class MapFile {
  public:
    /// @param polarized  whether columns 1 and 2 are Q and U
    MapFile(const std::filesystem::path& path, const FitsMapLayout& layout, bool polarized);

    /// Writes pixels first, first + 1, ... (RING numbers); threads may write disjoint ranges at once. U is
    /// negated in place for IAU.
    /// @param columns  [columns][n]
    void write(std::int64_t first, std::span<const std::span<double>> columns);
    void finish() { writer_.finish(); }

  private:
    HealpixGrid grid_;
    Ordering ordering_;
    bool negate_u_;
    FitsMapWriter writer_;
};

/// Makes the layout that a study's maps share: grid, order, frame, precision, coverage.
[[nodiscard]] FitsMapLayout make_study_layout(const StudySpec& study, const Coverage* coverage,
                                              std::vector<FitsMapColumnName> columns, bool polarized);

}  // namespace foreglow
