// SPDX-License-Identifier: GPL-2.0-or-later
#include "estimate/scatter_fit.h"

#include <algorithm>
#include <cmath>

#include "base/error.h"
#include "base/parallel.h"
#include "physics/spectral_law.h"
#include "sphere/sky_map.h"

namespace foreglow {
namespace {

constexpr double fewest_pixels = 10;
constexpr int fewest_blocks = 3;

PairMoments sum_of(std::span<const PairMoments> blocks) {
    PairMoments total;
    for (const PairMoments& block : blocks)
        total.add(block);
    return total;
}

PairMoments moments_of_pixels(const SmoothedSurvey& low, const SmoothedSurvey& high,
                              std::span<const std::int64_t> pixels) {
    PairMoments out;
    for (const std::int64_t pixel : pixels) {
        const auto p = static_cast<std::size_t>(pixel);
        const double x = low.values[p], y = high.values[p];
        if (!is_defined(x) || !is_defined(y)) continue;
        out.add({1, x, y, x * x, x * y, y * y, low.variance(p), high.variance(p)});
    }
    return out;
}

double index_of(double slope, double log_ratio) {
    return slope > 0 ? std::log(slope) / log_ratio : undefined_pixel;
}

/// Variances of a line's slope and intercept, delete-one jackknife over the blocks that have pixels.
struct LineErrors {
    double slope = undefined_pixel, intercept = undefined_pixel;
};
LineErrors jackknife(std::span<const PairMoments> blocks, const PairMoments& total) {
    std::vector<Line> lines;
    lines.reserve(blocks.size());
    for (const PairMoments& block : blocks) {
        if (block.pixels == 0) continue;
        PairMoments rest = total;
        rest.add(block, -1);
        lines.push_back(fit_line(rest));
    }
    const auto n = static_cast<double>(lines.size());
    if (n < fewest_blocks) return {};
    Line mean;
    for (const Line& line : lines) {
        mean.slope += line.slope / n;
        mean.intercept += line.intercept / n;
    }
    double slope = 0, intercept = 0;
    for (const Line& line : lines) {
        slope += (line.slope - mean.slope) * (line.slope - mean.slope);
        intercept += (line.intercept - mean.intercept) * (line.intercept - mean.intercept);
    }
    return {std::sqrt(slope * (n - 1) / n), std::sqrt(intercept * (n - 1) / n)};
}

/// What a cell's index is made of besides its moments.
struct PairFacts {
    std::size_t low = 0, high = 0;
    double log_ratio = 0;          ///< ln(nu_high/nu_low)
    double calibration_error = 0;  ///< of the slope, relative
};

ScatterCell make_cell(std::span<const PairMoments> blocks, const PairFacts& pair) {
    ScatterCell cell;
    cell.low = pair.low;
    cell.high = pair.high;
    const PairMoments total = sum_of(blocks);
    cell.pixels = static_cast<std::int64_t>(total.pixels);
    for (double* value :
         {&cell.correlation, &cell.slope, &cell.slope_error, &cell.intercept, &cell.intercept_error,
          &cell.index, &cell.index_error, &cell.index_forward, &cell.index_reverse})
        *value = undefined_pixel;
    if (total.pixels < fewest_pixels) return cell;
    const double sxx = total.variance_x(), syy = total.variance_y(), sxy = total.covariance();
    cell.correlation = sxy / std::sqrt(sxx * syy);
    const Line line = fit_line(total);
    const LineErrors errors = jackknife(blocks, total);
    if (!is_defined(errors.slope) || !std::isfinite(line.slope)) return cell;
    cell.slope = line.slope;
    cell.slope_error = errors.slope;
    cell.intercept = line.intercept;
    cell.intercept_error = errors.intercept;
    cell.index = index_of(line.slope, pair.log_ratio);
    if (!is_defined(cell.index)) return cell;
    cell.index_error =
        std::hypot(errors.slope / line.slope, pair.calibration_error) / std::abs(pair.log_ratio);
    cell.index_forward = index_of(sxy / sxx, pair.log_ratio);
    cell.index_reverse = index_of(syy / sxy, pair.log_ratio);
    return cell;
}

void add_pair(const HealpixGrid& grid, std::span<const SmoothedSurvey> surveys, int cell_nside,
              const PairFacts& pair, std::vector<ScatterCell>& all_sky, std::vector<ScatterCell>& out) {
    const CellBlocks blocks = make_cell_blocks(grid, surveys[pair.low], surveys[pair.high], cell_nside);
    std::vector<PairMoments> sums;
    sums.reserve(static_cast<std::size_t>(blocks.cells.npix()));
    for (std::int64_t nested = 0; nested < blocks.cells.npix(); ++nested)
        sums.push_back(sum_of(blocks.of_cell(static_cast<std::size_t>(nested))));
    all_sky.push_back(make_cell(sums, pair));
    for (std::int64_t ring = 0; ring < blocks.cells.npix(); ++ring) {
        const auto nested = static_cast<std::size_t>(blocks.cells.ring_to_nested(ring));
        if (sums[nested].pixels == 0) continue;
        ScatterCell cell = make_cell(blocks.of_cell(nested), pair);
        cell.nside = cell_nside;
        cell.pixel = ring;
        out.push_back(cell);
    }
}

}  // namespace

void PairMoments::add(const PairMoments& other, double sign) {
    pixels += sign * other.pixels;
    x += sign * other.x;
    y += sign * other.y;
    xx += sign * other.xx;
    xy += sign * other.xy;
    yy += sign * other.yy;
    x_variance += sign * other.x_variance;
    y_variance += sign * other.y_variance;
}

double PairMoments::variance_x() const {
    return xx / pixels - mean_x() * mean_x();
}

double PairMoments::variance_y() const {
    return yy / pixels - mean_y() * mean_y();
}

double PairMoments::covariance() const {
    return xy / pixels - mean_x() * mean_y();
}

Line fit_line(const PairMoments& moments) {
    const double sxx = moments.variance_x(), syy = moments.variance_y(), sxy = moments.covariance();
    double slope = 0;
    if (moments.x_variance == 0 && moments.y_variance == 0) {
        slope = std::copysign(std::sqrt(syy / sxx), sxy);
    } else if (moments.x_variance == 0) {
        slope = sxy / sxx;
    } else {
        const double ratio = moments.y_variance / moments.x_variance;
        const double half = 0.5 * (syy - ratio * sxx);
        const double root = std::sqrt(half * half + ratio * sxy * sxy);
        // The form without cancellation for either sign of the first term.
        slope = half >= 0 ? (half + root) / sxy : ratio * sxy / (root - half);
    }
    if (!std::isfinite(slope)) return {undefined_pixel, undefined_pixel};
    return {slope, moments.mean_y() - slope * moments.mean_x()};
}

CellBlocks make_cell_blocks(const HealpixGrid& grid, const SmoothedSurvey& low, const SmoothedSurvey& high,
                            int cell_nside) {
    FOREGLOW_EXPECTS(is_valid_nside(cell_nside) && cell_nside <= grid.nside());
    CellBlocks out{HealpixGrid(cell_nside), 1, {}};
    const HealpixGrid fine(std::min(4 * cell_nside, grid.nside()));
    out.per_cell = static_cast<std::size_t>(fine.npix() / out.cells.npix());
    out.blocks.resize(static_cast<std::size_t>(fine.npix()));
    const std::int64_t family = grid.npix() / fine.npix();
    parallel_for_blocks(
        fine.npix(), std::max<std::int64_t>(1, 4096 / family), [&](std::int64_t begin, std::int64_t end) {
            std::vector<std::int64_t> children(static_cast<std::size_t>(family));
            for (std::int64_t nested = begin; nested < end; ++nested) {
                grid.ring_numbers(nested * family, children);
                out.blocks[static_cast<std::size_t>(nested)] = moments_of_pixels(low, high, children);
            }
        });
    return out;
}

std::vector<ScatterCell> make_scatter_cells(const HealpixGrid& grid, std::span<const SmoothedSurvey> surveys,
                                            int cell_nside, bool common_errors) {
    std::vector<ScatterCell> all_sky, cells;
    for (std::size_t low = 0; low < surveys.size(); ++low)
        for (std::size_t high = low + 1; high < surveys.size(); ++high) {
            PairFacts pair{low, high, log_frequency_ratio(surveys[high].frequency, surveys[low].frequency),
                           0};
            if (pair.log_ratio == 0) continue;
            if (common_errors)
                pair.calibration_error =
                    std::hypot(surveys[low].calibration_error, surveys[high].calibration_error);
            add_pair(grid, surveys, cell_nside, pair, all_sky, cells);
        }
    all_sky.insert(all_sky.end(), cells.begin(), cells.end());
    return all_sky;
}

}  // namespace foreglow
