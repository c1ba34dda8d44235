// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/load_sky.h"

#include <algorithm>
#include <cmath>

#include "base/error.h"
#include "base/text.h"
#include "model/map_source.h"
#include "model/sketch_sky.h"
#include "physics/spectral_law.h"
#include "sphere/converged_analysis.h"
#include "sphere/fill.h"
#include "sphere/regrid.h"
#include "sphere/rotation.h"

namespace foreglow {
namespace {

constexpr double template_tolerance = 1e-8;  // of a template's a_lm: far below any accuracy a study asks for
constexpr int most_refinements = 12;

// Above about 2.5 nside the transforms of pixelized maps are not trustworthy (measured; see docs/accuracy.md).
int trusted_lmax(const HealpixGrid& map_grid, int lmax) {
    return std::min(lmax, std::max(2, 5 * map_grid.nside() / 2));
}

std::shared_ptr<const SkyMap> map_of_filled(const HealpixGrid& grid, Frame frame, const std::vector<double>& values) {
    auto filled = std::make_shared<SkyMap>();
    filled->grid = grid;
    filled->frame = frame;
    bool any = false;
    for (const double value : values) {
        filled->values.push_back(is_defined(value) ? 0.0 : 1.0);
        any = any || !is_defined(value);
    }
    return any ? filled : nullptr;
}

std::string regrid_notice(const char* what, const HealpixGrid& from, const HealpixGrid& to, int lmax) {
    return std::string(what) + " brought from nside " + std::to_string(from.nside()) + " to " + std::to_string(to.nside()) +
           " through its a_lm up to l = " + std::to_string(lmax);
}

PixelField bring_intensity(SkyMap map, const HealpixGrid& grid, int lmax, Progress& progress) {
    if (map.grid == grid) return PixelField::of_map(std::make_shared<const SkyMap>(std::move(map)));
    const int l = trusted_lmax(map.grid, lmax);
    progress.notice(regrid_notice("intensity template", map.grid, grid, l));
    auto filled = map_of_filled(map.grid, map.frame, map.values);
    if (filled) fill_undefined(map.grid, map.values);
    const RingWeights weights = make_ring_weights(map.grid.nside(), std::min(2 * l, 3 * map.grid.nside() - 1));
    ConvergedAlm result = analyse_converged(map.grid, map.values, l, {template_tolerance, most_refinements, &weights, {}});
    return PixelField::harmonic(std::move(result.alm), map.frame, std::move(filled));
}

StokesField bring_stokes(StokesMaps maps, const HealpixGrid& grid, Frame frame, int lmax, Progress& progress) {
    if (maps.grid == grid && maps.frame == frame) return {std::make_shared<const StokesMaps>(std::move(maps)), nullptr};
    const int l = trusted_lmax(maps.grid, lmax);
    progress.notice(regrid_notice("polarization template", maps.grid, grid, l) +
                    (maps.frame == frame ? "" : " and turned from " + to_text(maps.frame) + " to " + to_text(frame)));
    auto filled = map_of_filled(maps.grid, maps.frame, maps.q);
    if (filled) {
        fill_undefined(maps.grid, maps.q);
        fill_undefined(maps.grid, maps.u);
    }
    const RingWeights weights = make_ring_weights(maps.grid.nside(), std::min(2 * l, 3 * maps.grid.nside() - 1));
    ConvergedAlmEB result =
        analyse_converged_spin2(maps.grid, maps.q, maps.u, l, {template_tolerance, most_refinements, &weights, {}});
    if (maps.frame != frame) rotate_alm(result.alm, maps.frame, frame);
    return {std::move(result.alm), std::move(filled)};
}

// An index, curvature or fraction on the sky's grid; a finer one is first coarsened by means weighted with the brightness.
PixelField bring_plain(SkyMap map, const HealpixGrid& grid, Frame frame, const SkyMap& brightness) {
    if (map.grid.nside() > grid.nside()) {
        const SkyMap weights = interpolate(brightness, map.grid, map.frame);
        map = {grid, map.frame, map.unit, degrade(map.grid, map.values, grid, weights.values)};
    }
    return PixelField::interpolated(std::make_shared<const SkyMap>(std::move(map)), grid, frame);
}

PixelField bring_value_or_map(const ValueOrMap& value, const HealpixGrid& grid, Frame frame, const SkyMap& brightness,
                              Progress& progress) {
    if (const double* number = std::get_if<double>(&value)) return PixelField::uniform(*number);
    return bring_plain(read_plain_map(std::get<MapSource>(value), progress), grid, frame, brightness);
}

void subtract_zero_level(SkyMap& map, const Brightness& level, Frequency reference) {
    const double kelvin = level.value * rayleigh_jeans_per_unit(level.unit, reference, map.grid.pixel_area());
    for (double& value : map.values) value -= kelvin;
}

PolarizedSky load_polarization(const PolarizationSpec& spec, const SkyModel& sky, int lmax, const SkyMap& brightness,
                               Progress& progress) {
    PolarizedSky polarized;
    polarized.reference = spec.reference_frequency.value_or(sky.reference);
    polarized.beam_fwhm = spec.beam_fwhm;
    if (spec.map) {
        polarized.stokes = bring_stokes(read_stokes_maps(*spec.map, polarized.reference, progress), sky.grid, sky.frame, lmax,
                                        progress);
    } else {
        FOREGLOW_EXPECTS(spec.fraction && spec.angle_map);
        polarized.stokes = bring_stokes(read_angle_map(*spec.angle_map, progress), sky.grid, sky.frame, lmax, progress);
        polarized.fraction = bring_value_or_map(*spec.fraction, sky.grid, sky.frame, brightness, progress);
    }
    if (spec.index) polarized.index = bring_value_or_map(*spec.index, sky.grid, sky.frame, brightness, progress);
    return polarized;
}

void check_plain(const ValueOrMap& value) {
    const auto* source = std::get_if<MapSource>(&value);
    if (source == nullptr) return;
    static_cast<void>(resolve_frame(*source, read_fits_map_header(make_request(*source)).frame));
}

void check_units(const MapSource& source, const FitsMapHeader& header, std::size_t columns) {
    FOREGLOW_EXPECTS(!header.requested.empty());
    for (std::size_t i = 0; i < std::min(columns, header.requested.size()); ++i)
        for (const FitsMapColumnInfo& column : header.columns)
            if (column.number == header.requested[i]) static_cast<void>(resolve_unit(source, column.unit));
}

}  // namespace

Frame check_model_maps(const ModelSpec& model, bool with_polarization) {
    if (model.sketch) return Frame::Galactic;
    FOREGLOW_EXPECTS(model.intensity.has_value());
    const MapSource& intensity = model.intensity->map;
    const FitsMapHeader header = read_fits_map_header(make_request(intensity));
    const Frame frame = resolve_frame(intensity, header.frame);
    check_units(intensity, header, 1);
    check_plain(model.index.value);
    check_plain(model.curvature);
    if (!with_polarization || !model.polarization) return frame;
    const PolarizationSpec& polarization = *model.polarization;
    if (polarization.map) {
        const FitsMapHeader stokes = read_fits_map_header(make_request(*polarization.map));
        static_cast<void>(resolve_frame(*polarization.map, stokes.frame));
        check_units(*polarization.map, stokes, 2);
        static_cast<void>(resolve_convention(*polarization.map, stokes.convention));
    }
    if (polarization.angle_map) {
        const FitsMapHeader angles = read_fits_map_header(make_request(*polarization.angle_map));
        static_cast<void>(resolve_frame(*polarization.angle_map, angles.frame));
        static_cast<void>(resolve_convention(*polarization.angle_map, angles.convention));
    }
    if (polarization.fraction) check_plain(*polarization.fraction);
    if (polarization.index) check_plain(*polarization.index);
    return frame;
}

SkyModel load_sky(const ModelSpec& model, const HealpixGrid& grid, int lmax, bool with_polarization, Progress& progress) {
    if (model.sketch) return make_sketch_sky(*model.sketch, model.reference_frequency, grid, with_polarization);
    SkyModel sky;
    sky.grid = grid;
    sky.reference = model.reference_frequency;
    SkyMap intensity = read_brightness_map(model.intensity->map, sky.reference, progress);
    if (model.intensity->zero_level) subtract_zero_level(intensity, *model.intensity->zero_level, sky.reference);
    sky.frame = intensity.frame;
    sky.beam_fwhm = model.intensity->beam_fwhm;
    if (model.index.frequency) sky.index_log_ratio = log_frequency_ratio(*model.index.frequency, sky.reference);
    sky.index = bring_value_or_map(model.index.value, grid, sky.frame, intensity, progress);
    sky.curvature = bring_value_or_map(model.curvature, grid, sky.frame, intensity, progress);
    if (with_polarization) {
        if (!model.polarization)
            throw InputError("the study asks for IQU but the model " + model.name +
                             " has no [polarization]: add one, or set `stokes = \"I\"`");
        sky.polarization = load_polarization(*model.polarization, sky, lmax, intensity, progress);
    }
    sky.intensity = bring_intensity(std::move(intensity), grid, lmax, progress);
    return sky;
}

}  // namespace foreglow
