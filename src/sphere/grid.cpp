// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/grid.h"

#include <healpix_base.h>

#include <cmath>

#include "base/constants.h"
#include "base/error.h"
#include "base/vector_width.h"

namespace foreglow {
namespace {

T_Healpix_Base<int64> make_base(int nside, Healpix_Ordering_Scheme scheme) {
    return {nside, scheme, SET_NSIDE};
}

/// The closed forms of Gorski et al. 2005, section 5.2: jp and jm number the lines of pixel edges that ascend
/// and descend eastwards.
FOREGLOW_WIDE void find_in_belt(int nside, double cos_theta, const double* turns, std::size_t count,
                                std::int32_t* out) {
    const double slope = 0.75 * nside * cos_theta;
    const std::int32_t around = 4 * nside, first = 2 * nside * (nside - 1);
    for (std::size_t k = 0; k < count; ++k) {
        const double across = nside * (0.5 + 4.0 * turns[k]);
        const auto jp = static_cast<std::int32_t>(across - slope),
                   jm = static_cast<std::int32_t>(across + slope);
        const std::int32_t ring = nside + 1 + jp - jm;  // 1 to 2 nside + 1 within the belt
        const std::int32_t column = (jp + jm - nside + 2 - (ring & 1) + 2 * around) >> 1;
        out[k] = first + (ring - 1) * around + (column & (around - 1));
    }
}

FOREGLOW_WIDE void find_in_cap(int nside, bool south, double from_pole, const double* turns,
                               std::size_t count, std::int32_t* out) {
    const std::int32_t npix = 12 * nside * nside;
    for (std::size_t k = 0; k < count; ++k) {
        const double quarters = turns[k] < 1 ? 4.0 * turns[k] : 0.0;
        const double within = quarters - static_cast<std::int32_t>(quarters);
        const auto jp = static_cast<std::int32_t>(within * from_pole);
        const auto jm = static_cast<std::int32_t>((1.0 - within) * from_pole);
        const std::int32_t ring = jp + jm + 1, column = static_cast<std::int32_t>(quarters * ring);
        out[k] = south ? npix - 2 * ring * (ring + 1) + column : 2 * ring * (ring - 1) + column;
    }
}

bool is_pixel(const HealpixGrid& grid, std::int64_t pixel) {
    return pixel >= 0 && pixel < grid.npix();
}

}  // namespace

bool is_valid_nside(std::int64_t nside) {
    return nside >= 1 && nside <= HealpixGrid::max_nside && (nside & (nside - 1)) == 0;
}

HealpixGrid::HealpixGrid(int nside) : nside_(nside) {
    FOREGLOW_EXPECTS(is_valid_nside(nside));
}

double HealpixGrid::pixel_area() const {
    return 4.0 * constants::pi / static_cast<double>(npix());
}

HealpixGrid::Ring HealpixGrid::ring(int ring) const {
    FOREGLOW_EXPECTS(ring >= 0 && ring < ring_count());
    const std::int64_t n = nside_;
    const bool south = ring >= 2 * nside_;
    const std::int64_t i = south ? ring_count() - ring : ring + 1;  // counted from the nearer pole
    Ring out;
    if (i < n) {
        // 1 - z first: z alone loses the digits of sin theta near the pole.
        const double from_pole = static_cast<double>(i * i) / (3.0 * static_cast<double>(n * n));
        out.pixels = static_cast<int>(4 * i);
        out.first_pixel = 2 * i * (i - 1);
        out.cos_theta = 1.0 - from_pole;
        out.sin_theta = std::sqrt(from_pole * (2.0 - from_pole));
        out.phi0 = constants::pi / static_cast<double>(out.pixels);
    } else {
        out.pixels = static_cast<int>(4 * n);
        out.first_pixel = 2 * n * (n - 1) + (i - n) * 4 * n;
        out.cos_theta = 2.0 * static_cast<double>(2 * n - i) / (3.0 * static_cast<double>(n));
        out.sin_theta = std::sqrt((1.0 - out.cos_theta) * (1.0 + out.cos_theta));
        out.phi0 = (i - n) % 2 == 0 ? constants::pi / static_cast<double>(out.pixels) : 0.0;
    }
    if (south) {
        out.first_pixel = npix() - out.first_pixel - out.pixels;
        out.cos_theta = -out.cos_theta;
    }
    return out;
}

int HealpixGrid::ring_of(std::int64_t pixel) const {
    FOREGLOW_EXPECTS(is_pixel(*this, pixel));
    return static_cast<int>(make_base(nside_, RING).pix2ring(pixel)) - 1;
}

Vector3 HealpixGrid::direction(std::int64_t pixel) const {
    Vector3 out;
    directions(pixel, {&out, 1});
    return out;
}

std::int64_t HealpixGrid::pixel_at(const Vector3& direction) const {
    return make_base(nside_, RING).vec2pix(vec3(direction[0], direction[1], direction[2]));
}

std::int64_t HealpixGrid::ring_to_nested(std::int64_t pixel) const {
    FOREGLOW_EXPECTS(is_pixel(*this, pixel));
    return make_base(nside_, RING).ring2nest(pixel);
}

std::int64_t HealpixGrid::nested_to_ring(std::int64_t nested_pixel) const {
    FOREGLOW_EXPECTS(is_pixel(*this, nested_pixel));
    return make_base(nside_, NEST).nest2ring(nested_pixel);
}

void HealpixGrid::directions(std::int64_t first, std::span<Vector3> out) const {
    if (out.empty()) return;
    FOREGLOW_EXPECTS(first >= 0 && first + static_cast<std::int64_t>(out.size()) <= npix());
    int index = ring_of(first);
    Ring row = ring(index);
    std::int64_t column = first - row.first_pixel;
    for (Vector3& v : out) {
        if (column == row.pixels) {
            row = ring(++index);
            column = 0;
        }
        const double phi = row.phi0 + 2.0 * constants::pi * static_cast<double>(column) / row.pixels;
        v = {row.sin_theta * std::cos(phi), row.sin_theta * std::sin(phi), row.cos_theta};
        ++column;
    }
}

void HealpixGrid::pixels_on_parallel(double cos_theta, double sin_theta, std::span<const double> turns,
                                     std::span<std::int32_t> out) const {
    FOREGLOW_EXPECTS(out.size() == turns.size());
    const double height = std::abs(cos_theta);
    if (height <= 2.0 / 3.0)
        find_in_belt(nside_, cos_theta, turns.data(), turns.size(), out.data());
    else  // sin^2 / (1 + |z|) is 1 - |z| without the loss of digits near a pole
        find_in_cap(nside_, cos_theta < 0, nside_ * sin_theta * std::sqrt(3.0 / (1.0 + height)), turns.data(),
                    turns.size(), out.data());
}

void HealpixGrid::nested_numbers(std::int64_t first, std::span<std::int64_t> out) const {
    FOREGLOW_EXPECTS(first >= 0 && first + static_cast<std::int64_t>(out.size()) <= npix());
    const auto base = make_base(nside_, RING);
    for (std::int64_t& pixel : out)
        pixel = base.ring2nest(first++);
}

void HealpixGrid::ring_numbers(std::int64_t first_nested, std::span<std::int64_t> out) const {
    FOREGLOW_EXPECTS(first_nested >= 0 && first_nested + static_cast<std::int64_t>(out.size()) <= npix());
    const auto base = make_base(nside_, NEST);
    for (std::int64_t& pixel : out)
        pixel = base.nest2ring(first_nested++);
}

std::array<std::int64_t, 8> HealpixGrid::neighbours(std::int64_t pixel) const {
    FOREGLOW_EXPECTS(is_pixel(*this, pixel));
    fix_arr<int64, 8> found;
    make_base(nside_, RING).neighbors(pixel, found);
    std::array<std::int64_t, 8> out{};
    for (std::size_t k = 0; k < 8; ++k)
        out[k] = found[k];
    return out;
}

HealpixGrid::Stencil HealpixGrid::interpolation(const Vector3& direction) const {
    const double rho = std::hypot(direction[0], direction[1]);
    double phi = std::atan2(direction[1], direction[0]);
    if (phi < 0) phi += 2.0 * constants::pi;
    fix_arr<int64, 4> pixels;
    fix_arr<double, 4> weights;
    make_base(nside_, RING).get_interpol(pointing(std::atan2(rho, direction[2]), phi), pixels, weights);
    Stencil out;
    for (std::size_t k = 0; k < 4; ++k) {
        out.pixels[k] = pixels[k];
        out.weights[k] = weights[k];
    }
    return out;
}

}  // namespace foreglow
