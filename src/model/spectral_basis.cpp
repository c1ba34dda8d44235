// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/spectral_basis.h"

#include <algorithm>
#include <cmath>

#include "base/constants.h"
#include "base/error.h"

namespace foreglow {
namespace {

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

SpectralBasis make_spectral_basis(const std::vector<BandSum>& channels, const SkyLaw& law, double tolerance) {
    FOREGLOW_EXPECTS(!channels.empty() && tolerance > 1e-12);
    double log_low = std::log(channels.front().hz.front());
    double log_high = log_low;
    for (const BandSum& band : channels)
        for (const double hz : band.hz) {
            log_low = std::min(log_low, std::log(hz));
            log_high = std::max(log_high, std::log(hz));
        }
    constexpr int most_components = 28;
    const LawPoints fit_grid = make_law_grid(law, 21, 9);
    const LawPoints check_grid = make_law_grid(law, 47, 14);
    const Matrix fit_channels = exact_band_values(law, channels, fit_grid.columns());
    const Matrix check_channels = exact_band_values(law, channels, check_grid.columns());
    for (int count = 1; count < static_cast<int>(channels.size()) && count <= most_components; ++count) {
        SpectralBasis basis;
        basis.components = chebyshev_components(log_low, log_high, count);
        basis.weights =
            fit_weights(exact_band_values(law, basis.components, fit_grid.columns()), fit_channels);
        basis.worst_error = worst_relative_error(
            basis.weights, exact_band_values(law, basis.components, check_grid.columns()), check_channels);
        if (basis.worst_error <= tolerance) return basis;
    }
    return channels_themselves(channels);
}

}  // namespace foreglow
