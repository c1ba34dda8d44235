// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/sketch_sky.h"

#include "base/parallel.h"
#include "model/sketch_formulas.h"
#include "sphere/harmonics.h"

namespace foreglow {
namespace {

std::vector<double> unit_field(const SketchSpec& sketch, const HealpixGrid& grid, SketchField field) {
    return synthesize(make_sketch_alm(sketch, grid, field), grid);
}

std::shared_ptr<SkyMap> empty_map(const HealpixGrid& grid) {
    auto map = std::make_shared<SkyMap>();
    map->grid = grid;
    map->frame = Frame::Galactic;
    map->values.resize(static_cast<std::size_t>(grid.npix()));
    return map;
}

std::shared_ptr<const SkyMap> make_intensity(const SketchSpec& sketch, const HealpixGrid& grid) {
    auto map = empty_map(grid);
    std::vector<double> texture(map->values.size(), 0.0);
    if (sketch.texture) texture = unit_field(sketch, grid, SketchField::Texture);
    parallel_for_blocks(grid.npix(), 4096, [&](std::int64_t begin, std::int64_t end) {
        for (std::int64_t p = begin; p < end; ++p) {
            const auto i = static_cast<std::size_t>(p);
            map->values[i] = sketch_intensity(sketch, grid.direction(p), texture[i]);
        }
    });
    return map;
}

PixelField make_scattered(const SketchSpec& sketch, const HealpixGrid& grid, SketchField field, double mean,
                          double rms) {
    if (rms == 0) return PixelField::uniform(mean);
    auto map = empty_map(grid);
    map->values = unit_field(sketch, grid, field);
    for (double& value : map->values)
        value = sketch_scattered(mean, rms, value);
    return PixelField::of_map(map);
}

std::shared_ptr<const StokesMaps> make_stokes(const SketchSpec& sketch, const SkyMap& intensity) {
    const HealpixGrid& grid = intensity.grid;
    const AlmEB alm{make_sketch_alm(sketch, grid, SketchField::E),
                    make_sketch_alm(sketch, grid, SketchField::B)};
    StokesValues random = synthesize_spin2(alm, grid);
    auto maps = std::make_shared<StokesMaps>();
    maps->grid = grid;
    maps->frame = Frame::Galactic;
    maps->q.resize(intensity.values.size());
    maps->u.resize(intensity.values.size());
    for (std::size_t i = 0; i < maps->q.size(); ++i) {
        const auto [q, u] = sketch_stokes(sketch, grid.direction(static_cast<std::int64_t>(i)),
                                          intensity.values[i], random.q[i], random.u[i]);
        maps->q[i] = q;
        maps->u[i] = u;
    }
    return maps;
}

}  // namespace

SkyModel make_sketch_sky(const SketchSpec& sketch, Frequency reference, const HealpixGrid& grid,
                         bool with_polarization) {
    SkyModel sky;
    sky.grid = grid;
    sky.frame = Frame::Galactic;
    sky.reference = reference;
    const auto intensity = make_intensity(sketch, grid);
    sky.intensity = PixelField::of_map(intensity);
    sky.index = make_scattered(sketch, grid, SketchField::Index, sketch.index, sketch.index_rms);
    sky.curvature =
        make_scattered(sketch, grid, SketchField::Curvature, sketch.curvature, sketch.curvature_rms);
    if (with_polarization) {
        PolarizedSky polarized;
        polarized.stokes.source = make_stokes(sketch, *intensity);
        polarized.reference = reference;
        sky.polarization = std::move(polarized);
    }
    sky.beam_fwhm = Angle::from_degrees(sketch_finest_scale_deg);
    sky.labels.push_back("Invented sky from closed formulas: not a measurement of the Galaxy");
    return sky;
}

}  // namespace foreglow
