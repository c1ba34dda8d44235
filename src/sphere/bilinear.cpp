// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/bilinear.h"

#include <algorithm>
#include <array>
#include <cmath>

#include "base/constants.h"
#include "base/error.h"
#include "base/vector_width.h"
#include "sphere/sky_map.h"

namespace foreglow {
namespace {

using constants::pi;
using Row = BilinearSampler::Row;
using Zone = BilinearSampler::Zone;
using Stencil = HealpixGrid::Stencil;

constexpr std::size_t batch = 64;
constexpr int least_nside_of_series = 16;

/// A place between two centres of a ring: pixels of the ring and the weight of the second.
struct Between {
    std::int64_t left = 0, right = 0;
    double share = 0;
};

Between between(const Row& row, double turns) {
    const double place = turns * row.pixels - row.shift;
    auto left = static_cast<std::int64_t>(place + 1.0) - 1;  // the floor, as place is at least -1/2
    const double share = place - static_cast<double>(left);
    if (left < 0) left += row.pixels;
    if (left >= row.pixels) left -= row.pixels;
    return {row.first + left, row.first + (left + 1 == row.pixels ? 0 : left + 1), share};
}

/// Azimuths of a ring's centres in steps of another ring's, as whole numbers: centre j lies at
/// (start + j step) / unit pixels from the other ring's first centre.
struct Comb {
    std::int64_t start = 0, step = 0, unit = 1;

    Comb(const Row& from, const HealpixGrid::Ring& to) {
        const bool to_shifted = to.phi0 > 0, from_shifted = from.shift > 0;
        start = (to_shifted ? from.pixels : 0) - (from_shifted ? to.pixels : 0);
        step = 2LL * from.pixels;
        unit = 2LL * to.pixels;
    }
    [[nodiscard]] Between at(const Row& from, std::int64_t column) const {
        const std::int64_t place = start + column * step;
        const std::int64_t left = place < 0 ? -1 : place / unit;
        const double share = static_cast<double>(place - left * unit) / static_cast<double>(unit);
        return {from.first + (left < 0 ? from.pixels - 1 : left),
                from.first + (left + 1 == from.pixels ? 0 : left + 1), share};
    }
    /// Returns the first column whose place is at least `pixels` pixels.
    [[nodiscard]] std::int64_t first_column_from(std::int64_t pixels) const {
        const std::int64_t wanted = pixels * unit - start;
        return wanted <= 0 ? 0 : (wanted + step - 1) / step;
    }
};

Stencil make_stencil(const Between& above, const Between& below, double share) {
    return {{above.left, above.right, below.left, below.right},
            {(1 - above.share) * (1 - share), above.share * (1 - share), (1 - below.share) * share,
             below.share * share}};
}

/// At a pole the four pixels of the ring around it stand for the ring on the other side.
Stencil make_polar_stencil(const Row& row, const Between& ring, double towards_pole) {
    const auto opposite = [&row](std::int64_t pixel) { return row.first + ((pixel - row.first + 2) & 3); };
    const double each = towards_pole / 4;
    return {
        {opposite(ring.left), opposite(ring.right), ring.left, ring.right},
        {each, each, (1 - ring.share) * (1 - towards_pole) + each, ring.share * (1 - towards_pole) + each}};
}

/// Puts the stencil of a zone together; on(row) tells where the place lies along a ring.
template <typename On>
Stencil join(const std::vector<Row>& rows, std::size_t zone, double below, const On& on) {
    if (zone == 0) return make_polar_stencil(rows[0], on(rows[0]), 1 - below);
    const Row& above = rows[zone - 1];
    if (zone == rows.size()) return make_polar_stencil(above, on(above), below);
    return make_stencil(on(above), on(rows[zone]), below);
}

/// Returns how far below the upper edge of a zone a colatitude lies, in zone widths.
double share_below(const Zone& zone, double cos_theta, double sin_theta) {
    const double sine = sin_theta * zone.cos_above - cos_theta * zone.sin_above;
    const double cosine = cos_theta * zone.cos_above + sin_theta * zone.sin_above;
    return std::clamp(std::atan2(sine, cosine) * zone.per_radian, 0.0, 1.0);
}

/// Interpolates along one ring of a map at centres begin, begin + 1, ... of another ring; all of them must
/// lie between the first and the last pixel of the map's ring.
struct AlongRing {
    const double* from;
    double first, by, whole, inverse;

    AlongRing(const double* values, const Comb& comb, std::int64_t begin)
        : from(values),
          first(static_cast<double>(comb.start + begin * comb.step)),
          by(static_cast<double>(comb.step)),
          whole(static_cast<double>(comb.unit)),
          inverse(1.0 / whole) {}
    [[nodiscard]] FOREGLOW_INLINE double at(int i) const {
        // Whole numbers below 2^53 in floating point: every product and difference is exact.
        const double place = first + by * i;
        const int left = static_cast<int>((place + 0.5) * inverse);
        const double share = (place - whole * left) * inverse;
        return (1 - share) * from[left] + share * from[left + 1];
    }
};

FOREGLOW_WIDE void sample_between(AlongRing above, AlongRing under, double below, std::int64_t count,
                                  double* out) {
    const double rest = 1 - below;
    for (int i = 0; i < static_cast<int>(count); ++i)
        out[i] = rest * above.at(i) + below * under.at(i);
}

/// Places of a batch on the sphere, and where they lie on the sampler's grid.
struct Places {
    std::array<double, batch> x, y, z;
    std::array<double, batch> turns;  ///< azimuth / 2 pi, 0 to 1
    std::array<double, batch> below;  ///< share_below of the zone
    std::array<int, batch> zone;
};

/// v_k = cosine cos(k step) + sine sin(k step) + constant: a ring seen from another frame.
struct Circle {
    Vector3 cosine, sine, constant;
};

/// Writes cos(k step) and sin(k step), by the law of addition from those of 1, 2, 4, ... steps.
void fill_with_multiples(double step, std::array<double, batch>& cosines, std::array<double, batch>& sines) {
    cosines[0] = 1;
    sines[0] = 0;
    for (std::size_t known = 1; known < batch; known *= 2) {
        const double c = std::cos(step * static_cast<double>(known)),
                     s = std::sin(step * static_cast<double>(known));
        for (std::size_t k = 0; k < known; ++k) {
            cosines[known + k] = c * cosines[k] - s * sines[k];
            sines[known + k] = s * cosines[k] + c * sines[k];
        }
    }
}

Circle make_circle(const Matrix3& back, const HealpixGrid::Ring& ring, double phi) {
    const double x = ring.sin_theta * std::cos(phi), y = ring.sin_theta * std::sin(phi);
    return {rotate(back, {x, y, 0}), rotate(back, {-y, x, 0}), rotate(back, {0, 0, ring.cos_theta})};
}

FOREGLOW_WIDE void place_on_circle(const Circle& circle, const double* cosines, const double* sines,
                                   Places& out) {
    for (std::size_t k = 0; k < batch; ++k) {
        out.x[k] = circle.cosine[0] * cosines[k] + circle.sine[0] * sines[k] + circle.constant[0];
        out.y[k] = circle.cosine[1] * cosines[k] + circle.sine[1] * sines[k] + circle.constant[1];
        out.z[k] = circle.cosine[2] * cosines[k] + circle.sine[2] * sines[k] + circle.constant[2];
    }
}

/// Returns atan2(y, x) / 2 pi in [0, 1]: the rational function of the Cephes library (Moshier 1989) for
/// |r| < 0.66, after the reduction to |r| <= tan(pi/8); absolute error below 1e-16.
FOREGLOW_INLINE double turns_of(double y, double x) {
    const double ax = std::abs(x), ay = std::abs(y);
    const double small = ax < ay ? ax : ay, large = (ax < ay ? ay : ax) + 1e-300;
    const bool reduce = small > 0.41421356237309504880 * large;
    const double r = (reduce ? small - large : small) / (reduce ? small + large : large), z = r * r;
    double p = -8.750608600031904122785e-1;
    p = p * z - 1.615753718733365076637e1;
    p = p * z - 7.500855792314704667340e1;
    p = p * z - 1.228866684490136173410e2;
    p = p * z - 6.485021904942025371773e1;
    double q = z + 2.485846490142306297962e1;
    q = q * z + 1.650270098316988542046e2;
    q = q * z + 4.328810604912902668951e2;
    q = q * z + 4.853903996359136964868e2;
    q = q * z + 1.945506571482613964425e2;
    double turns = (r + r * (z * p / q)) * (0.5 / pi) + (reduce ? 0.125 : 0.0);
    turns = ax < ay ? 0.25 - turns : turns;
    turns = x < 0 ? 0.5 - turns : turns;
    return y < 0 ? 1.0 - turns : turns;
}

FOREGLOW_WIDE void locate(double nside, Places& places) {
    for (std::size_t k = 0; k < batch; ++k) {
        const double x = places.x[k], y = places.y[k], z = places.z[k], height = std::abs(z);
        places.turns[k] = turns_of(y, x);
        // rho^2 / (1 + |z|) is 1 - |z| without the loss of digits near a pole.
        const double cap = nside * std::sqrt(3.0 * (x * x + y * y) / (1.0 + height));
        const double belt = nside * (2.0 - 1.5 * z);
        const double place = height <= 2.0 / 3.0 ? belt : z > 0 ? cap : 4.0 * nside - cap;
        const double last = 4.0 * nside - 1.0;
        places.zone[k] = static_cast<int>(place < 0 ? 0.0 : place > last ? last : place);
    }
}

/// share_below by the series of the arcsine, which for zones narrower than 0.06 rad has ended after five
/// terms.
FOREGLOW_WIDE void measure_shares(const Zone* zones, Places& places) {
    for (std::size_t k = 0; k < batch; ++k) {
        const Zone& zone = zones[places.zone[k]];
        const double x = places.x[k], y = places.y[k], z = places.z[k];
        const double sine = std::sqrt(x * x + y * y) * zone.cos_above - z * zone.sin_above, s = sine * sine;
        double series = 63.0 / 2816.0;
        series = series * s + 35.0 / 1152.0;
        series = series * s + 5.0 / 112.0;
        series = series * s + 3.0 / 40.0;
        series = series * s + 1.0 / 6.0;
        const double share = (sine + sine * s * series) * zone.per_radian;
        places.below[k] = share < 0 ? 0.0 : share > 1 ? 1.0 : share;
    }
}

/// Calls visit(ring, first column, columns, offset in the range) for each ring in a range of pixels.
template <typename Visit>
void for_each_ring(const HealpixGrid& grid, std::int64_t first, std::int64_t count, const Visit& visit) {
    if (count == 0) return;
    std::int64_t done = 0;
    for (int index = grid.ring_of(first); done < count; ++index) {
        const HealpixGrid::Ring ring = grid.ring(index);
        const std::int64_t column = first + done - ring.first_pixel;
        const std::int64_t columns = std::min(ring.pixels - column, count - done);
        visit(index, ring, column, columns, done);
        done += columns;
    }
}

}  // namespace

BilinearSampler::BilinearSampler(const HealpixGrid& grid) : grid_(grid) {
    double theta_above = 0;
    Zone zone;
    for (int r = 0; r < grid.ring_count(); ++r) {
        const HealpixGrid::Ring ring = grid.ring(r);
        rows_.push_back({ring.first_pixel, ring.pixels, ring.phi0 > 0 ? 0.5 : 0.0});
        const double theta = std::atan2(ring.sin_theta, ring.cos_theta);
        zone.per_radian = 1.0 / (theta - theta_above);
        zones_.push_back(zone);
        zone = {ring.cos_theta, ring.sin_theta, 0};
        theta_above = theta;
    }
    zone.per_radian = 1.0 / (pi - theta_above);
    zones_.push_back(zone);
}

Stencil BilinearSampler::stencil(const Vector3& direction) const {
    Places places{};
    places.x.fill(direction[0]);
    places.y.fill(direction[1]);
    places.z.fill(direction[2]);
    locate(grid_.nside(), places);
    const auto zone = static_cast<std::size_t>(places.zone[0]);
    const double below = share_below(zones_[zone], direction[2], std::hypot(direction[0], direction[1]));
    return join(rows_, zone, below, [&](const Row& row) { return between(row, places.turns[0]); });
}

Stencil BilinearSampler::stencil_at(const HealpixGrid& to_grid, int ring, std::int64_t column) const {
    const HealpixGrid::Ring to = to_grid.ring(ring);
    const Level level = level_of(ring, to_grid);
    const double below = level.is_on_ring ? 0.0 : share_below(zones_[level.zone], to.cos_theta, to.sin_theta);
    return join(rows_, level.zone, below, [&](const Row& row) { return Comb(row, to).at(row, column); });
}

BilinearSampler::Level BilinearSampler::level_of(int ring, const HealpixGrid& to_grid) const {
    // cos theta is one function of (ring number / nside) in every grid, so that whole numbers decide.
    const std::int64_t scaled = (ring + 1LL) * grid_.nside();
    return {static_cast<std::size_t>(scaled / to_grid.nside()), scaled % to_grid.nside() == 0};
}

void BilinearSampler::sample_ring(std::span<const double> values, const HealpixGrid& to_grid, int ring,
                                  std::int64_t column, std::span<double> out) const {
    const HealpixGrid::Ring to = to_grid.ring(ring);
    const Level level = level_of(ring, to_grid);
    const double below = level.is_on_ring ? 0.0 : share_below(zones_[level.zone], to.cos_theta, to.sin_theta);
    const auto slowly = [&](std::int64_t from, std::int64_t end) {
        for (std::int64_t i = from; i < end; ++i)
            out[static_cast<std::size_t>(i)] = weighted_mean(
                values, join(rows_, level.zone, below,
                             [&](const Row& row) { return Comb(row, to).at(row, column + i); }));
    };
    const auto count = static_cast<std::int64_t>(out.size());
    if (touches_pole(level.zone)) return slowly(0, count);
    const Row &above = rows_[level.zone - 1], &under = rows_[level.zone];
    const Comb comb_above(above, to), comb_under(under, to);
    const auto clear_of_seam = [&](const Row& row, const Comb& comb) {
        return std::pair(std::clamp<std::int64_t>(comb.first_column_from(0) - column, 0, count),
                         std::clamp<std::int64_t>(comb.first_column_from(row.pixels - 1) - column, 0, count));
    };
    const auto [begin_above, end_above] = clear_of_seam(above, comb_above);
    const auto [begin_under, end_under] = clear_of_seam(under, comb_under);
    const std::int64_t begin = std::max(begin_above, begin_under);
    const std::int64_t end = std::max(begin, std::min(end_above, end_under));
    slowly(0, begin);
    slowly(end, count);
    sample_between({values.data() + above.first, comb_above, column + begin},
                   {values.data() + under.first, comb_under, column + begin}, below, end - begin,
                   out.data() + begin);
    for (std::int64_t i = begin; i < end; ++i)
        if (!is_defined(out[static_cast<std::size_t>(i)])) slowly(i, i + 1);
}

void BilinearSampler::sample(std::span<const double> values, const HealpixGrid& to_grid, std::int64_t first,
                             std::span<double> out) const {
    FOREGLOW_EXPECTS(static_cast<std::int64_t>(values.size()) == grid_.npix());
    for_each_ring(to_grid, first, static_cast<std::int64_t>(out.size()),
                  [&](int index, const HealpixGrid::Ring&, std::int64_t column, std::int64_t columns,
                      std::int64_t done) {
                      sample_ring(
                          values, to_grid, index, column,
                          out.subspan(static_cast<std::size_t>(done), static_cast<std::size_t>(columns)));
                  });
}

double BilinearSampler::read(std::span<const double> values, std::size_t zone, double below,
                             double turns) const {
    const auto slowly = [&] {
        return weighted_mean(
            values, join(rows_, zone, below, [turns](const Row& row) { return between(row, turns); }));
    };
    if (touches_pole(zone)) return slowly();
    const Between a = between(rows_[zone - 1], turns), b = between(rows_[zone], turns);
    const auto at = [&values](std::int64_t pixel) { return values[static_cast<std::size_t>(pixel)]; };
    const double upper = (1 - a.share) * at(a.left) + a.share * at(a.right);
    const double lower = (1 - b.share) * at(b.left) + b.share * at(b.right);
    const double mean = (1 - below) * upper + below * lower;
    return is_defined(mean) ? mean : slowly();
}

void BilinearSampler::sample(std::span<const double> values, const Matrix3& back, const HealpixGrid& to_grid,
                             std::int64_t first, std::span<double> out) const {
    FOREGLOW_EXPECTS(static_cast<std::int64_t>(values.size()) == grid_.npix());
    Places places{};
    std::array<double, batch> cosines{}, sines{};
    const auto one_ring = [&](int, const HealpixGrid::Ring& ring, std::int64_t column, std::int64_t columns,
                              std::int64_t done) {
        const double step = 2.0 * pi / ring.pixels;
        fill_with_multiples(step, cosines, sines);
        // Batches begin at fixed places of a ring, so that a value does not depend on where the range begins.
        constexpr auto size = static_cast<std::int64_t>(batch);
        for (std::int64_t from = column / size * size; from < column + columns; from += size) {
            place_on_circle(make_circle(back, ring, ring.phi0 + step * static_cast<double>(from)),
                            cosines.data(), sines.data(), places);
            locate(grid_.nside(), places);
            if (grid_.nside() >= least_nside_of_series)
                measure_shares(zones_.data(), places);
            else
                for (std::size_t k = 0; k < batch; ++k)
                    places.below[k] = share_below(zones_[static_cast<std::size_t>(places.zone[k])],
                                                  places.z[k], std::hypot(places.x[k], places.y[k]));
            const std::int64_t end = std::min(from + size, column + columns);
            for (std::int64_t c = std::max(from, column); c < end; ++c) {
                const auto k = static_cast<std::size_t>(c - from);
                out[static_cast<std::size_t>(done + c - column)] =
                    read(values, static_cast<std::size_t>(places.zone[k]), places.below[k], places.turns[k]);
            }
        }
    };
    for_each_ring(to_grid, first, static_cast<std::int64_t>(out.size()), one_ring);
}

double weighted_mean(std::span<const double> values, const Stencil& stencil) {
    double sum = 0, weight = 0;
    for (std::size_t k = 0; k < 4; ++k) {
        const double value = values[static_cast<std::size_t>(stencil.pixels[k])];
        // A weight of 0 must not bring a pixel in, nor an undefined one down.
        if (!is_defined(value) || !(stencil.weights[k] > 0)) continue;
        sum += stencil.weights[k] * value;
        weight += stencil.weights[k];
    }
    return weight > 0 ? sum / weight : undefined_pixel;
}

}  // namespace foreglow
