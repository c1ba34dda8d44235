// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/patch_beam.h"

#include <algorithm>
#include <cmath>
#include <vector>

#include "base/constants.h"
#include "base/error.h"

namespace foreglow {
namespace {

double window(const Channel& channel, double k) {
    if (channel.beam_fwhm) {
        const double sigma = channel.beam_fwhm->radians() / std::sqrt(8 * std::log(2.0));
        return std::exp(-0.5 * k * k * sigma * sigma);
    }
    const auto& table = channel.beam->temperature;
    const double l = std::max(0.0, k - 0.5);
    const auto low = static_cast<std::size_t>(l);
    if (low + 1 >= table.size()) return 0.0;
    const double rest = l - static_cast<double>(low);
    return (1 - rest) * table[low] + rest * table[low + 1];
}

}  // namespace

PatchBeam::PatchBeam(int pixels, Angle pixel)
    : pixels_(pixels), plane_(quick_fft_size(pixels), quick_fft_size(pixels)), side_(pixel.radians()) {}

void PatchBeam::apply(const Channel& channel, std::span<double> image) const {
    FOREGLOW_EXPECTS(channel.beam.has_value());
    const auto n = static_cast<std::size_t>(pixels_), whole = static_cast<std::size_t>(plane_.nx());
    FOREGLOW_EXPECTS(image.size() == n * n);
    // What the torus has beyond the image repeats the nearer edge.
    std::vector<double> torus(whole * whole);
    const auto nearest = [&](std::size_t i) { return i < n ? i : (i - n < (whole - n) / 2 ? n - 1 : 0); };
    for (std::size_t y = 0; y < whole; ++y)
        for (std::size_t x = 0; x < whole; ++x)
            torus[y * whole + x] = image[nearest(y) * n + nearest(x)];
    auto modes = plane_.forward(torus);
    const double step = 2 * constants::pi / (plane_.nx() * side_);
    for (std::size_t y = 0; y < whole; ++y)
        for (std::size_t x = 0; x < plane_.row(); ++x)
            modes[y * plane_.row() + x] *=
                window(channel, std::hypot(plane_.wave_x(x) * step, plane_.wave_y(y) * step));
    const auto smooth = plane_.inverse(std::move(modes));
    for (std::size_t y = 0; y < n; ++y)
        std::copy_n(smooth.begin() + static_cast<std::ptrdiff_t>(y * whole), n,
                    image.begin() + static_cast<std::ptrdiff_t>(y * n));
}

}  // namespace foreglow
