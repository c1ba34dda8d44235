// SPDX-License-Identifier: GPL-2.0-or-later
#include "estimate/zero_level_fit.h"

#include <algorithm>
#include <cmath>

#include "base/error.h"
#include "estimate/scatter_fit.h"

namespace foreglow {
namespace {

constexpr double fewest_pixels = 10;
constexpr int most_iterations = 200;

/// The moments of one cell and pair.
struct Cell {
    std::size_t low = 0, high = 0;
    PairMoments moments;
    double independent_share = 1;  ///< n_eff/n
};

/// What a cell says about the levels at the current ones.
struct CellPull {
    double slope = 0, residual = 0, gradient_weight = 0, information = 0;
};

// The moments about (z_x, z_y) in place of those about the origin.
PairMoments shifted(const PairMoments& m, double zx, double zy) {
    PairMoments out = m;
    out.xx = m.xx - 2 * zx * m.x + m.pixels * zx * zx;
    out.yy = m.yy - 2 * zy * m.y + m.pixels * zy * zy;
    out.xy = m.xy - zx * m.y - zy * m.x + m.pixels * zx * zy;
    out.x = m.x - m.pixels * zx;
    out.y = m.y - m.pixels * zy;
    return out;
}

// The line through the origin: the same formula with second moments about it.
double slope_through_origin(PairMoments m) {
    m.x = m.y = 0;
    return fit_line(m).slope;
}

CellPull pull_of(const Cell& cell, std::span<const double> levels) {
    const PairMoments m = shifted(cell.moments, levels[cell.low], levels[cell.high]);
    const double a = slope_through_origin(m);
    if (!(a > 0)) return {};
    const double n = m.pixels;
    const double tiny = 1e-18 * (m.yy + a * a * m.xx) / n;  // of surveys that claim no noise
    const double variance = (m.y_variance + a * a * m.x_variance) / n + tiny;
    const double scatter = (m.variance_y() - 2 * a * m.covariance() + a * a * m.variance_x()) / variance;
    const double effective = std::max(1.0, n * cell.independent_share) / std::max(1.0, scatter);
    // The slope is free: of n samples the share var x/<x^2> is left for the intercept.
    const double left = std::max(0.0, m.variance_x() - m.x_variance / n) * n / m.xx;
    return {a, m.mean_y() - a * m.mean_x(), effective / variance, left * effective / variance};
}

std::vector<Cell> make_cells(const HealpixGrid& grid, std::span<const SmoothedSurvey> surveys,
                             int cell_nside) {
    std::vector<Cell> out;
    for (std::size_t low = 0; low + 1 < surveys.size(); ++low) {
        const std::size_t high = low + 1;
        const CellBlocks blocks = make_cell_blocks(grid, surveys[low], surveys[high], cell_nside);
        const double area = std::max(surveys[low].noise_area, surveys[high].noise_area);
        for (std::int64_t c = 0; c < blocks.cells.npix(); ++c) {
            Cell cell{low, high, {}, std::min(1.0, grid.pixel_area() / area)};
            for (const PairMoments& block : blocks.of_cell(static_cast<std::size_t>(c)))
                cell.moments.add(block);
            if (cell.moments.pixels >= fewest_pixels) out.push_back(cell);
        }
    }
    return out;
}

/// The normal equations of the free levels.
struct Normal {
    Matrix matrix;
    std::vector<double> gradient;
};

Normal make_normal(std::span<const Cell> cells, std::span<const SmoothedSurvey> surveys,
                   std::span<const std::size_t> place, std::size_t free, std::span<const double> levels) {
    Normal out{Matrix(free, free), std::vector<double>(free)};
    for (std::size_t s = 0; s < surveys.size(); ++s) {
        if (place[s] == free) continue;
        const double precision = 1 / (surveys[s].zero_level_error * surveys[s].zero_level_error);
        out.matrix(place[s], place[s]) += precision;
        out.gradient[place[s]] -= precision * levels[s];
    }
    for (const Cell& cell : cells) {
        const CellPull pull = pull_of(cell, levels);
        if (pull.gradient_weight == 0) continue;
        const std::size_t x = place[cell.low], y = place[cell.high];
        const double push = pull.gradient_weight * pull.residual;
        if (x < free) {
            out.gradient[x] -= pull.slope * push;
            out.matrix(x, x) += pull.slope * pull.slope * pull.information;
        }
        if (y < free) {
            out.gradient[y] += push;
            out.matrix(y, y) += pull.information;
        }
        if (x < free && y < free) {
            out.matrix(x, y) -= pull.slope * pull.information;
            out.matrix(y, x) -= pull.slope * pull.information;
        }
    }
    return out;
}

}  // namespace

Matrix stated_zero_level_covariance(std::span<const SmoothedSurvey> surveys) {
    Matrix out(surveys.size(), surveys.size());
    for (std::size_t s = 0; s < surveys.size(); ++s)
        out(s, s) = surveys[s].zero_level_error * surveys[s].zero_level_error;
    return out;
}

ZeroLevelFit fit_zero_levels(const HealpixGrid& grid, std::span<const SmoothedSurvey> surveys,
                             int cell_nside) {
    const std::vector<Cell> cells = make_cells(grid, surveys, cell_nside);
    std::size_t free = 0;
    for (const SmoothedSurvey& survey : surveys)
        free += survey.zero_level_error > 0 ? 1U : 0U;
    FOREGLOW_EXPECTS(free > 0);
    std::vector<std::size_t> place(surveys.size(), free);
    for (std::size_t s = 0, next = 0; s < surveys.size(); ++s)
        if (surveys[s].zero_level_error > 0) place[s] = next++;
    ZeroLevelFit out{std::vector<double>(surveys.size()), Matrix(surveys.size(), surveys.size()), 0, false};
    while (out.iterations < most_iterations && !out.converged) {
        const Normal normal = make_normal(cells, surveys, place, free, out.levels);
        const std::vector<double> step = solve_least_squares(normal.matrix, normal.gradient);
        ++out.iterations;
        out.converged = true;
        for (std::size_t s = 0; s < surveys.size(); ++s) {
            if (place[s] == free) continue;
            out.levels[s] += step[place[s]];
            out.converged = out.converged && std::abs(step[place[s]]) < 1e-6 * surveys[s].zero_level_error;
        }
    }
    const Normal normal = make_normal(cells, surveys, place, free, out.levels);
    for (std::size_t s = 0; s < surveys.size(); ++s) {
        if (place[s] == free) continue;
        std::vector<double> unit(free);
        unit[place[s]] = 1;
        const std::vector<double> column = solve_least_squares(normal.matrix, unit);
        for (std::size_t t = 0; t < surveys.size(); ++t)
            if (place[t] < free) out.covariance(t, s) = column[place[t]];
    }
    return out;
}

}  // namespace foreglow
