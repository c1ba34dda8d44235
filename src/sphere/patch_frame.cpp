// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/patch_frame.h"

#include <cmath>

#include "base/error.h"
#include "base/parallel.h"
#include "sphere/projection.h"

namespace foreglow {
namespace {

double dot(const Vector3& a, const Vector3& b) {
    return a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
}

}  // namespace

PatchFrame::PatchFrame(Angle longitude, Angle latitude, Angle pixel, int pixels)
    : longitude_(longitude), latitude_(latitude), pixel_(pixel), pixels_(pixels) {
    FOREGLOW_EXPECTS(pixels >= 1 && pixel.radians() > 0);
}

PatchFrame PatchFrame::with_margin(int margin) const {
    return {longitude_, latitude_, pixel_, pixels_ + 2 * margin};
}

std::vector<Vector3> PatchFrame::directions() const {
    const Gnomonic plane(longitude_, latitude_);
    const auto n = static_cast<std::size_t>(pixels_);
    const double middle = 0.5 * (pixels_ - 1), side = pixel_.radians();
    std::vector<Vector3> out(n * n);
    parallel_for_blocks(pixels_, 16, [&](std::int64_t begin, std::int64_t end) {
        for (auto j = static_cast<std::size_t>(begin); j < static_cast<std::size_t>(end); ++j)
            for (std::size_t i = 0; i < n; ++i)
                out[j * n + i] = *plane.direction_at((static_cast<double>(i) - middle) * side,
                                                     (static_cast<double>(j) - middle) * side);
    });
    return out;
}

std::vector<double> PatchFrame::turns(const Matrix3& rotation) const {
    const double lon = longitude_.radians(), lat = latitude_.radians();
    const Vector3 center =
        rotate(rotation, {std::cos(lat) * std::cos(lon), std::cos(lat) * std::sin(lon), std::sin(lat)});
    const Vector3 south =
        rotate(rotation, {std::sin(lat) * std::cos(lon), std::sin(lat) * std::sin(lon), -std::cos(lat)});
    const std::vector<Vector3> places = directions();
    std::vector<double> out(places.size());
    parallel_for_blocks(
        static_cast<std::int64_t>(out.size()), 4096, [&](std::int64_t begin, std::int64_t end) {
            for (auto i = static_cast<std::size_t>(begin); i < static_cast<std::size_t>(end); ++i) {
                const Vector3 n = rotate(rotation, places[i]);
                // The rotation that takes the centre to n along their great circle.
                const double share = dot(n, south) / (1 + dot(center, n));
                Vector3 carried{};
                for (std::size_t c = 0; c < 3; ++c)
                    carried[c] = south[c] - share * (center[c] + n[c]);
                const double across = std::hypot(n[0], n[1]);
                const double cosine = across > 0 ? n[0] / across : 1.0,
                             sine = across > 0 ? n[1] / across : 0.0;
                const Vector3 local_south = {n[2] * cosine, n[2] * sine, -across};
                const Vector3 local_east = {-sine, cosine, 0};
                out[i] = std::atan2(dot(carried, local_east), dot(carried, local_south));
            }
        });
    return out;
}

}  // namespace foreglow
