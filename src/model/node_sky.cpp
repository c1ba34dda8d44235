// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/node_sky.h"

#include <algorithm>
#include <cmath>

#include "base/constants.h"
#include "base/error.h"
#include "base/parallel.h"

namespace foreglow {
namespace {

// One over the products of a node's distances to the others, up to a common factor.
std::vector<double> barycentric_weights(const std::vector<double>& nodes) {
    const double length = std::max(nodes.back() - nodes.front(), 1e-30);
    std::vector<double> weights;
    weights.reserve(nodes.size());
    for (std::size_t k = 0; k < nodes.size(); ++k) {
        double product = 1;
        for (std::size_t j = 0; j < nodes.size(); ++j)
            if (j != k) product *= 4 * (nodes[k] - nodes[j]) / length;
        weights.push_back(1 / product);
    }
    return weights;
}

void add_lagrange(const std::vector<double>& nodes, const std::vector<double>& barycentric, double x,
                  double factor, std::vector<double>& out) {
    for (std::size_t k = 0; k < nodes.size(); ++k)
        if (x == nodes[k]) {
            out[k] += factor;
            return;
        }
    double sum = 0;
    for (std::size_t k = 0; k < nodes.size(); ++k)
        sum += barycentric[k] / (x - nodes[k]);
    for (std::size_t k = 0; k < nodes.size(); ++k)
        out[k] += factor * barycentric[k] / (x - nodes[k]) / sum;
}

Matrix all_weights(const NodeInterpolation& nodes, std::span<const BandSum> channels) {
    Matrix weights(channels.size(), nodes.log_hz.size());
    for (std::size_t c = 0; c < channels.size(); ++c) {
        const auto row = nodes.weights(channels[c]);
        for (std::size_t k = 0; k < row.size(); ++k)
            weights(c, k) = row[k];
    }
    return weights;
}

bool is_same(const BandSum& a, const BandSum& b) {
    return a.hz == b.hz && a.weights == b.weights;
}

double dot(const Matrix& values, std::size_t row, const std::vector<double>& weights) {
    double sum = 0;
    for (std::size_t k = 0; k < weights.size(); ++k)
        sum += values(row, k) * weights[k];
    return sum;
}

// Weights on the sample's nodes of what the sky's nodes make of a band.
std::vector<double> approximate_weights(const NodeSky& sky, const BandSum& band, const Matrix& to_nodes) {
    const auto own = sky.nodes.weights(band);
    std::vector<double> through(sky.sample.nodes.log_hz.size(), 0.0);
    for (std::size_t k = 0; k < own.size(); ++k)
        for (std::size_t j = 0; j < through.size(); ++j)
            through[j] += own[k] * to_nodes(k, j);
    return through;
}

// Tells whether a band has no other frequencies than the nodes, so that nothing is interpolated.
bool is_on_nodes(const NodeInterpolation& nodes, const BandSum& band) {
    return std::all_of(band.hz.begin(), band.hz.end(), [&](double hz) {
        return std::find(nodes.log_hz.begin(), nodes.log_hz.end(), std::log(hz)) != nodes.log_hz.end();
    });
}

struct Errors {
    double rms = 0, worst = 0;
};

Errors intensity_errors(const NodeSky& sky, const std::vector<double>& exact,
                        const std::vector<double>& got) {
    Errors errors;
    double error2 = 0;
    double truth2 = 0;
    for (std::size_t p = 0; p < sky.sample.i.rows; ++p) {
        const double truth = dot(sky.sample.i, p, exact);
        const double error = dot(sky.sample.i, p, got) - truth;
        error2 += error * error;
        truth2 += truth * truth;
        if (truth != 0) errors.worst = std::max(errors.worst, std::abs(error / truth));
    }
    if (truth2 > 0) errors.rms = std::sqrt(error2 / truth2);
    return errors;
}

Errors polarized_errors(const NodeSky& sky, const std::vector<double>& exact,
                        const std::vector<double>& got) {
    const std::size_t pixels = sky.sample.q.rows;
    std::vector<double> error(pixels), truth(pixels);
    double error2 = 0;
    double truth2 = 0;
    for (std::size_t p = 0; p < pixels; ++p) {
        const double q = dot(sky.sample.q, p, exact);
        const double u = dot(sky.sample.u, p, exact);
        truth[p] = std::hypot(q, u);
        error[p] = std::hypot(dot(sky.sample.q, p, got) - q, dot(sky.sample.u, p, got) - u);
        error2 += error[p] * error[p];
        truth2 += truth[p] * truth[p];
    }
    Errors errors;
    if (!(truth2 > 0)) return errors;
    errors.rms = std::sqrt(error2 / truth2);
    const double level = std::sqrt(truth2 / static_cast<double>(pixels));
    for (std::size_t p = 0; p < pixels; ++p)
        errors.worst = std::max(errors.worst, error[p] / std::max(truth[p], level));
    return errors;
}

}  // namespace

NodeInterpolation::NodeInterpolation(std::vector<double> log_hz_in,
                                     std::function<double(double)> log_spectrum_in)
    : log_hz(std::move(log_hz_in)), log_spectrum(std::move(log_spectrum_in)) {
    FOREGLOW_EXPECTS(!log_hz.empty() && std::is_sorted(log_hz.begin(), log_hz.end()));
    log_common.reserve(log_hz.size());
    for (const double x : log_hz)
        log_common.push_back(log_spectrum(x));
}

std::vector<double> NodeInterpolation::weights(const BandSum& band) const {
    const auto barycentric = barycentric_weights(log_hz);
    std::vector<double> out(log_hz.size(), 0.0);
    // The common spectrum is taken relative to the middle node, so that nothing overflows.
    const double middle = log_common[log_common.size() / 2];
    for (std::size_t i = 0; i < band.hz.size(); ++i) {
        const double x = std::log(band.hz[i]);
        add_lagrange(log_hz, barycentric, x, band.weights[i] * std::exp(log_spectrum(x) - middle), out);
    }
    for (std::size_t k = 0; k < out.size(); ++k)
        out[k] *= std::exp(middle - log_common[k]);
    return out;
}

std::vector<double> make_chebyshev_points(double low, double high, int count) {
    std::vector<double> points;
    points.reserve(static_cast<std::size_t>(count));
    for (int k = 0; k < count; ++k)
        points.push_back(0.5 * (low + high) -
                         0.5 * (high - low) * std::cos(constants::pi * (k + 0.5) / count));
    return points;
}

SpectralBasis make_node_basis(const NodeSky& sky, std::span<const BandSum> channels) {
    SpectralBasis basis;
    for (const double x : sky.nodes.log_hz)
        basis.components.push_back({{std::exp(x)}, {1.0}});
    basis.weights = all_weights(sky.nodes, channels);
    const NodeErrors errors = measure_node_errors(sky, channels, false);
    basis.worst_error = *std::max_element(errors.worst.begin(), errors.worst.end());
    return basis;
}

SpectralBasis make_polarized_node_basis(const NodeSky& sky, std::span<const BandSum> channels) {
    if (!sky.q.empty()) return make_node_basis(sky, channels);
    SpectralBasis basis;
    basis.components.assign(channels.begin(), channels.end());
    basis.weights = Matrix(channels.size(), channels.size());
    for (std::size_t c = 0; c < channels.size(); ++c)
        basis.weights(c, c) = 1.0;
    basis.is_exact = true;
    return basis;
}

std::size_t place_of_component(const NodeSky& sky, const BandSum& component, bool polarized) {
    if (!polarized || !sky.q.empty()) {
        for (std::size_t k = 0; k < sky.nodes.log_hz.size(); ++k)
            if (component.hz.size() == 1 && component.hz[0] == std::exp(sky.nodes.log_hz[k])) return k;
    } else {
        for (std::size_t c = 0; c < sky.bands.size(); ++c)
            if (is_same(sky.bands[c], component)) return c;
    }
    FOREGLOW_EXPECTS(false);
}

NodeErrors measure_node_errors(const NodeSky& sky, std::span<const BandSum> channels, bool polarized) {
    NodeErrors errors{std::vector<double>(channels.size()), std::vector<double>(channels.size())};
    Matrix to_nodes(sky.nodes.log_hz.size(), sky.sample.nodes.log_hz.size());
    for (std::size_t k = 0; k < to_nodes.rows; ++k) {
        const auto row = sky.sample.nodes.weights({{std::exp(sky.nodes.log_hz[k])}, {1.0}});
        for (std::size_t j = 0; j < row.size(); ++j)
            to_nodes(k, j) = row[j];
    }
    const bool check_stokes = polarized && !sky.q.empty();
    parallel_for_blocks(static_cast<std::int64_t>(channels.size()), 1, [&](std::int64_t begin, std::int64_t) {
        const auto c = static_cast<std::size_t>(begin);
        if (is_on_nodes(sky.nodes, channels[c])) return;
        const auto exact = sky.sample.nodes.weights(channels[c]);
        const auto got = approximate_weights(sky, channels[c], to_nodes);
        Errors found = intensity_errors(sky, exact, got);
        if (check_stokes) {
            const Errors own = polarized_errors(sky, exact, got);
            found = {std::max(found.rms, own.rms), std::max(found.worst, own.worst)};
        }
        errors.rms[c] = found.rms;
        errors.worst[c] = found.worst;
    });
    return errors;
}

}  // namespace foreglow
