// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/pixel_route.h"

#include <algorithm>

#include "base/error.h"

namespace foreglow {
namespace {

constexpr std::size_t block = 512;

void multiply(std::span<const double> amplitude, std::span<const double> factor, std::span<double> out) {
    for (std::size_t i = 0; i < out.size(); ++i)
        out[i] = amplitude[i] * factor[i];
}

}  // namespace

PixelRoute::PixelRoute(const SkyModel& sky, std::span<const BandSum> bands, bool polarized,
                       double tolerance) {
    const ParameterRange range = parameter_range(sky);
    for (const BandSum& band : bands)
        intensity_laws_.emplace_back(band, sky.reference, range, tolerance);
    if (!polarized || polarization_shares_law(sky)) return;
    const ParameterRange own_range = polarized_parameter_range(sky);
    for (const BandSum& band : bands)
        polarized_laws_.emplace_back(band, sky.polarization->reference, own_range, tolerance);
}

double PixelRoute::error_of(std::size_t channel) const {
    const double own = polarized_laws_.empty() ? 0.0 : polarized_laws_[channel].worst_error();
    return std::max(own, intensity_laws_[channel].worst_error());
}

void PixelRoute::make_pixels(const SkyStrip& strip, std::size_t channel, std::size_t begin, std::size_t end,
                             std::span<const std::span<double>> out) const {
    FOREGLOW_EXPECTS(out.size() == 1 || (out.size() == 3 && !strip.q.empty()));
    std::vector<double> factor(block);
    for (std::size_t first = begin; first < end; first += block) {
        const std::size_t n = std::min(block, end - first);
        const std::span<double> f(factor.data(), n);
        const auto part = [&](const std::vector<double>& values) {
            return std::span(values).subspan(first, n);
        };
        intensity_laws_[channel].evaluate(part(strip.index), part(strip.curvature), f);
        multiply(part(strip.intensity), f, out[0].subspan(first - begin, n));
        if (out.size() == 1) continue;
        if (!polarized_laws_.empty())
            polarized_laws_[channel].evaluate(part(strip.polarized_index), part(strip.polarized_curvature),
                                              f);
        multiply(part(strip.q), f, out[1].subspan(first - begin, n));
        multiply(part(strip.u), f, out[2].subspan(first - begin, n));
    }
}

}  // namespace foreglow
