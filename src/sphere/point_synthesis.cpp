// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/point_synthesis.h"

#include <libsharp/sharp.h>
#include <libsharp/sharp_almhelpers.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <memory>

#include "base/constants.h"
#include "base/error.h"
#include "base/parallel.h"

namespace foreglow {
namespace {

constexpr int samples_per_wave = 6;
constexpr int stencil = 10;
constexpr int before = stencil / 2 - 1;  // samples before the cell that holds the place
constexpr int rings_at_once = 64;
constexpr std::int64_t block = 4096;

/// Places on a grid of colatitude (k + 1/2) pi/n, k any whole number, and azimuth j 2 pi/(2 n).
struct GridPlace {
    int ring = 0, column = 0;               // of the sample before it
    double ring_rest = 0, column_rest = 0;  // from there, 0 to 1
};

/// The part of the grid that some directions need: rings first.. and columns first.., counted beyond the
/// poles and around.
struct Window {
    int n = 0;  // rings from pole to pole
    int first_ring = 0, rings = 0, first_column = 0, columns = 0;
};

int wrapped(int column, int period) {
    const int rest = column % period;
    return rest < 0 ? rest + period : rest;
}

std::vector<GridPlace> place(std::span<const Vector3> directions, int n, double middle) {
    std::vector<GridPlace> places(directions.size());
    parallel_for_blocks(
        static_cast<std::int64_t>(places.size()), block, [&](std::int64_t begin, std::int64_t end) {
            for (auto i = static_cast<std::size_t>(begin); i < static_cast<std::size_t>(end); ++i) {
                const Vector3& v = directions[i];
                const double theta = std::atan2(std::hypot(v[0], v[1]), v[2]);
                double phi = std::atan2(v[1], v[0]);
                // Within half a turn of the middle, so that a window across phi = 0 stays narrow.
                phi -= 2 * constants::pi * std::round((phi - middle) / (2 * constants::pi));
                const double y = theta * n / constants::pi - 0.5, x = phi * n / constants::pi;
                const double ring = std::floor(y), column = std::floor(x);
                places[i] = {static_cast<int>(ring), static_cast<int>(column), y - ring, x - column};
            }
        });
    return places;
}

Window window_of(std::span<const GridPlace> places, int n) {
    const auto by_ring = [](const GridPlace& a, const GridPlace& b) { return a.ring < b.ring; };
    const auto by_column = [](const GridPlace& a, const GridPlace& b) { return a.column < b.column; };
    const auto [low, high] = std::minmax_element(places.begin(), places.end(), by_ring);
    const auto [left, right] = std::minmax_element(places.begin(), places.end(), by_column);
    return {n, low->ring - before, high->ring - low->ring + stencil, left->column - before,
            right->column - left->column + stencil};
}

// Lagrange's weights for the samples -before .. stencil - 1 - before at a place from 0 to 1.
std::array<double, stencil> lagrange(double x) {
    std::array<double, stencil> weights{};
    for (int i = 0; i < stencil; ++i) {
        double w = 1;
        for (int j = 0; j < stencil; ++j)
            if (j != i) w *= (x + before - j) / static_cast<double>(i - j);
        weights[static_cast<std::size_t>(i)] = w;
    }
    return weights;
}

struct DestroyAlmInfo {
    void operator()(sharp_alm_info* info) const { sharp_destroy_alm_info(info); }
};

/// Makes the window of one or two fields: whole rings by libsharp, a few at a time, of which the columns
/// stay.
std::vector<std::vector<double>> make_window(const Window& window, std::span<const Alm* const> alms) {
    const bool spin2 = alms.size() == 2;
    const int lmax = alms[0]->lmax(), period = 2 * window.n;
    std::vector<std::vector<double>> out(alms.size(),
                                         std::vector<double>(static_cast<std::size_t>(window.rings) *
                                                             static_cast<std::size_t>(window.columns)));
    std::vector<ptrdiff_t> start(static_cast<std::size_t>(lmax) + 1);
    for (int m = 0; m <= lmax; ++m)
        start[static_cast<std::size_t>(m)] = static_cast<ptrdiff_t>(alms[0]->index(m, m)) - m;
    sharp_alm_info* info = nullptr;
    sharp_make_alm_info(lmax, lmax, 1, start.data(), &info);
    const std::unique_ptr<sharp_alm_info, DestroyAlmInfo> owner(info);
    std::vector<std::vector<double>> rings(alms.size());
    for (int first = 0; first < window.rings; first += rings_at_once) {
        const int count = std::min(rings_at_once, window.rings - first);
        std::vector<sharp_ringpair> pairs(static_cast<std::size_t>(count));
        for (int r = 0; r < count; ++r) {
            // Beyond a pole a great circle goes on along the opposite meridian; (Q, U) keep their signs,
            // since both axes turn by 180 degrees.
            int k = window.first_ring + first + r;
            const bool beyond = k < 0 || k >= window.n;
            if (k < 0) k = -k - 1;
            if (k >= window.n) k = 2 * window.n - 1 - k;
            FOREGLOW_EXPECTS(k >= 0 && k < window.n);
            sharp_ringinfo& ring = pairs[static_cast<std::size_t>(r)].r1;
            ring.theta = (k + 0.5) * constants::pi / window.n;
            ring.cth = std::cos(ring.theta);
            ring.sth = std::sin(ring.theta);
            ring.phi0 = beyond ? constants::pi : 0.0;
            ring.weight = 1;
            ring.nph = period;
            ring.ofs = static_cast<ptrdiff_t>(r) * period;
            ring.stride = 1;
            pairs[static_cast<std::size_t>(r)].r2.nph = -1;
        }
        sharp_geom_info geometry{};
        geometry.pair = pairs.data();
        geometry.npairs = count;
        geometry.nphmax = period;
        std::array<void*, 2> alm_pointers{}, map_pointers{};
        for (std::size_t f = 0; f < alms.size(); ++f) {
            rings[f].resize(static_cast<std::size_t>(count) * static_cast<std::size_t>(period));
            alm_pointers[f] = const_cast<Alm::Value*>(alms[f]->values().data());
            map_pointers[f] = rings[f].data();
        }
        sharp_execute(SHARP_ALM2MAP, spin2 ? 2 : 0, alm_pointers.data(), map_pointers.data(), &geometry, info,
                      SHARP_DP, nullptr, nullptr);
        for (std::size_t f = 0; f < alms.size(); ++f)
            for (int r = 0; r < count; ++r) {
                double* row = out[f].data() +
                              static_cast<std::size_t>(first + r) * static_cast<std::size_t>(window.columns);
                const double* ring =
                    rings[f].data() + static_cast<std::size_t>(r) * static_cast<std::size_t>(period);
                for (int c = 0; c < window.columns; ++c)
                    row[c] = ring[wrapped(window.first_column + c, period)];
            }
    }
    return out;
}

std::vector<double> interpolate_window(const Window& window, std::span<const double> values,
                                       std::span<const GridPlace> places) {
    std::vector<double> out(places.size());
    parallel_for_blocks(
        static_cast<std::int64_t>(places.size()), block, [&](std::int64_t begin, std::int64_t end) {
            for (auto i = static_cast<std::size_t>(begin); i < static_cast<std::size_t>(end); ++i) {
                const GridPlace& p = places[i];
                const auto wy = lagrange(p.ring_rest), wx = lagrange(p.column_rest);
                const auto row = static_cast<std::size_t>(p.ring - before - window.first_ring);
                const auto column = static_cast<std::size_t>(p.column - before - window.first_column);
                double sum = 0;
                for (std::size_t r = 0; r < stencil; ++r) {
                    const double* line =
                        values.data() + (row + r) * static_cast<std::size_t>(window.columns) + column;
                    double part = 0;
                    for (std::size_t c = 0; c < stencil; ++c)
                        part += wx[c] * line[c];
                    sum += wy[r] * part;
                }
                out[i] = sum;
            }
        });
    return out;
}

std::vector<std::vector<double>> synthesize_fields(std::span<const Alm* const> alms,
                                                   std::span<const Vector3> directions) {
    if (directions.empty()) return std::vector<std::vector<double>>(alms.size());
    const int n = std::max(32, samples_per_wave * alms[0]->lmax() / 2);
    Vector3 sum{};
    for (const Vector3& v : directions)
        for (std::size_t c = 0; c < 3; ++c)
            sum[c] += v[c];
    const auto places = place(directions, n, std::atan2(sum[1], sum[0]));
    const Window window = window_of(places, n);
    const auto grids = make_window(window, alms);
    std::vector<std::vector<double>> out;
    out.reserve(alms.size());
    for (const auto& grid : grids)
        out.push_back(interpolate_window(window, grid, places));
    return out;
}

}  // namespace

std::vector<double> synthesize_at(const Alm& alm, std::span<const Vector3> directions) {
    const std::array<const Alm*, 1> one{&alm};
    return std::move(synthesize_fields(one, directions).front());
}

StokesValues synthesize_at(const AlmEB& alm, std::span<const Vector3> directions) {
    FOREGLOW_EXPECTS(alm.e.lmax() == alm.b.lmax());
    if (alm.e.lmax() < 2)
        return {std::vector<double>(directions.size()), std::vector<double>(directions.size())};
    const std::array<const Alm*, 2> both{&alm.e, &alm.b};
    auto fields = synthesize_fields(both, directions);
    return {std::move(fields[0]), std::move(fields[1])};
}

}  // namespace foreglow
