// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/galaxy_table.h"

#include <algorithm>
#include <cmath>

#include "base/error.h"
#include "base/parallel.h"
#include "math/cubic_b_spline.h"
#include "physics/synchrotron_kernel.h"

namespace foreglow {
namespace {

constexpr double log_a_low = -12;
constexpr double log_a_step = 0.08;
constexpr std::size_t log_a_points = 451;
// Energies lie half a step apart, so that F(a/E^2) of all pairs is one row of numbers.
constexpr double log_energy_step = 0.5 * log_a_step;
constexpr double log_x_high = 6.4;   // F(x) < 1e-260 beyond
constexpr double log_x_low = -36.0;  // E^(1-s) F falls by 1e-12 at least down to here for s > 1.1
constexpr double lowest_log = -600;  // of Phi, for populations that are switched off
constexpr std::size_t heights = GalaxyTable::height_points;

// ln N(E) of the old disc in the plane, of the young disc; and ln of the scale height.
double log_old_density(const GalaxySpec& g, double energy) {
    const auto log_shape = [&](double e) {
        return -g.slope * std::log(e / 10) - (g.slope_above - g.slope) * g.break_width *
                                                 std::log1p(std::pow(e / g.break_energy, 1 / g.break_width));
    };
    return std::log(g.density) + log_shape(energy) - log_shape(10);
}

double log_young_density(const GalaxySpec& g, double energy) {
    return std::log(g.young_share * g.density) - g.young_slope * std::log(energy / 10) -
           (energy - 10) / g.young_cutoff - g.young_turnover_power * std::log1p(g.young_turnover / energy);
}

double scale_height(const GalaxySpec& g, double energy) {
    return g.height * std::pow(1 + energy / g.height_energy, -g.height_power);
}

struct Grid {
    std::vector<double> energy;  // [n]
    std::vector<double> f;       // F at x = exp(log_x_high - i log_a_step)
    std::size_t terms = 0;       // energies for one a
};

// Energy j of point i has ln x = ln a_i - 2 ln E: the smallest energy of point i has ln x = log_x_high.
Grid make_grid() {
    Grid grid;
    grid.terms = static_cast<std::size_t>((log_x_high - log_x_low) / log_a_step) + 1;
    const double log_energy_low = 0.5 * (log_a_low - log_x_high);
    const std::size_t n = grid.terms + log_a_points - 1;
    for (std::size_t j = 0; j < n; ++j)
        grid.energy.push_back(std::exp(log_energy_low + log_energy_step * static_cast<double>(j)));
    for (std::size_t j = 0; j < grid.terms; ++j)
        grid.f.push_back(kernel_f(std::exp(log_x_high - log_a_step * static_cast<double>(j))));
    return grid;
}

// ln of the sum over energies of weight[i + j] f[j], for each a; weights are E N(E) dlnE.
void write_log_phi(const Grid& grid, const std::vector<double>& weight, std::vector<double>& out,
                   std::size_t first, std::size_t stride) {
    for (std::size_t i = 0; i < log_a_points; ++i) {
        double sum = 0;
        for (std::size_t j = 0; j < grid.terms; ++j)
            sum += weight[i + j] * grid.f[j];
        out[first + i * stride] = sum > 0 ? std::max(std::log(sum), lowest_log) : lowest_log;
    }
}

struct Place {
    std::size_t row = 0;  // of the first of the four
    BSplineWeights weights;
    double beyond = 0;  // of ln a past the grid's end
};

Place place_in(double log_a) {
    constexpr double last = static_cast<double>(log_a_points - 1 - GalaxyTable::margin);
    const double wanted = (log_a - log_a_low) / log_a_step;
    const double at = std::clamp(wanted, static_cast<double>(GalaxyTable::margin), last);
    const double whole = std::min(std::floor(at), last - 1);
    return {static_cast<std::size_t>(whole) - 1, b_spline_weights(at - whole), wanted - at};
}

double sum_of(const std::array<double, 4>& weights, const double* values, std::size_t stride) {
    double sum = 0;
    for (std::size_t i = 0; i < 4; ++i)
        sum += weights[i] * values[i * stride];
    return sum;
}

}  // namespace

GalaxyTable::GalaxyTable(const GalaxySpec& galaxy)
    : height_limit_(galaxy.height_limit), old_(log_a_points * heights), young_(log_a_points) {
    const Grid grid = make_grid();
    parallel_for_blocks(height_points, 8, [&](std::int64_t begin, std::int64_t end) {
        std::vector<double> weight(grid.energy.size());
        for (std::int64_t t = begin; t < end; ++t) {
            const double root = height_step * static_cast<double>(t - margin);
            const double height = height_limit_ * root * root;
            for (std::size_t j = 0; j < weight.size(); ++j) {
                const double e = grid.energy[j];
                weight[j] = log_energy_step * e *
                            std::exp(log_old_density(galaxy, e) - height / scale_height(galaxy, e));
            }
            write_log_phi(grid, weight, old_, static_cast<std::size_t>(t), heights);
        }
    });
    std::vector<double> weight;
    for (const double e : grid.energy)
        weight.push_back(log_energy_step * e * std::exp(log_young_density(galaxy, e)));
    write_log_phi(grid, weight, young_, 0, 1);
    make_b_spline_coefficients(old_, heights);
    for (std::size_t i = 0; i < log_a_points; ++i)
        make_b_spline_coefficients(std::span(old_).subspan(i * heights, heights), 1);
    make_b_spline_coefficients(young_, 1);
}

void GalaxyTable::write_old_row(double log_a, std::span<double> out) const {
    FOREGLOW_EXPECTS(out.size() == heights);
    const Place place = place_in(log_a);
    for (std::size_t t = 0; t < heights; ++t) {
        const double* const first = &old_[place.row * heights + t];
        out[t] = sum_of(place.weights.value, first, heights);
        if (place.beyond != 0) out[t] += place.beyond * sum_of(place.weights.slope, first, heights);
    }
}

double GalaxyTable::along_height(std::span<const double> row, double height) const {
    const double at = std::sqrt(height / height_limit_) / height_step + margin;
    const double whole = std::floor(at);
    return sum_of(b_spline_weights(at - whole).value, &row[static_cast<std::size_t>(whole) - 1], 1);
}

double GalaxyTable::log_old(double log_a, double height) const {
    FOREGLOW_EXPECTS(height >= 0 && height <= height_limit_);
    std::vector<double> row(heights);
    write_old_row(log_a, row);
    return along_height(row, height);
}

double GalaxyTable::slope_old(double log_a, double height) const {
    const Place place = place_in(log_a);
    std::vector<double> row(heights);
    for (std::size_t t = 0; t < heights; ++t)
        row[t] = sum_of(place.weights.slope, &old_[place.row * heights + t], heights) / log_a_step;
    return along_height(row, height);
}

double GalaxyTable::log_young(double log_a) const {
    const Place place = place_in(log_a);
    const double* const first = &young_[place.row];
    return sum_of(place.weights.value, first, 1) + place.beyond * sum_of(place.weights.slope, first, 1);
}

GalaxyNodes::GalaxyNodes(const GalaxyTable& table, std::span<const Frequency> frequencies)
    : frequencies_(frequencies.begin(), frequencies.end()),
      padded_((frequencies.size() + lanes - 1) / lanes * lanes) {
    FOREGLOW_EXPECTS(!frequencies.empty());
    old_.resize(static_cast<std::size_t>(field_points) * heights * padded_);
    young_.resize(static_cast<std::size_t>(field_points) * padded_);
    parallel_for_blocks(static_cast<std::int64_t>(padded_), 1, [&](std::int64_t node, std::int64_t) {
        const auto k = static_cast<std::size_t>(node);
        const double log_nu = std::log(frequencies_[std::min(k, frequencies_.size() - 1)].hz());
        std::vector<double> rows(static_cast<std::size_t>(field_points) * heights);
        std::vector<double> young(static_cast<std::size_t>(field_points));
        for (std::size_t b = 0; b < young.size(); ++b) {
            const double log_field = std::log(field_low) + field_step * (static_cast<double>(b) - margin);
            const double log_a = log_nu - std::log(critical_frequency_constant_hz()) - log_field;
            table.write_old_row(log_a, std::span(rows).subspan(b * heights, heights));
            young[b] = table.log_young(log_a);
        }
        make_b_spline_coefficients(rows, heights);
        make_b_spline_coefficients(young, 1);
        for (std::size_t i = 0; i < rows.size(); ++i)
            old_[i * padded_ + k] = rows[i];
        for (std::size_t b = 0; b < young.size(); ++b)
            young_[b * padded_ + k] = young[b];
    });
}

}  // namespace foreglow
