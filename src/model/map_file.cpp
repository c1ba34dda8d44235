// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/map_file.h"

#include <algorithm>
#include <array>

#include "base/error.h"
#include "io/fits_map_read.h"

namespace foreglow {

Coverage read_study_coverage(const StudySpec& study) {
    FOREGLOW_EXPECTS(study.coverage.has_value());
    FitsMapRequest request;
    request.path = *study.coverage;
    request.place = study.coverage_place;
    const CoverageMap map = read_coverage(request);
    const std::string start = study.coverage_place + ": the coverage " + study.coverage->filename().string();
    if (map.grid.nside() != study.nside)
        throw InputError(start + " has nside " + std::to_string(map.grid.nside()) + " but the study has " +
                         std::to_string(study.nside) + ": give a coverage on the study's grid");
    if (map.frame && *map.frame != study.frame)
        throw InputError(start + " is in " + to_text(*map.frame) + " but the study in " +
                         to_text(study.frame) + ": give a coverage in the study's frame");
    if (map.pixels.empty()) throw InputError(start + " wants no pixel: give one that is nonzero somewhere");
    Coverage coverage;
    coverage.ring_pixels = map.pixels;
    coverage.file_pixels = map.pixels;
    coverage.says_its_frame = map.frame.has_value();
    if (study.ordering == Ordering::Nested) {
        const HealpixGrid grid(study.nside);
        for (std::int64_t& pixel : coverage.file_pixels)
            pixel = grid.ring_to_nested(pixel);
        std::sort(coverage.file_pixels.begin(), coverage.file_pixels.end());
    }
    return coverage;
}

FitsMapLayout make_study_layout(const StudySpec& study, const Coverage* coverage,
                                std::vector<FitsMapColumnName> columns, bool polarized) {
    FitsMapLayout layout;
    layout.nside = study.nside;
    layout.ordering = study.ordering;
    layout.frame = study.frame;
    if (polarized) layout.convention = study.convention;
    layout.columns = std::move(columns);
    layout.float64 = study.precision == MapPrecision::Float64;
    if (coverage != nullptr) layout.pixels = coverage->file_pixels;
    return layout;
}

MapFile::MapFile(const std::filesystem::path& path, const FitsMapLayout& layout, bool polarized)
    : grid_(layout.nside),
      ordering_(layout.ordering),
      negate_u_(polarized && layout.convention == PolarizationConvention::Iau),
      writer_(path, layout) {}

void MapFile::write(std::int64_t first, std::span<const std::span<double>> columns) {
    if (negate_u_)
        for (double& value : columns[2])
            value = -value;
    std::array<std::span<const double>, 3> parts;
    for (std::size_t c = 0; c < columns.size(); ++c)
        parts[c] = columns[c];
    const FitsMapWriter::Columns view(parts.data(), columns.size());
    if (ordering_ == Ordering::Ring) {
        writer_.write_pixels(first, view);
        return;
    }
    std::vector<std::int64_t> nested(columns[0].size());
    for (std::size_t i = 0; i < nested.size(); ++i)
        nested[i] = grid_.ring_to_nested(first + static_cast<std::int64_t>(i));
    writer_.write_pixels_scattered(nested, view);
}

}  // namespace foreglow
