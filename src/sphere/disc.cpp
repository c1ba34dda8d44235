// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/disc.h"

#include <algorithm>
#include <cmath>

#include "base/constants.h"
#include "base/error.h"

namespace foreglow {
namespace {

constexpr double full_turn = 2 * constants::pi;

// Returns half the range of azimuth that a circle covers on a ring; below zero where it covers none.
double half_width(const HealpixGrid::Ring& ring, double cos_center, double sin_center, double cos_radius) {
    const double across = ring.sin_theta * sin_center;
    const double along = cos_radius - ring.cos_theta * cos_center;
    if (across <= 0) return along <= 0 ? constants::pi : -1.0;
    const double cosine = along / across;
    if (cosine <= -1) return constants::pi;
    return cosine > 1 ? -1.0 : std::acos(cosine);
}

}  // namespace

std::vector<std::int64_t> pixels_in_disc(const HealpixGrid& grid, const Vector3& center, Angle radius) {
    FOREGLOW_EXPECTS(radius.radians() >= 0 && radius.degrees() <= 180);
    const double sin_center = std::hypot(center[0], center[1]);
    const double phi = std::atan2(center[1], center[0]);
    const double theta = std::atan2(sin_center, center[2]);
    std::vector<std::int64_t> pixels;
    for (int r = 0; r < grid.ring_count(); ++r) {
        const HealpixGrid::Ring ring = grid.ring(r);
        if (std::abs(std::atan2(ring.sin_theta, ring.cos_theta) - theta) > radius.radians()) continue;
        const double half = half_width(ring, center[2], sin_center, std::cos(radius.radians()));
        if (half < 0) continue;
        const double step = full_turn / ring.pixels;
        const auto first = static_cast<std::int64_t>(std::ceil((phi - half - ring.phi0) / step));
        auto last = static_cast<std::int64_t>(std::floor((phi + half - ring.phi0) / step));
        last = std::min(last, first + ring.pixels - 1);
        const auto begin = static_cast<std::ptrdiff_t>(pixels.size());
        for (std::int64_t k = first; k <= last; ++k)
            pixels.push_back(ring.first_pixel + ((k % ring.pixels) + ring.pixels) % ring.pixels);
        std::sort(pixels.begin() + begin, pixels.end());
    }
    return pixels;
}

}  // namespace foreglow
