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

}  // namespace

PixelRoute::PixelRoute(const SkyModel& sky, std::span<const BandSum> bands, bool polarized,
                       double tolerance) {
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
    const double own = polarized_laws_.empty() ? 0.0 : polarized_laws_[channel].worst_error();
    return std::max(own, intensity_laws_[channel].worst_error());
}

void PixelRoute::make_pixels(const SkyStrip& strip, std::size_t channel, std::size_t begin, std::size_t end,
                             std::span<const std::span<double>> out, ExpPrecision precision) const {
    FOREGLOW_EXPECTS(out.size() == 1 || (out.size() == 3 && !strip.q.empty()));
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

}  // namespace foreglow
