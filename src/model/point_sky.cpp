// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/point_sky.h"

#include <cmath>

#include "base/error.h"
#include "model/detailed_sky.h"
#include "model/galaxy_points.h"
#include "model/load_sky.h"
#include "model/point_electrons.h"
#include "model/point_field.h"
#include "model/sketch_points.h"
#include "model/strip_points.h"
#include "physics/spectral_law.h"
#include "sphere/stokes_turn.h"

namespace foreglow {
namespace {

std::string approximation_notice(const char* what, const PointMap& map, const HealpixGrid& grid,
                                 Frame frame) {
    const bool finer = map.grid().nside() > grid.nside();
    return std::string("the ") + what + " template has nside " + std::to_string(map.grid().nside()) + " in " +
           to_text(map.frame()) + ", this sky nside " + std::to_string(grid.nside()) + " in " +
           to_text(frame) + ": it is read by " + (finer ? "the mean of its pixels" : "interpolation") +
           ", where make goes through its a_lm";
}

/// Q and U of a template, against the meridians of the sky's frame.
class PointStokes {
  public:
    PointStokes(PointMap map, const HealpixGrid& grid, Frame frame)
        : map_(std::move(map)), grid_(grid), frame_(frame), to_sky_(rotation_between(map_.frame(), frame)) {
        if (!is_pixel_for_pixel()) sampler_.emplace(map_.grid());
    }

    [[nodiscard]] bool is_pixel_for_pixel() const { return map_.grid() == grid_ && map_.frame() == frame_; }
    [[nodiscard]] const PointMap& map() const { return map_; }

    void evaluate(std::span<const std::int64_t> pixels, std::span<double> q, std::span<double> u) const {
        if (is_pixel_for_pixel()) return map_.read_stokes(pixels, q, u);
        std::vector<std::int64_t> corners(4 * pixels.size());
        std::vector<double> weights(corners.size()), corner_q(corners.size()), corner_u(corners.size());
        make_stencils(*sampler_, map_.frame(), grid_, frame_, pixels, corners, weights);
        map_.read_stokes(corners, corner_q, corner_u);
        const Matrix3 to_map = rotation_between(frame_, map_.frame());
        for (std::size_t i = 0; i < pixels.size(); ++i) {
            // Carried to the pixel first: near a pole the corners' meridians differ.
            const Vector3 here = rotate(to_map, grid_.direction(pixels[i]));
            const StokesTurn turn = turn_between_frames(here, to_sky_);
            for (std::size_t k = 4 * i; k < 4 * i + 4; ++k) {
                apply(turn_along_great_circle(map_.grid().direction(corners[k]), here), corner_q[k],
                      corner_u[k]);
                if (map_.frame() != frame_) apply(turn, corner_q[k], corner_u[k]);
            }
            const auto four = [i](const std::vector<double>& values) {
                return std::span(values).subspan(4 * i, 4);
            };
            q[i] = mean_of_four(four(corner_q), four(weights));
            u[i] = mean_of_four(four(corner_u), four(weights));
        }
    }

  private:
    PointMap map_;
    HealpixGrid grid_;
    Frame frame_;
    Matrix3 to_sky_;
    std::optional<BilinearSampler> sampler_;
};

/// What Q and U of a model over templates are made of.
struct PolarizedPoints {
    std::optional<PointStokes> stokes;
    std::optional<PointField> fraction, index;
};

}  // namespace

struct PointSky::Impl {
    Impl(const ModelSpec& model, std::optional<HealpixGrid> grid_in, bool with_polarization);
    Impl(const ModelSpec& model, SkyModel sky, bool with_polarization);
    void open_templates(const ModelSpec& model, std::optional<HealpixGrid> grid_in);
    void open_electrons(const ModelSpec& model);
    void open_polarization(const PolarizationSpec& spec);
    void add_electrons(std::span<const std::int64_t> pixels, SkyStrip& values) const;
    [[nodiscard]] std::vector<double> ratios_at_polarization(const SkyStrip& values) const;
    [[nodiscard]] PointField open_value(const ValueOrMap& value);
    void add_polarization(std::span<const std::int64_t> pixels, SkyStrip& values) const;
    void scale_to_fraction(std::span<const std::int64_t> pixels, SkyStrip& values) const;

    HealpixGrid grid{1};
    Frame frame = Frame::Galactic;
    Frequency reference, polarized_reference;
    double index_log_ratio = 0;
    std::shared_ptr<const PointMap> brightness;  // of models over templates
    std::optional<PointField> intensity, index, curvature;
    std::optional<PolarizedPoints> polarization;
    std::optional<GalaxyPoints> galaxy;
    std::optional<SketchPoints> sketch;
    std::optional<ElectronLaw> electrons;  // instead of index and curvature
    IndexDefinition definition;            // where the index holds that their slopes come from
    std::optional<PointField> field, break_energy, cutoff_energy;
    std::optional<SkyModel> whole;  // made with its random structure
    bool has_stokes = false;        // of the Galaxy or of a whole sky
    std::vector<std::string> notices;
};

PointSky::Impl::Impl(const ModelSpec& model, SkyModel sky, bool with_polarization)
    : grid(sky.grid),
      frame(sky.frame),
      reference(model.reference_frequency),
      polarized_reference(reference),
      whole(std::move(sky)),
      has_stokes(with_polarization) {
    if (with_polarization) polarized_reference = whole->polarization->reference;
    if (whole->electrons) electrons = whole->electrons->law;
}

PointSky::Impl::Impl(const ModelSpec& model, std::optional<HealpixGrid> grid_in, bool with_polarization) {
    reference = polarized_reference = model.reference_frequency;
    if (model.galaxy) {
        grid = grid_in.value_or(HealpixGrid(GalaxyPoints::usual_nside));
        galaxy.emplace(*model.galaxy, reference, grid, with_polarization);
        has_stokes = with_polarization;
        notices.emplace_back(
            "the built-in 3-D Galaxy, invented and tuned to known brightnesses: not a measurement; lines of "
            "sight are integrated to about 1e-3");
        return;
    }
    if (model.sketch) {
        grid = grid_in.value_or(HealpixGrid(SketchPoints::usual_nside));
        sketch.emplace(*model.sketch, grid, with_polarization);
        if (with_polarization) polarization.emplace();
        notices.emplace_back("invented sky from closed formulas: not a measurement of the Galaxy");
        if (model.electrons) open_electrons(model);
        return;
    }
    open_templates(model, grid_in);
    if (is_random(model))
        notices.emplace_back(
            "a model by itself has no seed: [detail] and scatter of the index are off here, and are there in "
            "the rows of a study");
    if (model.electrons) open_electrons(model);
    if (!with_polarization) return;
    if (!model.polarization)
        throw InputError("the model " + model.name + " has no [polarization]: add one, or ask for I alone");
    open_polarization(*model.polarization);
}

void PointSky::Impl::open_templates(const ModelSpec& model, std::optional<HealpixGrid> grid_in) {
    FOREGLOW_EXPECTS(model.intensity.has_value());
    brightness = std::make_shared<const PointMap>(
        PointMap::open_brightness(model.intensity->map, reference, model.intensity->zero_level, notices));
    grid = grid_in.value_or(brightness->grid());
    frame = brightness->frame();
    if (model.index.frequency) index_log_ratio = log_frequency_ratio(*model.index.frequency, reference);
    index = open_value(model.index.value);
    curvature = open_value(model.curvature);
    if (!(brightness->grid() == grid))
        notices.push_back(approximation_notice("intensity", *brightness, grid, frame));
    intensity = PointField::of_map(brightness, nullptr, grid, frame);
}

PointField PointSky::Impl::open_value(const ValueOrMap& value) {
    if (const double* number = std::get_if<double>(&value)) return PointField::uniform(*number);
    auto map = std::make_shared<const PointMap>(PointMap::open_plain(std::get<MapSource>(value), notices));
    return PointField::of_map(std::move(map), brightness, grid, frame);
}

void PointSky::Impl::open_electrons(const ModelSpec& model) {
    const ElectronsSpec& spec = *model.electrons;
    electrons = spec.law;
    definition = model.index.frequency.value_or(reference);
    if (model.index.between) definition = *model.index.between;
    if (spec.field_map) field = open_value(*spec.field_map);
    if (spec.break_energy_map) break_energy = open_value(*spec.break_energy_map);
    if (spec.cutoff_energy_map) cutoff_energy = open_value(*spec.cutoff_energy_map);
}

// The indices become slopes, as load_sky does it for whole maps.
void PointSky::Impl::add_electrons(std::span<const std::int64_t> pixels, SkyStrip& values) const {
    for (const auto& [map, column] : {std::pair(&field, &values.field),
                                      {&break_energy, &values.break_energy},
                                      {&cutoff_energy, &values.cutoff_energy}}) {
        if (!*map) continue;
        column->resize(pixels.size());
        (*map)->evaluate(pixels, *column);
    }
    find_point_slopes(*electrons, definition, reference, values);
}

// T at the polarization's reference frequency over that at the intensity's.
std::vector<double> PointSky::Impl::ratios_at_polarization(const SkyStrip& values) const {
    const BandSum there{{polarized_reference.hz()}, {1.0}};
    if (electrons) return make_electron_factors(*electrons, EmissionPart::Total, values, reference, there);
    return make_curved_factors(values.index, values.curvature, reference, there);
}

void PointSky::Impl::open_polarization(const PolarizationSpec& spec) {
    polarized_reference = spec.reference_frequency.value_or(reference);
    PolarizedPoints& points = polarization.emplace();
    if (spec.map) {
        points.stokes.emplace(PointMap::open_stokes(*spec.map, polarized_reference, notices), grid, frame);
    } else {
        FOREGLOW_EXPECTS(spec.fraction && spec.angle_map);
        points.stokes.emplace(PointMap::open_angles(*spec.angle_map, notices), grid, frame);
        points.fraction = open_value(*spec.fraction);
    }
    if (!points.stokes->is_pixel_for_pixel())
        notices.push_back(approximation_notice("polarization", points.stokes->map(), grid, frame));
    if (spec.index) points.index = open_value(*spec.index);
}

// As make_sky_strip does it for whole strips.
void PointSky::Impl::scale_to_fraction(std::span<const std::int64_t> pixels, SkyStrip& values) const {
    std::vector<double> fraction(pixels.size());
    polarization->fraction->evaluate(pixels, fraction);
    const std::vector<double> there = ratios_at_polarization(values);
    for (std::size_t i = 0; i < fraction.size(); ++i) {
        const double length = std::hypot(values.q[i], values.u[i]);
        const double factor = fraction[i] * values.intensity[i] * there[i] / length;
        values.q[i] *= factor;
        values.u[i] *= factor;
    }
}

void PointSky::Impl::add_polarization(std::span<const std::int64_t> pixels, SkyStrip& values) const {
    const std::size_t n = pixels.size();
    values.q.resize(n);
    values.u.resize(n);
    polarization->stokes->evaluate(pixels, values.q, values.u);
    if (polarization->fraction) scale_to_fraction(pixels, values);
    if (!polarization->index && (electrons || polarized_reference == reference)) return;
    values.polarized_index.resize(n);
    values.polarized_curvature.assign(n, 0.0);
    if (polarization->index) return polarization->index->evaluate(pixels, values.polarized_index);
    const double log_ratio = log_frequency_ratio(polarized_reference, reference);
    for (std::size_t i = 0; i < n; ++i) {
        values.polarized_index[i] = local_index({values.index[i], values.curvature[i]}, log_ratio);
        values.polarized_curvature[i] = values.curvature[i];
    }
}

PointSky::PointSky(const ModelSpec& model, std::optional<HealpixGrid> grid, bool with_polarization)
    : impl_(std::make_unique<Impl>(model, grid, with_polarization)) {}
PointSky::PointSky(const ModelSpec& model, const HealpixGrid& grid, bool with_polarization, int lmax,
                   std::uint64_t seed, int realization) {
    Progress progress;
    SkyModel base = load_sky(model, grid, lmax, with_polarization, progress);
    const DetailedSky sky(model, std::move(base), seed, with_polarization, progress);
    impl_ = std::make_unique<Impl>(model, sky.realize(realization), with_polarization);
    impl_->notices = progress.notices();
    impl_->notices.emplace_back(
        "random structure of the study's seed is in the rows: the whole sky was made");
}
PointSky::~PointSky() = default;
PointSky::PointSky(PointSky&&) noexcept = default;
PointSky& PointSky::operator=(PointSky&&) noexcept = default;

const HealpixGrid& PointSky::grid() const {
    return impl_->grid;
}
Frame PointSky::frame() const {
    return impl_->frame;
}
Frequency PointSky::reference() const {
    return impl_->reference;
}
Frequency PointSky::polarized_reference() const {
    return impl_->polarized_reference;
}
bool PointSky::is_polarized() const {
    return impl_->polarization.has_value() || impl_->has_stokes;
}
const std::vector<std::string>& PointSky::notices() const {
    return impl_->notices;
}

SkyStrip PointSky::evaluate(std::span<const std::int64_t> pixels) const {
    FOREGLOW_EXPECTS(!impl_->galaxy);
    if (impl_->sketch) {
        SkyStrip values = impl_->sketch->evaluate(pixels);
        if (impl_->electrons) impl_->add_electrons(pixels, values);
        return values;
    }
    if (impl_->whole) return make_sky_points(*impl_->whole, pixels, impl_->has_stokes);
    SkyStrip values;
    values.intensity.resize(pixels.size());
    values.index.resize(pixels.size());
    values.curvature.resize(pixels.size());
    impl_->intensity->evaluate(pixels, values.intensity);
    impl_->index->evaluate(pixels, values.index);
    impl_->curvature->evaluate(pixels, values.curvature);
    if (impl_->electrons)
        impl_->add_electrons(pixels, values);
    else if (impl_->index_log_ratio != 0)
        for (std::size_t i = 0; i < pixels.size(); ++i)
            values.index[i] =
                index_at_reference(values.index[i], values.curvature[i], impl_->index_log_ratio);
    if (impl_->polarization) impl_->add_polarization(pixels, values);
    return values;
}

std::vector<PointValues> PointSky::answer(std::span<const std::int64_t> pixels,
                                          std::span<const PointRow> rows) const {
    if (impl_->galaxy) return impl_->galaxy->answer(pixels, rows);
    const SkyStrip strip = evaluate(pixels);
    const auto& electrons = impl_->electrons;
    std::vector<double> reference_index;
    if (electrons) reference_index = make_local_electron_columns(*electrons, strip, impl_->reference).index;
    std::vector<PointValues> out;
    out.reserve(rows.size());
    for (const PointRow& row : rows)
        out.push_back(electrons ? make_electron_values(*electrons, strip, reference_index, impl_->reference,
                                                       impl_->polarized_reference, row.band, row.at)
                                : make_point_values(strip, impl_->reference, impl_->polarized_reference,
                                                    row.band, row.at));
    return out;
}

}  // namespace foreglow
