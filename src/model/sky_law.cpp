// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/sky_law.h"

#include "base/error.h"
#include "base/parallel.h"

namespace foreglow {
namespace {

constexpr std::int64_t block = 64;  // pixels of exact sums, which are slow

std::span<const double> cut(std::span<const double> column, std::size_t first, std::size_t count) {
    return column.empty() ? column : column.subspan(first, count);
}

std::vector<double> even_points(double low, double high, int count) {
    if (!(high > low)) return {0.5 * (low + high)};
    std::vector<double> points;
    points.reserve(static_cast<std::size_t>(count));
    for (int i = 0; i < count; ++i)
        points.push_back(low + (high - low) * i / (count - 1));
    return points;
}

}  // namespace

LawColumns LawColumns::part(std::size_t first, std::size_t count) const {
    return {cut(index, first, count), cut(curvature, first, count)};
}

BandFactor::BandFactor(const SkyLaw& law, const BandSum& band, double tolerance)
    : fast_(std::visit(
          [&](const CurvedSkyLaw& curved) {
              return BandLaw(band, curved.reference, curved.range, tolerance);
          },
          law)) {}

double BandFactor::worst_error() const {
    return std::visit([](const auto& fast) { return fast.worst_error(); }, fast_);
}

void BandFactor::evaluate(const LawColumns& columns, std::span<double> out, ExpPrecision precision) const {
    std::get<BandLaw>(fast_).evaluate(columns.index, columns.curvature, out, precision);
}

Matrix exact_band_values(const SkyLaw& law, const std::vector<BandSum>& bands, const LawColumns& pixels) {
    const auto& curved = std::get<CurvedSkyLaw>(law);
    Matrix values(pixels.size(), bands.size());
    parallel_for_blocks(
        static_cast<std::int64_t>(values.rows), block, [&](std::int64_t begin, std::int64_t end) {
            for (auto p = static_cast<std::size_t>(begin); p < static_cast<std::size_t>(end); ++p)
                for (std::size_t b = 0; b < bands.size(); ++b)
                    values(p, b) =
                        exact_band_value(bands[b], curved.reference, pixels.index[p], pixels.curvature[p]);
        });
    return values;
}

LawPoints make_law_grid(const SkyLaw& law, int first, int others) {
    const ParameterRange& range = std::get<CurvedSkyLaw>(law).range;
    LawPoints grid;
    for (const double c : even_points(range.curvature_low, range.curvature_high, others))
        for (const double beta : even_points(range.index_low, range.index_high, first)) {
            grid.index.push_back(beta);
            grid.curvature.push_back(c);
        }
    return grid;
}

}  // namespace foreglow
