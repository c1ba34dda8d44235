// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/sketch_points.h"

#include <vector>

#include "model/sketch_formulas.h"
#include "model/sketch_sky.h"
#include "model/strip_points.h"

namespace foreglow {
namespace {

constexpr int largest_whole_nside = 512;   // five maps of it take 126 MB
constexpr std::size_t share_of_rings = 8;  // one ring costs more than its share of the whole sky

std::vector<double> synthesize_ring(const std::optional<Alm>& alm, const HealpixGrid& grid, int ring) {
    std::vector<double> values(static_cast<std::size_t>(grid.ring(ring).pixels), 0.0);
    if (alm) synthesize_strip(*alm, grid, {ring, 1, false}, values);
    return values;
}

SkyStrip make_sized(std::size_t count, bool with_polarization) {
    SkyStrip out;
    out.intensity.resize(count);
    out.index.resize(count);
    out.curvature.resize(count);
    out.q.resize(with_polarization ? count : 0);
    out.u.resize(with_polarization ? count : 0);
    return out;
}

}  // namespace

SketchPoints::SketchPoints(const SketchSpec& sketch, const HealpixGrid& grid, bool with_polarization)
    : sketch_(sketch), grid_(grid) {
    if (sketch.texture) texture_ = make_sketch_alm(sketch, grid, SketchField::Texture);
    if (sketch.index_rms != 0) index_ = make_sketch_alm(sketch, grid, SketchField::Index);
    if (sketch.curvature_rms != 0) curvature_ = make_sketch_alm(sketch, grid, SketchField::Curvature);
    if (with_polarization)
        polarization_ = AlmEB{make_sketch_alm(sketch, grid, SketchField::E),
                              make_sketch_alm(sketch, grid, SketchField::B)};
}

SkyStrip SketchPoints::evaluate(std::span<const std::int64_t> pixels) const {
    const std::vector<RingPlaces> rings = sort_by_ring(grid_, pixels);
    if (whole_ || (grid_.nside() <= largest_whole_nside &&
                   rings.size() * share_of_rings > static_cast<std::size_t>(grid_.ring_count())))
        return pick_from_whole(pixels);
    SkyStrip out = make_sized(pixels.size(), polarization_.has_value());
    for (const RingPlaces& group : rings)
        add_ring(group.ring, pixels, group.places, out);
    return out;
}

void SketchPoints::add_ring(int ring, std::span<const std::int64_t> pixels,
                            std::span<const std::size_t> places, SkyStrip& out) const {
    const std::int64_t first = grid_.ring(ring).first_pixel;
    const std::vector<double> texture = synthesize_ring(texture_, grid_, ring);
    const std::vector<double> index = synthesize_ring(index_, grid_, ring);
    const std::vector<double> curvature = synthesize_ring(curvature_, grid_, ring);
    std::vector<double> q(texture.size()), u(texture.size());
    if (polarization_) synthesize_strip_spin2(*polarization_, grid_, {ring, 1, false}, q, u);
    for (const std::size_t place : places) {
        const auto column = static_cast<std::size_t>(pixels[place] - first);
        const Vector3 n = grid_.direction(pixels[place]);
        out.intensity[place] = sketch_intensity(sketch_, n, texture[column]);
        out.index[place] = sketch_scattered(sketch_.index, sketch_.index_rms, index[column]);
        out.curvature[place] = sketch_scattered(sketch_.curvature, sketch_.curvature_rms, curvature[column]);
        if (!polarization_) continue;
        const auto stokes = sketch_stokes(sketch_, n, out.intensity[place], q[column], u[column]);
        out.q[place] = stokes[0];
        out.u[place] = stokes[1];
    }
}

SkyStrip SketchPoints::pick_from_whole(std::span<const std::int64_t> pixels) const {
    const bool polarized = polarization_.has_value();
    if (!whole_) {
        const SkyModel sky = make_sketch_sky(sketch_, Frequency::from_ghz(1), grid_, polarized);
        whole_ =
            std::make_shared<const SkyStrip>(make_sky_strip(sky, {0, grid_.ring_count(), false}, polarized));
    }
    SkyStrip out = make_sized(pixels.size(), polarized);
    for (std::size_t i = 0; i < pixels.size(); ++i) {
        const auto p = static_cast<std::size_t>(pixels[i]);
        out.intensity[i] = whole_->intensity[p];
        out.index[i] = whole_->index[p];
        out.curvature[i] = whole_->curvature[p];
        if (!polarized) continue;
        out.q[i] = whole_->q[p];
        out.u[i] = whole_->u[p];
    }
    return out;
}

}  // namespace foreglow
