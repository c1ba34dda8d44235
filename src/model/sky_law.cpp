// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/sky_law.h"

#include <cmath>

#include "base/parallel.h"

namespace foreglow {
namespace {

constexpr std::int64_t block = 64;  // pixels of exact sums, which are slow
constexpr double oracle_tolerance = 1e-10;

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

std::variant<BandLaw, ElectronBandLaw> make_fast(const SkyLaw& law, const BandSum& band, double tolerance) {
    if (const auto* curved = std::get_if<CurvedSkyLaw>(&law))
        return BandLaw(band, curved->reference, curved->range, tolerance);
    const auto& electrons = std::get<ElectronSkyLaw>(law);
    return ElectronBandLaw(electrons.law, band, electrons.reference, electrons.range, electrons.part,
                           tolerance);
}

}  // namespace

LawColumns LawColumns::part(std::size_t first, std::size_t count) const {
    return {cut(index, first, count),
            cut(curvature, first, count),
            {cut(electrons.slope, first, count), cut(electrons.field_uG, first, count),
             cut(electrons.break_GeV, first, count), cut(electrons.cutoff_GeV, first, count)}};
}

bool LawColumns::is_defined_at(std::size_t pixel) const {
    const auto good = [pixel](std::span<const double> column) {
        return column.empty() || !std::isnan(column[pixel]);
    };
    return good(index) && good(curvature) && good(electrons.slope) && good(electrons.field_uG) &&
           good(electrons.break_GeV) && good(electrons.cutoff_GeV);
}

void LawPoints::add(const LawColumns& columns, std::size_t pixel) {
    const auto append = [pixel](std::vector<double>& to, std::span<const double> from) {
        if (!from.empty()) to.push_back(from[pixel]);
    };
    append(index, columns.index);
    append(curvature, columns.curvature);
    append(slope, columns.electrons.slope);
    append(field, columns.electrons.field_uG);
    append(break_energy, columns.electrons.break_GeV);
    append(cutoff_energy, columns.electrons.cutoff_GeV);
}

BandFactor::BandFactor(const SkyLaw& law, const BandSum& band, double tolerance)
    : fast_(make_fast(law, band, tolerance)) {}

double BandFactor::worst_error() const {
    return std::visit([](const auto& fast) { return fast.worst_error(); }, fast_);
}

void BandFactor::evaluate(const LawColumns& columns, std::span<double> out, ExpPrecision precision) const {
    if (const auto* curved = std::get_if<BandLaw>(&fast_))
        curved->evaluate(columns.index, columns.curvature, out, precision);
    else
        std::get<ElectronBandLaw>(fast_).evaluate(columns.electrons, out, precision);
}

Matrix exact_band_values(const SkyLaw& law, const std::vector<BandSum>& bands, const LawColumns& pixels) {
    Matrix values(pixels.size(), bands.size());
    if (std::holds_alternative<ElectronSkyLaw>(law)) {
        std::vector<BandFactor> factors;
        factors.reserve(bands.size());
        for (const BandSum& band : bands)
            factors.emplace_back(law, band, oracle_tolerance);
        parallel_for_blocks(
            static_cast<std::int64_t>(values.rows), block, [&](std::int64_t begin, std::int64_t end) {
                std::vector<double> column(static_cast<std::size_t>(end - begin));
                const LawColumns part = pixels.part(static_cast<std::size_t>(begin), column.size());
                for (std::size_t b = 0; b < bands.size(); ++b) {
                    factors[b].evaluate(part, column);
                    for (std::size_t p = 0; p < column.size(); ++p)
                        values(static_cast<std::size_t>(begin) + p, b) = column[p];
                }
            });
        return values;
    }
    const auto& curved = std::get<CurvedSkyLaw>(law);
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
    LawPoints grid;
    if (const auto* curved = std::get_if<CurvedSkyLaw>(&law)) {
        const ParameterRange& range = curved->range;
        for (const double c : even_points(range.curvature_low, range.curvature_high, others))
            for (const double beta : even_points(range.index_low, range.index_high, first)) {
                grid.index.push_back(beta);
                grid.curvature.push_back(c);
            }
        return grid;
    }
    const ElectronRange& range = std::get<ElectronSkyLaw>(law).range;
    const int varying = (range.field_uG.is_point() ? 0 : 1) + (range.break_GeV.is_point() ? 0 : 1) +
                        (range.cutoff_GeV.is_point() ? 0 : 1);
    const int each = varying < 2 ? others : varying < 3 ? 5 : 4;
    const auto points = [each](const Interval& interval) {
        return even_points(interval.low, interval.high, each);
    };
    for (const double cutoff : points(range.cutoff_GeV))
        for (const double energy_break : points(range.break_GeV))
            for (const double field : points(range.field_uG))
                for (const double slope : even_points(range.slope.low, range.slope.high, first)) {
                    grid.slope.push_back(slope);
                    if (!range.field_uG.is_point()) grid.field.push_back(field);
                    if (!range.break_GeV.is_point()) grid.break_energy.push_back(energy_break);
                    if (!range.cutoff_GeV.is_point()) grid.cutoff_energy.push_back(cutoff);
                }
    return grid;
}

}  // namespace foreglow
