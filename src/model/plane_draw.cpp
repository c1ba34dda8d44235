// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/plane_draw.h"

#include <algorithm>
#include <cmath>
#include <complex>

#include "base/constants.h"
#include "base/error.h"
#include "base/parallel.h"
#include "base/random.h"
#include "math/fft.h"

namespace foreglow {
namespace {

enum Field : std::uint32_t { IntensityNoise = 0, ENoise = 1, BNoise = 2 };

// A field's number from a patch's name (Fowler, Noll & Vo's hash), apart from those of the sphere.
std::uint32_t field_of(const std::string& patch, std::uint32_t field) {
    std::uint32_t hash = 2166136261U;
    for (const char c : patch)
        hash = (hash ^ static_cast<unsigned char>(c)) * 16777619U;
    return 0x80000000U | ((hash & 0x0fffffffU) << 2U) | field;
}

double at_wave(std::span<const double> cl, double k) {
    const double l = std::max(0.0, k - 0.5);
    const auto low = static_cast<std::size_t>(l);
    if (low + 1 >= cl.size()) return low < cl.size() ? cl[low] : 0.0;
    // Where a spectrum begins it is not blurred: the seam to the sphere lies between two l.
    if (cl[low] == 0 || cl[low + 1] == 0) return l - static_cast<double>(low) < 0.5 ? cl[low] : cl[low + 1];
    const double rest = l - static_cast<double>(low);
    return (1 - rest) * cl[low] + rest * cl[low + 1];
}

/// Calls work(index, kx, ky) for the modes that are kept, k in waves per radian times 2 pi.
template <class Work>
void for_each_mode(const PlaneFourier& plane, double side, const Work& work) {
    const double step = 2 * constants::pi / (plane.nx() * side);
    parallel_for_blocks(plane.ny(), 32, [&](std::int64_t begin, std::int64_t end) {
        for (auto y = static_cast<std::size_t>(begin); y < static_cast<std::size_t>(end); ++y)
            for (std::size_t x = 0; x < plane.row(); ++x)
                work(y * plane.row() + x, plane.wave_x(x) * step, plane.wave_y(y) * step);
    });
}

}  // namespace

PlaneDraw::PlaneDraw(int pixels, Angle pixel)
    : pixels_(pixels), torus_(quick_fft_size((3 * pixels + 1) / 2)), side_(pixel.radians()) {
    FOREGLOW_EXPECTS(pixels >= 1 && side_ > 0);
}

int PlaneDraw::highest_l() const {
    return static_cast<int>(std::ceil(std::sqrt(2.0) * constants::pi / side_)) + 1;
}

double PlaneDraw::variance(std::span<const double> cl) const {
    const double step = 2 * constants::pi / (torus_ * side_);
    // Over the whole Fourier plane, by rows of the half below and at ky = 0.
    return parallel_sum(torus_, 32,
                        [&](std::int64_t begin, std::int64_t end) {
                            double sum = 0;
                            for (std::int64_t y = begin; y < end; ++y) {
                                const double ky = static_cast<double>(2 * y > torus_ ? y - torus_ : y) * step;
                                for (int x = 0; x < torus_; ++x) {
                                    const double kx = (2 * x > torus_ ? x - torus_ : x) * step;
                                    sum += at_wave(cl, std::hypot(kx, ky));
                                }
                            }
                            return sum;
                        }) /
           (static_cast<double>(torus_) * torus_ * side_ * side_);
}

std::vector<double> PlaneDraw::white_noise(const PlaneKey& key, std::uint32_t field) const {
    const RandomKey random{key.seed, static_cast<std::uint32_t>(key.realization), field_of(key.patch, field)};
    const auto n = static_cast<std::size_t>(torus_);
    std::vector<double> noise(n * n);
    parallel_for_blocks(torus_, 32, [&](std::int64_t begin, std::int64_t end) {
        std::vector<double> unused(n);
        for (auto y = static_cast<std::size_t>(begin); y < static_cast<std::size_t>(end); ++y)
            normal_pairs(random, 0, static_cast<std::uint32_t>(y), std::span(noise).subspan(y * n, n),
                         unused);
    });
    return noise;
}

std::vector<double> PlaneDraw::cut(const std::vector<double>& torus) const {
    const auto n = static_cast<std::size_t>(pixels_), whole = static_cast<std::size_t>(torus_);
    std::vector<double> out(n * n);
    for (std::size_t y = 0; y < n; ++y)
        std::copy_n(torus.begin() + static_cast<std::ptrdiff_t>(y * whole), n,
                    out.begin() + static_cast<std::ptrdiff_t>(y * n));
    return out;
}

std::vector<double> PlaneDraw::intensity(std::span<const double> cl, const PlaneKey& key) const {
    const PlaneFourier plane(torus_, torus_);
    auto modes = plane.forward(white_noise(key, IntensityNoise));
    for_each_mode(plane, side_, [&](std::size_t i, double kx, double ky) {
        modes[i] *= std::sqrt(at_wave(cl, std::hypot(kx, ky))) / side_;
    });
    return cut(plane.inverse(std::move(modes)));
}

StokesValues PlaneDraw::polarization(const DetailSpectra& spectra, const PlaneKey& key) const {
    const PlaneFourier plane(torus_, torus_);
    const auto shared = plane.forward(white_noise(key, IntensityNoise));
    auto q = plane.forward(white_noise(key, ENoise));
    auto u = plane.forward(white_noise(key, BNoise));
    for_each_mode(plane, side_, [&](std::size_t i, double kx, double ky) {
        const double k = std::hypot(kx, ky);
        const double rho = at_wave(spectra.correlation, k);
        const auto e = std::sqrt(at_wave(spectra.ee, k)) / side_ *
                       (rho * shared[i] + std::sqrt(std::max(0.0, 1 - rho * rho)) * q[i]);
        const auto b = std::sqrt(at_wave(spectra.bb, k)) / side_ * u[i];
        // South is -y and east -x; twice the angle does not see the common sign.
        const double cosine = k > 0 ? (ky * ky - kx * kx) / (k * k) : 1.0;
        const double sine = k > 0 ? 2 * kx * ky / (k * k) : 0.0;
        q[i] = e * cosine - b * sine;
        u[i] = e * sine + b * cosine;
    });
    return {cut(plane.inverse(std::move(q))), cut(plane.inverse(std::move(u)))};
}

}  // namespace foreglow
