// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>
#include <memory>
#include <optional>
#include <span>
#include <string>
#include <vector>

#include "base/progress.h"
#include "estimate/residual_statistics.h"
#include "io/fits_card.h"
#include "jobs/grade.h"
#include "jobs/grade_source.h"
#include "jobs/output_folder.h"
#include "jobs/result_rows.h"

namespace foreglow {

/// The folder that a grading leaves: RUN/grade, or --out; nowhere for a study without --out.
class GradeOutput {
  public:
    /// @throws InputError where the folder exists and is not empty, unless --replace
    GradeOutput(const GradeOptions& options, const GradeSource& source);

    [[nodiscard]] bool is_kept() const { return folder_ != nullptr; }
    /// Writes a residual map in the study's unit, frame, ordering and precision.
    void write_residual(const std::string& name, const HealpixGrid& grid, const std::string& column,
                        const std::string& unit, std::span<const double> values, std::vector<FitsCard> cards);
    /// Adds a row per l to spectra.csv.
    void add_spectrum(const std::string& map, const std::string& column, double cut,
                      std::span<const double> residual, std::span<const double> truth);
    /// Writes rows.csv, spectra.csv and, last, run.json.
    void finish(const ResultRows& rows, const std::string& kind, Progress& progress);

  private:
    const GradeOptions& options_;
    const GradeSource& source_;
    std::unique_ptr<OutputFolder> folder_;
    std::vector<std::string> names_;
    ResultRows spectra_;
};

/// Reads --mask: the pixels that are defined and not zero, on any grid and in any frame.
[[nodiscard]] PixelSelection read_grade_mask(const std::filesystem::path& path, const HealpixGrid& grid,
                                             Frame frame, Progress& progress);

/// Keeps what both selections keep.
[[nodiscard]] PixelSelection both_of(const PixelSelection& a, const PixelSelection& b);

/// Scores recovered maps (jobs/grade_recovered.cpp).
[[nodiscard]] ResultRows grade_recovered(const GradeOptions& options, const GradeSource& source,
                                         GradeOutput& output, Progress& progress);

}  // namespace foreglow
