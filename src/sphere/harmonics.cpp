// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/harmonics.h"

#include <libsharp/sharp.h>

#include <algorithm>
#include <cmath>
#include <memory>

#include "base/constants.h"
#include "base/error.h"

namespace foreglow {
namespace {

std::int64_t pixels_north_of(const HealpixGrid& grid, int ring) {
    return ring < grid.ring_count() ? grid.ring(ring).first_pixel : grid.npix();
}

/// The rings of a strip as libsharp wants them: pairs that lie symmetric about the equator, ordered by length
/// and azimuth so that Fourier plans are used again. Filled by hand: cos theta is then exact and pairs are
/// never missed by rounding.
class Geometry {
  public:
    Geometry(const HealpixGrid& grid, const RingStrip& strip, const RingWeights* weights) : grid_(grid) {
        FOREGLOW_EXPECTS(weights == nullptr ||
                         (weights->nside == grid.nside() &&
                          weights->values.size() == 2 * static_cast<std::size_t>(grid.nside())));
        weights_ = weights;
        const auto ranges = pixel_ranges(grid, strip);
        const int last = grid.ring_count() - 1;
        for (int r = strip.first; r < strip.first + strip.count; ++r) {
            const bool has_image = strip.mirrored && r != last - r;
            // A strip across the equator holds images of its own rings.
            const bool inner_image = !strip.mirrored && r != last - r && contains(strip, last - r);
            if (inner_image && r > last - r) continue;
            sharp_ringpair pair{};
            pair.r1 = ring_info(r, ranges[0]);
            pair.r2.nph = -1;
            if (inner_image) pair.r2 = ring_info(last - r, ranges[0]);
            if (has_image) pair.r2 = ring_info(last - r, ranges[1]);
            pairs_.push_back(pair);
        }
        std::stable_sort(pairs_.begin(), pairs_.end(), [](const sharp_ringpair& a, const sharp_ringpair& b) {
            return a.r1.nph != b.r1.nph ? a.r1.nph < b.r1.nph : a.r1.phi0 < b.r1.phi0;
        });
        info_.pair = pairs_.data();
        info_.npairs = static_cast<int>(pairs_.size());
        for (const auto& pair : pairs_)
            info_.nphmax = std::max(info_.nphmax, pair.r1.nph);
    }
    Geometry(const Geometry&) = delete;
    Geometry& operator=(const Geometry&) = delete;

    [[nodiscard]] const sharp_geom_info* info() const { return &info_; }

  private:
    static bool contains(const RingStrip& strip, int ring) {
        return ring >= strip.first && ring < strip.first + strip.count;
    }

    [[nodiscard]] sharp_ringinfo ring_info(int index, const PixelRange& range) const {
        const auto ring = grid_.ring(index);
        const int from_pole = std::min(index, grid_.ring_count() - 1 - index);
        sharp_ringinfo out{};
        out.theta = std::atan2(ring.sin_theta, ring.cos_theta);
        out.cth = ring.cos_theta;
        out.sth = ring.sin_theta;
        out.phi0 = ring.phi0;
        out.weight = grid_.pixel_area();
        if (weights_ != nullptr) out.weight *= weights_->values[static_cast<std::size_t>(from_pole)];
        out.ofs = range.offset + ring.first_pixel - range.first_pixel;
        out.nph = ring.pixels;
        out.stride = 1;
        return out;
    }

    HealpixGrid grid_;
    const RingWeights* weights_ = nullptr;
    std::vector<sharp_ringpair> pairs_;
    sharp_geom_info info_{};
};

struct DestroyAlmInfo {
    void operator()(sharp_alm_info* info) const { sharp_destroy_alm_info(info); }
};
using AlmInfo = std::unique_ptr<sharp_alm_info, DestroyAlmInfo>;

/// Describes the terms l <= lmax of coefficients that may hold more.
AlmInfo make_alm_info(const Alm& alm, int lmax) {
    std::vector<ptrdiff_t> start(static_cast<std::size_t>(lmax) + 1);
    for (int m = 0; m <= lmax; ++m)
        start[static_cast<std::size_t>(m)] = static_cast<ptrdiff_t>(alm.index(m, m)) - m;
    sharp_alm_info* info = nullptr;
    sharp_make_alm_info(lmax, lmax, 1, start.data(), &info);
    return AlmInfo(info);
}

/// libsharp takes pointers to mutable data for both directions and writes only its output.
template <typename T>
T* writable(std::span<const T> values) {
    return const_cast<T*>(values.data());
}

RingStrip whole_sky(const HealpixGrid& grid) {
    return {0, grid.ring_count(), false};
}

void expect_strip_length(const HealpixGrid& grid, const RingStrip& strip, std::size_t length) {
    FOREGLOW_EXPECTS(static_cast<std::int64_t>(length) == pixel_count(grid, strip));
}

}  // namespace

std::array<PixelRange, 2> pixel_ranges(const HealpixGrid& grid, const RingStrip& strip) {
    const int rings = grid.ring_count(), end = strip.first + strip.count;
    FOREGLOW_EXPECTS(strip.first >= 0 && strip.count >= 1 &&
                     end <= (strip.mirrored ? 2 * grid.nside() : rings));
    std::array<PixelRange, 2> out;
    out[0].first_pixel = pixels_north_of(grid, strip.first);
    out[0].count = pixels_north_of(grid, end) - out[0].first_pixel;
    if (strip.mirrored) {
        const int first_image = std::max(rings - end, 2 * grid.nside());
        out[1].first_pixel = pixels_north_of(grid, first_image);
        out[1].count = pixels_north_of(grid, rings - strip.first) - out[1].first_pixel;
        out[1].offset = out[0].count;
    }
    return out;
}

std::int64_t pixel_count(const HealpixGrid& grid, const RingStrip& strip) {
    const auto ranges = pixel_ranges(grid, strip);
    return ranges[0].count + ranges[1].count;
}

std::vector<RingStrip> cut_into_strips(const HealpixGrid& grid, std::int64_t pixels) {
    std::vector<RingStrip> out;
    const int rings = 2 * grid.nside();
    RingStrip strip{0, 0, true};
    std::int64_t held = 0;
    for (int r = 0; r < rings; ++r) {
        const std::int64_t more = std::int64_t{r == rings - 1 ? 1 : 2} * grid.ring(r).pixels;
        if (strip.count > 0 && held + more > pixels) {
            out.push_back(strip);
            strip = {r, 0, true};
            held = 0;
        }
        ++strip.count;
        held += more;
    }
    out.push_back(strip);
    return out;
}

void synthesize_strip(const Alm& alm, const HealpixGrid& grid, const RingStrip& strip, std::span<double> out,
                      int lmax) {
    expect_strip_length(grid, strip, out.size());
    const Geometry geometry(grid, strip, nullptr);
    const auto alm_info = make_alm_info(alm, std::min(lmax, alm.lmax()));
    void* alm_pointer = writable(alm.values());
    void* map_pointer = out.data();
    sharp_execute(SHARP_ALM2MAP, 0, &alm_pointer, &map_pointer, geometry.info(), alm_info.get(), SHARP_DP,
                  nullptr, nullptr);
}

void synthesize_strip_spin2(const AlmEB& alm, const HealpixGrid& grid, const RingStrip& strip,
                            std::span<double> q, std::span<double> u, int lmax) {
    expect_strip_length(grid, strip, q.size());
    FOREGLOW_EXPECTS(u.size() == q.size() && alm.e.lmax() == alm.b.lmax());
    lmax = std::min(lmax, alm.e.lmax());
    if (lmax < 2) {
        std::fill(q.begin(), q.end(), 0.0);
        std::fill(u.begin(), u.end(), 0.0);
        return;
    }
    const Geometry geometry(grid, strip, nullptr);
    const auto alm_info = make_alm_info(alm.e, lmax);
    void* alm_pointers[] = {writable(alm.e.values()), writable(alm.b.values())};
    void* map_pointers[] = {q.data(), u.data()};
    sharp_execute(SHARP_ALM2MAP, 2, static_cast<void*>(alm_pointers), static_cast<void*>(map_pointers),
                  geometry.info(), alm_info.get(), SHARP_DP, nullptr, nullptr);
}

void add_analysis_of_strip(Alm& alm, const HealpixGrid& grid, const RingStrip& strip,
                           std::span<const double> values, const RingWeights* weights) {
    expect_strip_length(grid, strip, values.size());
    const Geometry geometry(grid, strip, weights);
    const auto alm_info = make_alm_info(alm, alm.lmax());
    void* alm_pointer = alm.values().data();
    void* map_pointer = writable(values);
    sharp_execute(SHARP_MAP2ALM, 0, &alm_pointer, &map_pointer, geometry.info(), alm_info.get(),
                  SHARP_DP | SHARP_ADD, nullptr, nullptr);
    FOREGLOW_EXPECTS(std::isfinite(alm(0, 0).real()));  // one undefined pixel makes all m = 0 undefined
}

void add_analysis_of_strip_spin2(AlmEB& alm, const HealpixGrid& grid, const RingStrip& strip,
                                 std::span<const double> q, std::span<const double> u,
                                 const RingWeights* weights) {
    expect_strip_length(grid, strip, q.size());
    FOREGLOW_EXPECTS(u.size() == q.size() && alm.e.lmax() == alm.b.lmax());
    if (alm.e.lmax() < 2) return;
    const Geometry geometry(grid, strip, weights);
    const auto alm_info = make_alm_info(alm.e, alm.e.lmax());
    void* alm_pointers[] = {alm.e.values().data(), alm.b.values().data()};
    void* map_pointers[] = {writable(q), writable(u)};
    sharp_execute(SHARP_MAP2ALM, 2, static_cast<void*>(alm_pointers), static_cast<void*>(map_pointers),
                  geometry.info(), alm_info.get(), SHARP_DP | SHARP_ADD, nullptr, nullptr);
    FOREGLOW_EXPECTS(std::isfinite(alm.e(2, 0).real()) && std::isfinite(alm.b(2, 0).real()));
}

std::vector<double> synthesize(const Alm& alm, const HealpixGrid& grid, int lmax) {
    std::vector<double> out(static_cast<std::size_t>(grid.npix()));
    synthesize_strip(alm, grid, whole_sky(grid), out, lmax);
    return out;
}

StokesValues synthesize_spin2(const AlmEB& alm, const HealpixGrid& grid, int lmax) {
    const auto npix = static_cast<std::size_t>(grid.npix());
    StokesValues out{std::vector<double>(npix), std::vector<double>(npix)};
    synthesize_strip_spin2(alm, grid, whole_sky(grid), out.q, out.u, lmax);
    return out;
}

Alm analyse(const HealpixGrid& grid, std::span<const double> map, int lmax, const RingWeights* weights) {
    Alm out(lmax);
    add_analysis_of_strip(out, grid, whole_sky(grid), map, weights);
    return out;
}

AlmEB analyse_spin2(const HealpixGrid& grid, std::span<const double> q, std::span<const double> u, int lmax,
                    const RingWeights* weights) {
    AlmEB out{Alm(lmax), Alm(lmax)};
    add_analysis_of_strip_spin2(out, grid, whole_sky(grid), q, u, weights);
    return out;
}

}  // namespace foreglow
