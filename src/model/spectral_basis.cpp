// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/spectral_basis.h"

#include <algorithm>
#include <cmath>

#include "base/constants.h"
#include "base/error.h"
#include "physics/spectral_law.h"

namespace foreglow {
namespace {

std::vector<SpectralParameters> grid_over(const ParameterRange& range, int index_points,
                                          int curvature_points) {
    std::vector<SpectralParameters> grid;
    const bool one_index = !(range.index_high > range.index_low);
    const bool one_curvature = !(range.curvature_high > range.curvature_low);
    const int n = one_index ? 1 : index_points;
    const int m = one_curvature ? 1 : curvature_points;
    const auto at = [](double low, double high, int i, int count) {
        return count == 1 ? 0.5 * (low + high) : low + (high - low) * i / (count - 1);
    };
    for (int j = 0; j < m; ++j)
        for (int i = 0; i < n; ++i)
            grid.push_back({at(range.index_low, range.index_high, i, n),
                            at(range.curvature_low, range.curvature_high, j, m)});
    return grid;
}

// [parameters][bands]: the exact band values, by the sum itself.
Matrix exact_values(const std::vector<BandSum>& bands, Frequency reference,
                    const std::vector<SpectralParameters>& grid) {
    Matrix values(grid.size(), bands.size());
    for (std::size_t j = 0; j < grid.size(); ++j)
        for (std::size_t b = 0; b < bands.size(); ++b)
            values(j, b) = exact_band_value(bands[b], reference, grid[j].index, grid[j].curvature);
    return values;
}

std::vector<BandSum> chebyshev_components(double log_low, double log_high, int count) {
    std::vector<BandSum> components;
    for (int k = 0; k < count; ++k) {
        const double x = -std::cos(constants::pi * (k + 0.5) / count);
        components.push_back(
            {{std::exp(0.5 * (log_low + log_high) + 0.5 * (log_high - log_low) * x)}, {1.0}});
    }
    return components;
}

Matrix fit_weights(const Matrix& component_values, const Matrix& channel_values) {
    const std::size_t samples = component_values.rows;
    const std::size_t count = component_values.columns;
    Matrix weights(channel_values.columns, count);
    const std::size_t rows = std::max(samples, count);  // zero rows below keep a lone sample solvable
    for (std::size_t c = 0; c < channel_values.columns; ++c) {
        Matrix a(rows, count);
        std::vector<double> b(rows, 0.0);
        std::vector<double> scale(count);
        for (std::size_t k = 0; k < count; ++k)
            scale[k] = channel_values(0, c) / component_values(0, k);
        for (std::size_t j = 0; j < samples; ++j) {
            for (std::size_t k = 0; k < count; ++k)
                a(j, k) = scale[k] * component_values(j, k) / channel_values(j, c);
            b[j] = 1.0;
        }
        const std::vector<double> x = solve_least_squares(std::move(a), std::move(b));
        for (std::size_t k = 0; k < count; ++k)
            weights(c, k) = x[k] * scale[k];
    }
    return weights;
}

double worst_relative_error(const Matrix& weights, const Matrix& component_values,
                            const Matrix& channel_values) {
    double worst = 0;
    for (std::size_t j = 0; j < component_values.rows; ++j)
        for (std::size_t c = 0; c < weights.rows; ++c) {
            double sum = 0;
            for (std::size_t k = 0; k < weights.columns; ++k)
                sum += weights(c, k) * component_values(j, k);
            worst = std::max(worst, std::abs(sum / channel_values(j, c) - 1.0));
        }
    return worst;
}

SpectralBasis channels_themselves(const std::vector<BandSum>& channels) {
    SpectralBasis basis;
    basis.components = channels;
    basis.weights = Matrix(channels.size(), channels.size());
    for (std::size_t c = 0; c < channels.size(); ++c)
        basis.weights(c, c) = 1.0;
    basis.is_exact = true;
    return basis;
}

}  // namespace

SpectralBasis make_spectral_basis(const std::vector<BandSum>& channels, Frequency reference,
                                  const ParameterRange& range, double tolerance) {
    FOREGLOW_EXPECTS(!channels.empty() && tolerance > 1e-12);
    double log_low = std::log(channels.front().hz.front());
    double log_high = log_low;
    for (const BandSum& band : channels)
        for (const double hz : band.hz) {
            log_low = std::min(log_low, std::log(hz));
            log_high = std::max(log_high, std::log(hz));
        }
    constexpr int most_components = 28;
    const auto fit_grid = grid_over(range, 21, 9);
    const auto check_grid = grid_over(range, 47, 14);
    const Matrix fit_channels = exact_values(channels, reference, fit_grid);
    const Matrix check_channels = exact_values(channels, reference, check_grid);
    for (int count = 1; count < static_cast<int>(channels.size()) && count <= most_components; ++count) {
        SpectralBasis basis;
        basis.components = chebyshev_components(log_low, log_high, count);
        basis.weights = fit_weights(exact_values(basis.components, reference, fit_grid), fit_channels);
        basis.worst_error = worst_relative_error(
            basis.weights, exact_values(basis.components, reference, check_grid), check_channels);
        if (basis.worst_error <= tolerance) return basis;
    }
    return channels_themselves(channels);
}

}  // namespace foreglow
