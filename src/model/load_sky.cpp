// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/load_sky.h"

#include <algorithm>
#include <cmath>

#include "base/error.h"
#include "base/text.h"
#include "model/detailed_sky.h"
#include "model/electron_sky.h"
#include "model/map_source.h"
#include "model/sketch_sky.h"
#include "physics/spectral_law.h"
#include "sphere/regrid.h"
#include "sphere/rotation.h"

namespace foreglow {
namespace {

constexpr double template_tolerance = 1e-8;  // of a template's a_lm: far below any accuracy a study asks for

std::string regrid_notice(const char* what, const HealpixGrid& from, const HealpixGrid& to, int lmax) {
    return std::string(what) + " brought from nside " + std::to_string(from.nside()) + " to " +
           std::to_string(to.nside()) + " through its a_lm up to l = " + std::to_string(lmax);
}

// The map of filled pixels, shared with the fields that stay undefined near them.
std::shared_ptr<const SkyMap> share_filled(const HealpixGrid& grid, Frame frame, std::vector<double> filled) {
    if (filled.empty()) return nullptr;
    return std::make_shared<const SkyMap>(SkyMap{grid, frame, "", std::move(filled)});
}

// A finer template has structure above lmax: analysed only up to lmax it would be pressed into the larger
// scales.
int analysis_lmax(const HealpixGrid& from, const HealpixGrid& to, int lmax) {
    return from.nside() > to.nside() ? 5 * lmax / 2 : lmax;
}

PixelField bring_intensity(SkyMap map, const HealpixGrid& grid, int lmax, Progress& progress) {
    if (map.grid == grid) return PixelField::of_map(std::make_shared<const SkyMap>(std::move(map)));
    progress.notice(regrid_notice("intensity template", map.grid, grid, trusted_lmax(map.grid, lmax)));
    AnalysedMap result = analyse_filled(map, analysis_lmax(map.grid, grid, lmax), template_tolerance);
    result.alm = with_lmax(result.alm, trusted_lmax(map.grid, lmax));
    return PixelField::harmonic(std::move(result.alm), map.frame,
                                share_filled(map.grid, map.frame, std::move(result.filled)));
}

StokesField bring_stokes(StokesMaps maps, const HealpixGrid& grid, Frame frame, int lmax,
                         Progress& progress) {
    if (maps.grid == grid && maps.frame == frame)
        return {std::make_shared<const StokesMaps>(std::move(maps)), nullptr};
    progress.notice(
        regrid_notice("polarization template", maps.grid, grid, trusted_lmax(maps.grid, lmax)) +
        (maps.frame == frame ? "" : " and turned from " + to_text(maps.frame) + " to " + to_text(frame)));
    AnalysedStokes result = analyse_filled(maps, analysis_lmax(maps.grid, grid, lmax), template_tolerance);
    result.alm = {with_lmax(result.alm.e, trusted_lmax(maps.grid, lmax)),
                  with_lmax(result.alm.b, trusted_lmax(maps.grid, lmax))};
    if (maps.frame != frame) rotate_alm(result.alm, maps.frame, frame);
    return {std::move(result.alm), share_filled(maps.grid, maps.frame, std::move(result.filled))};
}

// An index, curvature or fraction on the sky's grid; a finer one is first coarsened by means weighted with
// the brightness.
PixelField bring_plain(SkyMap map, const HealpixGrid& grid, Frame frame, const SkyMap& brightness) {
    if (map.grid.nside() > grid.nside()) {
        const SkyMap weights = interpolate(brightness, map.grid, map.frame);
        map = {grid, map.frame, map.unit, degrade(map.grid, map.values, grid, weights.values)};
    }
    return PixelField::interpolated(std::make_shared<const SkyMap>(std::move(map)), grid, frame);
}

PixelField bring_value_or_map(const ValueOrMap& value, const HealpixGrid& grid, Frame frame,
                              const SkyMap& brightness, Progress& progress) {
    if (const double* number = std::get_if<double>(&value)) return PixelField::uniform(*number);
    return bring_plain(read_plain_map(std::get<MapSource>(value), progress), grid, frame, brightness);
}

void subtract_zero_level(SkyMap& map, const Brightness& level, Frequency reference) {
    const double kelvin = level.value * rayleigh_jeans_per_unit(level.unit, reference, map.grid.pixel_area());
    for (double& value : map.values)
        value -= kelvin;
}

LRange fit_lrange_of(const DetailSpec& detail, Angle beam) {
    return detail.fit_lrange.value_or(default_fit_lrange(beam));
}

// Where the detail continues the template's own spectrum, that is measured before the template is brought to
// another grid.
void fit_intensity_template(const ModelSpec& model, const SkyMap& map, SkyModel& sky) {
    if (!model.detail || model.detail->intensity || model.detail->spectrum) return;
    const Angle beam = *model.intensity->beam_fwhm;
    sky.intensity_fit = fit_intensity(map, beam, model.detail->latitude_cut,
                                      fit_lrange_of(*model.detail, beam), model.detail->place);
}

void fit_polarization_template(const ModelSpec& model, const StokesMaps& maps, SkyModel& sky) {
    if (!model.detail || model.detail->polarization || model.detail->spectrum) return;
    const Angle beam = *model.polarization->beam_fwhm;
    sky.polarization_fit = fit_polarization(maps, beam, model.detail->latitude_cut,
                                            fit_lrange_of(*model.detail, beam), model.detail->place);
}

PolarizedSky load_polarization(const ModelSpec& model, SkyModel& sky, int lmax, const SkyMap& brightness,
                               Progress& progress) {
    const PolarizationSpec& spec = *model.polarization;
    PolarizedSky polarized;
    polarized.reference = spec.reference_frequency.value_or(sky.reference);
    polarized.beam_fwhm = spec.beam_fwhm;
    if (spec.map) {
        StokesMaps maps = read_stokes_maps(*spec.map, polarized.reference, progress);
        fit_polarization_template(model, maps, sky);
        polarized.stokes = bring_stokes(std::move(maps), sky.grid, sky.frame, lmax, progress);
    } else {
        FOREGLOW_EXPECTS(spec.fraction && spec.angle_map);
        polarized.stokes =
            bring_stokes(read_angle_map(*spec.angle_map, progress), sky.grid, sky.frame, lmax, progress);
        polarized.fraction = bring_value_or_map(*spec.fraction, sky.grid, sky.frame, brightness, progress);
    }
    if (spec.index)
        polarized.index = bring_value_or_map(*spec.index, sky.grid, sky.frame, brightness, progress);
    return polarized;
}

void check_polarization_of(const ModelSpec& model, bool with_polarization) {
    if (with_polarization && model.electrons && model.electrons->law.geometry == FieldGeometry::Tangled)
        throw InputError("the study asks for IQU but the field of [electrons] in the model " + model.name +
                         " is tangled, which leaves no polarization: set `stokes = \"I\"` or geometry = "
                         "\"ordered\"");
}

// Maps of field and energies on a finer grid are coarsened by means weighted with the brightness, as indices.
void add_electrons(const ModelSpec& model, SkyModel& sky, const SkyMap* brightness, Progress& progress) {
    const ElectronsSpec& spec = *model.electrons;
    ElectronSky& electrons = sky.electrons.emplace();
    electrons.law = spec.law;
    electrons.definition = model.index.frequency.value_or(sky.reference);
    if (model.index.between) electrons.definition = *model.index.between;
    const SkyMap level{
        sky.grid, sky.frame, "",
        std::vector<double>(brightness != nullptr ? 0 : static_cast<std::size_t>(sky.grid.npix()), 1.0)};
    const auto bring = [&](const std::optional<MapSource>& source, std::optional<PixelField>& field) {
        if (source)
            field = bring_plain(read_plain_map(*source, progress), sky.grid, sky.frame,
                                brightness != nullptr ? *brightness : level);
    };
    bring(spec.field_map, electrons.field);
    bring(spec.break_energy_map, electrons.break_energy);
    bring(spec.cutoff_energy_map, electrons.cutoff_energy);
    find_electron_slopes(sky);
}

void check_units(const MapSource& source, const FitsMapHeader& header, std::size_t columns) {
    FOREGLOW_EXPECTS(!header.requested.empty());
    for (std::size_t i = 0; i < std::min(columns, header.requested.size()); ++i)
        for (const FitsMapColumnInfo& column : header.columns)
            if (column.number == header.requested[i]) static_cast<void>(resolve_unit(source, column.unit));
}

/// Looks at the headers of a model's maps one by one and adds up what they will hold in memory.
class HeaderCheck {
  public:
    HeaderCheck(const HealpixGrid& grid, int lmax) : grid_(grid), lmax_(lmax) {}

    void intensity(const MapSource& source) {
        const FitsMapHeader header = open(source);
        check_units(source, header, 1);
        add(header, header.grid == grid_, 1);
        maps_.frame = resolve_frame(source, header.frame);
    }
    void plain(const ValueOrMap& value) {
        const auto* source = std::get_if<MapSource>(&value);
        if (source == nullptr) return;
        const FitsMapHeader header = open(*source);
        static_cast<void>(resolve_frame(*source, header.frame));
        maps_.held_values += std::min(header.grid.npix(), grid_.npix());
    }
    void stokes(const MapSource& source, bool brightness) {
        const FitsMapHeader header = open(source);
        const Frame frame = resolve_frame(source, header.frame);
        if (brightness) check_units(source, header, 2);
        static_cast<void>(resolve_convention(source, header.convention));
        add(header, header.grid == grid_ && frame == maps_.frame, 2);
    }
    void electrons(const ElectronsSpec& spec) {
        add_held(grid_.npix());  // slopes
        for (const auto* map : {&spec.field_map, &spec.break_energy_map, &spec.cutoff_energy_map})
            if (*map) plain(**map);
    }
    void add_held(std::int64_t values) { maps_.held_values += values; }
    [[nodiscard]] ModelMaps result() const { return maps_; }

  private:
    FitsMapHeader open(const MapSource& source) {
        FitsMapHeader header = read_fits_map_header(make_request(source));
        maps_.largest_nside = std::max(maps_.largest_nside, header.grid.nside());
        return header;
    }
    void add(const FitsMapHeader& header, bool pixel_for_pixel, std::int64_t columns) {
        const std::int64_t l = trusted_lmax(header.grid, lmax_);
        maps_.held_values += columns * (pixel_for_pixel ? grid_.npix() : (l + 1) * (l + 2));
    }

    HealpixGrid grid_;
    int lmax_;
    ModelMaps maps_;
};

}  // namespace

ModelMaps check_model_maps(const ModelSpec& model, const HealpixGrid& grid, int lmax, bool with_polarization,
                           std::span<const Channel> channels) {
    check_polarization_of(model, with_polarization);
    if (model.galaxy) return {Frame::Galactic, count_galaxy_values(grid, with_polarization, channels), 0};
    const std::int64_t random = detail_held_values(model, grid, with_polarization);
    HeaderCheck check(grid, lmax);
    if (model.electrons) check.electrons(*model.electrons);
    if (model.sketch) {
        check.add_held((with_polarization ? 5 : 3) * grid.npix() + random);
        return check.result();
    }
    FOREGLOW_EXPECTS(model.intensity.has_value());
    check.intensity(model.intensity->map);
    check.plain(model.index.value);
    check.plain(model.curvature);
    check.add_held(random);
    if (!with_polarization || !model.polarization) return check.result();
    const PolarizationSpec& polarization = *model.polarization;
    if (polarization.map) check.stokes(*polarization.map, true);
    if (polarization.angle_map) check.stokes(*polarization.angle_map, false);
    if (polarization.fraction) check.plain(*polarization.fraction);
    if (polarization.index) check.plain(*polarization.index);
    return check.result();
}

SkyModel load_sky(const ModelSpec& model, const HealpixGrid& grid, int lmax, bool with_polarization,
                  Progress& progress, const SkyUse& use) {
    check_polarization_of(model, with_polarization);
    if (model.galaxy)
        return make_galaxy_sky(*model.galaxy, model.reference_frequency, grid, with_polarization, use,
                               progress);
    if (model.sketch) {
        SkyModel sky = make_sketch_sky(*model.sketch, model.reference_frequency, grid, with_polarization);
        if (model.electrons) add_electrons(model, sky, nullptr, progress);
        return sky;
    }
    SkyModel sky;
    sky.grid = grid;
    sky.reference = model.reference_frequency;
    SkyMap intensity = read_brightness_map(model.intensity->map, sky.reference, progress);
    if (model.intensity->zero_level)
        subtract_zero_level(intensity, *model.intensity->zero_level, sky.reference);
    fit_intensity_template(model, intensity, sky);
    sky.frame = intensity.frame;
    sky.beam_fwhm = model.intensity->beam_fwhm;
    if (model.index.frequency)
        sky.index_log_ratio = log_frequency_ratio(*model.index.frequency, sky.reference);
    sky.index = bring_value_or_map(model.index.value, grid, sky.frame, intensity, progress);
    sky.curvature = bring_value_or_map(model.curvature, grid, sky.frame, intensity, progress);
    if (with_polarization) {
        if (!model.polarization)
            throw InputError("the study asks for IQU but the model " + model.name +
                             " has no [polarization]: add one, or set `stokes = \"I\"`");
        sky.polarization = load_polarization(model, sky, lmax, intensity, progress);
    }
    if (model.electrons) add_electrons(model, sky, &intensity, progress);
    sky.intensity = bring_intensity(std::move(intensity), grid, lmax, progress);
    return sky;
}

}  // namespace foreglow
