// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/pixel_route.h"

#include <algorithm>
#include <array>

#include "base/error.h"
#include "base/vector_width.h"

namespace foreglow {
namespace {

constexpr std::size_t block = 512;

FOREGLOW_WIDE
void multiply(std::span<const double> amplitude, std::span<const double> factor, std::span<double> out) {
    for (std::size_t i = 0; i < out.size(); ++i)
        out[i] = amplitude[i] * factor[i];
}

// Weights that take each band's own maps.
Matrix pick_bands(const NodeSky& nodes, std::span<const BandSum> bands) {
    Matrix weights(bands.size(), nodes.bands.size());
    for (std::size_t c = 0; c < bands.size(); ++c)
        weights(c, place_of_component(nodes, bands[c], true)) = 1.0;
    return weights;
}

void combine(const Matrix& weights, std::size_t channel, const std::vector<std::vector<double>>& maps,
             std::size_t begin, std::span<double> out) {
    std::fill(out.begin(), out.end(), 0.0);
    for (std::size_t k = 0; k < maps.size(); ++k) {
        const double weight = weights(channel, k);
        if (weight == 0) continue;
        for (std::size_t i = 0; i < out.size(); ++i)
            out[i] += weight * maps[k][begin + i];
    }
}

}  // namespace

PixelRoute::PixelRoute(const SkyModel& sky, std::span<const BandSum> bands, bool polarized, double tolerance)
    : channel_count_(bands.size()), polarized_(polarized) {
    if (sky.nodes) {
        node_weights_ = make_node_basis(*sky.nodes, bands).weights;
        node_errors_ = measure_node_errors(*sky.nodes, bands, polarized).worst;
        if (polarized && !sky.nodes->q.empty()) polarized_weights_ = node_weights_;
        if (polarized && sky.nodes->q.empty()) polarized_weights_ = pick_bands(*sky.nodes, bands);
        return;
    }
    const SkyLaw law = intensity_law(sky);
    intensity_laws_.reserve(bands.size());
    for (const BandSum& band : bands)
        intensity_laws_.emplace_back(law, band, tolerance);
    if (!polarized || polarization_shares_law(sky)) return;
    const SkyLaw own_law = polarized_law(sky);
    polarized_laws_.reserve(bands.size());
    for (const BandSum& band : bands)
        polarized_laws_.emplace_back(own_law, band, tolerance);
}

double PixelRoute::error_of(std::size_t channel) const {
    if (!node_errors_.empty()) return node_errors_[channel];
    const double own = polarized_laws_.empty() ? 0.0 : polarized_laws_[channel].worst_error();
    return std::max(own, intensity_laws_[channel].worst_error());
}

void PixelRoute::make_pixels(const SkyStrip& strip, std::size_t channel, std::size_t begin, std::size_t end,
                             std::span<const std::span<double>> out, ExpPrecision precision) const {
    FOREGLOW_EXPECTS(out.size() == 1 || (out.size() == 3 && !strip.q.empty()));
    if (!node_errors_.empty()) return make_node_pixels(strip, channel, begin, end, out);
    std::array<double, block> factor;
    for (std::size_t first = begin; first < end; first += block) {
        const std::size_t n = std::min(block, end - first);
        const std::span<double> f(factor.data(), n);
        const auto part = [&](const std::vector<double>& values) {
            return std::span(values).subspan(first, n);
        };
        intensity_laws_[channel].evaluate(strip.intensity_columns().part(first, n), f, precision);
        multiply(part(strip.intensity), f, out[0].subspan(first - begin, n));
        if (out.size() == 1) continue;
        if (!polarized_laws_.empty())
            polarized_laws_[channel].evaluate(strip.polarized_columns().part(first, n), f, precision);
        multiply(part(strip.q), f, out[1].subspan(first - begin, n));
        multiply(part(strip.u), f, out[2].subspan(first - begin, n));
    }
}

void PixelRoute::make_node_pixels(const SkyStrip& strip, std::size_t channel, std::size_t begin,
                                  std::size_t end, std::span<const std::span<double>> out) const {
    FOREGLOW_EXPECTS(!strip.node_i.empty() && out[0].size() == end - begin);
    combine(node_weights_, channel, strip.node_i, begin, out[0]);
    if (out.size() == 1) return;
    combine(polarized_weights_, channel, strip.node_q, begin, out[1]);
    combine(polarized_weights_, channel, strip.node_u, begin, out[2]);
}

SkyStrip PixelRoute::make_strip(const SkyModel& sky, const RingStrip& strip) const {
    return sky.nodes ? make_node_strip(sky, strip, polarized_) : make_sky_strip(sky, strip, polarized_);
}

}  // namespace foreglow
