// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/detailed_sky.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <utility>

#include "base/error.h"
#include "base/parallel.h"
#include "base/text.h"
#include "model/detail_intensity.h"
#include "model/detail_modulation.h"
#include "model/electron_sky.h"
#include "model/sketch_sky.h"
#include "model/sky_region.h"
#include "sphere/harmonics.h"

namespace foreglow {
namespace {

constexpr std::int64_t block = 16384;
constexpr double highest_fraction =
    0.75;                              // of P to I: what power-law electrons in an ordered field give at most
constexpr int sketch_fit_nside = 128;  // the same for every study, so that all draw the same sky

RingStrip whole(const HealpixGrid& grid) {
    return {0, grid.ring_count(), false};
}

std::shared_ptr<const SkyMap> map_of(const PixelField& field, const SkyModel& sky) {
    if (auto map = field.map(); map != nullptr && map->grid == sky.grid) return map;
    auto map = std::make_shared<SkyMap>();
    map->grid = sky.grid;
    map->frame = sky.frame;
    map->values.resize(static_cast<std::size_t>(sky.grid.npix()));
    field.evaluate(sky.grid, whole(sky.grid), map->values);
    return map;
}

// Q and U in K_RJ on the sky's grid, whatever they were made of.
std::shared_ptr<const StokesMaps> stokes_of(const SkyModel& sky) {
    const StokesField& field = sky.polarization->stokes;
    const auto* maps = std::get_if<std::shared_ptr<const StokesMaps>>(&field.source);
    if (maps != nullptr && !sky.polarization->fraction && (*maps)->grid == sky.grid) return *maps;
    SkyStrip values = make_sky_strip(sky, whole(sky.grid), true);
    return std::make_shared<const StokesMaps>(
        StokesMaps{sky.grid, sky.frame, "K_RJ", std::move(values.q), std::move(values.u)});
}

PixelField add_scatter(const PixelField& field, const ScatterSpec& scatter, DrawnField which, int lmax,
                       const SkyModel& sky, const DrawKey& key) {
    auto map = std::make_shared<SkyMap>();
    map->grid = sky.grid;
    map->frame = sky.frame;
    map->values.resize(static_cast<std::size_t>(sky.grid.npix()));
    field.evaluate(sky.grid, whole(sky.grid), map->values);
    const std::vector<double> random = synthesize(draw_scatter(scatter, which, lmax, key), sky.grid);
    parallel_for_blocks(sky.grid.npix(), block, [&](std::int64_t begin, std::int64_t end) {
        for (auto i = static_cast<std::size_t>(begin); i < static_cast<std::size_t>(end); ++i)
            map->values[i] += random[i];
    });
    return PixelField::of_map(std::move(map));
}

}  // namespace

class DetailedSky::Impl {
  public:
    Impl(const ModelSpec& model, SkyModel base, std::uint64_t seed, bool polarized, Progress& progress)
        : spec_(model.detail),
          index_scatter_(model.index.scatter),
          curvature_scatter_(model.curvature_scatter),
          base_(std::move(base)),
          seed_(seed),
          polarized_(polarized) {
        report_.lmax = largest_detail_lmax(base_.grid);
        if (!spec_) return;
        progress.begin("preparing the detail");
        if (spec_->lmax) report_.lmax = std::min(report_.lmax, *spec_->lmax);
        report_.form = spec_->form;
        prepare(model);
        progress.end();
        say_what_was_found(progress);
    }

    [[nodiscard]] bool varies() const { return spec_ || index_scatter_ || curvature_scatter_; }
    [[nodiscard]] bool has_detail() const { return spec_.has_value(); }
    [[nodiscard]] const DetailReport& report() const { return report_; }

    [[nodiscard]] DetailParts parts() const {
        DetailParts out;
        out.base = &base_;
        out.intensity_map = map_of(base_.intensity, base_);
        if (polarized_) out.stokes_maps = stokes_ ? stokes_ : stokes_of(base_);
        if (intensity_) out.intensity = &*intensity_;
        out.polarized_weights = polarized_weights_;
        out.seed = seed_;
        return out;
    }
    [[nodiscard]] SkySpectra spectra_up_to(int lmax) const {
        FOREGLOW_EXPECTS(spec_.has_value());
        return make_sky_spectra(*spec_, sources_, lmax);
    }

    [[nodiscard]] SkyModel realize(int realization, DetailCounts* counts) const {
        const DrawKey key{seed_, realization};
        SkyModel sky = base_;
        if (index_scatter_)
            sky.index =
                add_scatter(base_.index, *index_scatter_, DrawnField::Index, report_.lmax, base_, key);
        if (curvature_scatter_)
            sky.curvature = add_scatter(base_.curvature, *curvature_scatter_, DrawnField::Curvature,
                                        report_.lmax, base_, key);
        if (index_scatter_ && sky.electrons) find_electron_slopes(sky);
        if (!spec_) return sky;
        DetailCounts found;
        sky.intensity = PixelField::of_map(intensity_->realize(key, found.not_positive));
        if (polarized_) add_polarization(sky, key, found);
        sky.beam_fwhm.reset();
        sky.labels.emplace_back("Structure finer than the template's beam is a random draw");
        if (counts != nullptr) *counts = found;
        return sky;
    }

  private:
    void prepare(const ModelSpec& model) {
        FOREGLOW_EXPECTS(base_.beam_fwhm.has_value());
        report_.intensity_beam = *base_.beam_fwhm;
        report_.polarization_beam = report_.intensity_beam;
        if (polarized_ && base_.polarization->beam_fwhm)
            report_.polarization_beam = *base_.polarization->beam_fwhm;
        const auto map = map_of(base_.intensity, base_);
        if (polarized_) {
            stokes_ = stokes_of(base_);
            base_.polarization->stokes = {stokes_, nullptr};
            base_.polarization->fraction.reset();
        }
        base_.intensity = PixelField::of_map(map);
        fit(model, *map);
        make_spectra();
        std::vector<double> region = make_latitude_weights(base_.grid, base_.frame, spec_->latitude_cut);
        exclude_undefined(region, map->values);
        const auto envelope =
            make_envelope(base_.grid, map->values, report_.intensity_beam, spec_->envelope_fwhm);
        Modulation modulation = make_modulation(envelope, region, spec_->modulation, spec_->modulation_floor);
        if (polarized_) {
            make_polarized_weights(envelope, region);
            keep_correlation(modulation.weights, map->values, region);
        }
        intensity_.emplace(*spec_, map, report_, std::move(modulation), region);
        intensity_->describe(report_);
    }

    void fit(const ModelSpec& model, const SkyMap& map) {
        if (spec_->spectrum) return;
        const auto range = [&](Angle beam) { return spec_->fit_lrange.value_or(default_fit_lrange(beam)); };
        report_.intensity_fit = base_.intensity_fit;
        report_.polarization_fit = base_.polarization_fit;
        const bool wants_i = !spec_->intensity && !report_.intensity_fit;
        const bool wants_p = polarized_ && !spec_->polarization && !report_.polarization_fit;
        if (!wants_i && !wants_p) return;
        const SkyMap* i = &map;
        const StokesMaps* p = stokes_.get();
        SkyModel sketch;
        if (model.sketch && base_.grid.nside() != sketch_fit_nside) {
            sketch = make_sketch_sky(*model.sketch, model.reference_frequency, HealpixGrid(sketch_fit_nside),
                                     polarized_);
            i = sketch.intensity.map().get();
            if (polarized_)
                p = std::get<std::shared_ptr<const StokesMaps>>(sketch.polarization->stokes.source).get();
        }
        if (wants_i)
            report_.intensity_fit = fit_intensity(*i, report_.intensity_beam, spec_->latitude_cut,
                                                  range(report_.intensity_beam), spec_->place);
        if (wants_p)
            report_.polarization_fit = fit_polarization(*p, report_.polarization_beam, spec_->latitude_cut,
                                                        range(report_.polarization_beam), spec_->place);
    }

    void make_spectra() {
        sources_.intensity_reference = base_.reference;
        sources_.polarized = polarized_;
        if (polarized_) sources_.polarization_reference = base_.polarization->reference;
        sources_.intensity_fit = report_.intensity_fit;
        sources_.polarization_fit = report_.polarization_fit;
        report_.sky = make_sky_spectra(*spec_, sources_, report_.lmax);
        report_.added = make_complement(report_.sky, report_.intensity_beam, report_.polarization_beam);
    }

    void make_polarized_weights(std::span<const double> intensity_envelope, std::vector<double> region) {
        exclude_undefined(region, stokes_->q);
        exclude_undefined(region, stokes_->u);
        if (spec_->polarization_modulation == ModulationSource::Intensity) {
            polarized_weights_ =
                make_modulation(intensity_envelope, region, spec_->modulation, spec_->modulation_floor)
                    .weights;
            return;
        }
        const auto p = make_polarized_envelope(base_.grid, stokes_->q, stokes_->u, report_.polarization_beam,
                                               spec_->envelope_fwhm);
        polarized_weights_ = make_modulation(p, region, spec_->modulation, spec_->modulation_floor).weights;
    }

    // T and E are modulated differently, which takes <w w_P> of their correlation; it is drawn that much
    // higher.
    void keep_correlation(std::span<const float> weights, std::span<const double> map,
                          std::span<const double> region) {
        const bool by_template = spec_->form == DetailForm::Lognormal && spec_->modulation == 1;
        const auto w = [&](std::size_t i) { return by_template ? map[i] : static_cast<double>(weights[i]); };
        const double square = region_mean(region, [&](std::size_t i) { return w(i) * w(i); });
        const double overlap = region_mean(
            region, [&](std::size_t i) { return w(i) * static_cast<double>(polarized_weights_[i]); });
        report_.overlap = overlap / std::sqrt(square);
        if (report_.overlap > 0) raise_correlation(report_.added, report_.overlap);
    }

    void add_polarization(SkyModel& sky, const DrawKey& key, DetailCounts& counts) const {
        const AlmEB alm = draw_polarization(report_.added, report_.lmax, key);
        StokesValues drawn = synthesize_spin2(alm, base_.grid);
        auto maps = std::make_shared<StokesMaps>();
        maps->grid = base_.grid;
        maps->frame = base_.frame;
        maps->unit = "K_RJ";
        maps->q = std::move(drawn.q);
        maps->u = std::move(drawn.u);
        const auto& from = *stokes_;
        parallel_for_blocks(base_.grid.npix(), block, [&](std::int64_t begin, std::int64_t end) {
            for (auto i = static_cast<std::size_t>(begin); i < static_cast<std::size_t>(end); ++i) {
                const auto w = static_cast<double>(polarized_weights_[i]);
                maps->q[i] = from.q[i] + w * maps->q[i];
                maps->u[i] = from.u[i] + w * maps->u[i];
            }
        });
        check_fraction(sky, *maps, counts);
        sky.polarization->stokes = {std::shared_ptr<const StokesMaps>(std::move(maps)), nullptr};
    }

    // Counts, and scales back where the model says so, pixels more polarized than electrons can make them.
    void check_fraction(const SkyModel& sky, StokesMaps& maps, DetailCounts& counts) const {
        if (sky.polarization->reference == sky.reference) {
            const auto intensity = sky.intensity.map();
            const std::span<const double> values = intensity->values;
            counts.too_polarized +=
                cap_pixels({0, base_.grid.npix(), 0}, maps, [&](std::size_t at) { return values[at]; });
            return;
        }
        for (const RingStrip& strip : cut_into_strips(sky.grid, std::int64_t{1} << 22)) {
            const SkyStrip values = make_sky_strip(sky, strip, false);
            const std::vector<double> there =
                make_brightness_ratios(sky, values, sky.polarization->reference);
            for (const PixelRange& range : pixel_ranges(sky.grid, strip))
                counts.too_polarized +=
                    cap_pixels(range, maps, [&](std::size_t at) { return values.intensity[at] * there[at]; });
        }
    }

    template <class Intensity>
    [[nodiscard]] std::int64_t cap_pixels(const PixelRange& range, StokesMaps& maps,
                                          const Intensity& intensity_at) const {
        return static_cast<std::int64_t>(
            parallel_sum(range.count, block, [&](std::int64_t begin, std::int64_t end) {
                double found = 0;
                for (std::int64_t i = begin; i < end; ++i) {
                    const auto pixel = static_cast<std::size_t>(range.first_pixel + i);
                    if (cap_pixel(intensity_at(static_cast<std::size_t>(range.offset + i)), maps.q[pixel],
                                  maps.u[pixel]))
                        found += 1;
                }
                return found;
            }));
    }

    [[nodiscard]] bool cap_pixel(double intensity, double& q, double& u) const {
        const double square = q * q + u * u, limit = highest_fraction * intensity;
        if (!(intensity > 0 && square > limit * limit)) return false;
        if (spec_->cap_polarization) {
            const double factor = limit / std::sqrt(square);
            q *= factor;
            u *= factor;
        }
        return true;
    }

    void say_what_was_found(Progress& progress) const {
        const auto say = [&](const std::optional<SpectrumFit>& fit, const std::string& what) {
            if (!fit) return;
            progress.notice("spectrum of the " + what +
                            " fitted over l = " + std::to_string(fit->lrange.first) + " to " +
                            std::to_string(fit->lrange.last) + ": C_l ~ l^" + format_number(fit->slope, 3) +
                            " +- " + format_number(fit->slope_error, 2));
        };
        say(report_.intensity_fit, "intensity template");
        say(report_.polarization_fit, "polarization template (EE)");
        if (spec_->lmax && *spec_->lmax > report_.lmax)
            progress.notice("the detail's lmax = " + std::to_string(*spec_->lmax) + " is cut to " +
                            std::to_string(report_.lmax) + " = 2.5 nside: pixels cannot hold more");
        if (report_.added.capped > 0)
            progress.warn(
                "the two templates' beams differ so much that the drawn T and E would need a "
                "correlation of up to " +
                format_number(report_.added.largest_correlation, 3) + " at " +
                std::to_string(report_.added.capped) + " multipoles to give the sky's TE; it is 1 there");
        if (report_.steepest > 1)
            progress.warn(
                "the lognormal detail would have an rms of up to " + format_number(report_.steepest, 3) +
                " in ln I in faint pixels; it is 1 there: raise modulation_floor or lower modulation");
    }

    std::optional<DetailSpec> spec_;
    std::optional<ScatterSpec> index_scatter_, curvature_scatter_;
    SkyModel base_;
    std::uint64_t seed_;
    bool polarized_;
    DetailReport report_;
    SpectrumSources sources_;
    std::shared_ptr<const StokesMaps> stokes_;
    std::optional<DetailIntensity> intensity_;
    std::vector<float> polarized_weights_;
};

DetailedSky::DetailedSky(const ModelSpec& model, SkyModel base, std::uint64_t seed, bool polarized,
                         Progress& progress)
    : impl_(std::make_unique<Impl>(model, std::move(base), seed, polarized, progress)) {}
DetailedSky::~DetailedSky() = default;
DetailedSky::DetailedSky(DetailedSky&&) noexcept = default;
DetailedSky& DetailedSky::operator=(DetailedSky&&) noexcept = default;

bool DetailedSky::varies() const {
    return impl_->varies();
}
bool DetailedSky::has_detail() const {
    return impl_->has_detail();
}
DetailParts DetailedSky::parts() const {
    return impl_->parts();
}
SkySpectra DetailedSky::spectra_up_to(int lmax) const {
    return impl_->spectra_up_to(lmax);
}
SkyModel DetailedSky::realize(int realization, DetailCounts* counts) const {
    return impl_->realize(realization, counts);
}
const DetailReport& DetailedSky::report() const {
    return impl_->report();
}

int largest_detail_lmax(const HealpixGrid& grid) {
    return std::max(2, 5 * grid.nside() / 2);
}

std::int64_t detail_held_values(const ModelSpec& model, const HealpixGrid& grid, bool polarized) {
    const std::int64_t lmax = largest_detail_lmax(grid), alm = (lmax + 1) * (lmax + 2);
    std::int64_t values = 0;
    for (const bool scattered : {model.index.scatter.has_value(), model.curvature_scatter.has_value()})
        if (scattered) values += 2 * grid.npix();
    if (!model.detail) return values;
    // Template, weights (single precision), draw and its coefficients.
    values += 5 * grid.npix() / 2 + alm;
    if (polarized) values += 9 * grid.npix() / 2 + 2 * alm;
    return values;
}

}  // namespace foreglow
