// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/patch_maker.h"

#include <algorithm>
#include <cmath>

#include "base/error.h"
#include "base/parallel.h"
#include "model/detail_intensity.h"
#include "sphere/angular_correlation.h"
#include "sphere/bilinear.h"
#include "sphere/point_synthesis.h"
#include "sphere/regrid.h"

namespace foreglow {
namespace {

constexpr double template_tolerance = 1e-6;  // of its a_lm; patches are judged by their spectra
constexpr std::int64_t block = 4096;

template <class Value>
std::vector<double> interpolate_at(const HealpixGrid& grid, std::span<const Value> map,
                                   std::span<const Vector3> directions) {
    const BilinearSampler sampler(grid);
    std::vector<double> out(directions.size());
    parallel_for_blocks(
        static_cast<std::int64_t>(out.size()), block, [&](std::int64_t begin, std::int64_t end) {
            for (auto i = static_cast<std::size_t>(begin); i < static_cast<std::size_t>(end); ++i) {
                const HealpixGrid::Stencil s = sampler.stencil(directions[i]);
                double sum = 0, weight = 0;
                for (std::size_t k = 0; k < 4; ++k) {
                    const auto value = static_cast<double>(map[static_cast<std::size_t>(s.pixels[k])]);
                    if (!is_defined(value)) continue;
                    sum += s.weights[k] * value;
                    weight += s.weights[k];
                }
                out[i] = weight > 0 ? sum / weight : undefined_pixel;
            }
        });
    return out;
}

// Undefined indices lie where the template is undefined too or near it; the law wants some number there.
void fill_with_mean(std::vector<double>& values) {
    double sum = 0;
    std::size_t count = 0;
    for (const double v : values)
        if (is_defined(v)) {
            sum += v;
            ++count;
        }
    const double mean = count > 0 ? sum / static_cast<double>(count) : 0.0;
    for (double& v : values)
        if (!is_defined(v)) v = mean;
}

}  // namespace

TemplateAlms analyse_template(const DetailedSky& sky, bool polarized) {
    const DetailParts parts = sky.parts();
    const HealpixGrid& grid = parts.base->grid;
    TemplateAlms out;
    out.lmax = largest_detail_lmax(grid);
    AnalysedMap intensity = analyse_filled(*parts.intensity_map, out.lmax, template_tolerance);
    out.intensity = std::move(intensity.alm);
    out.filled = std::move(intensity.filled);
    if (!polarized) return out;
    AnalysedStokes stokes = analyse_filled(*parts.stokes_maps, out.lmax, template_tolerance);
    out.polarization = std::move(stokes.alm);
    if (out.filled.empty())
        out.filled = std::move(stokes.filled);
    else if (!stokes.filled.empty())
        for (std::size_t i = 0; i < out.filled.size(); ++i)
            out.filled[i] = std::max(out.filled[i], stokes.filled[i]);
    return out;
}

PatchMaker::PatchMaker(const DetailedSky& sky, std::shared_ptr<const TemplateAlms> alms,
                       const PatchSpec& patch, Frame frame, int margin, bool polarized)
    : sky_(sky),
      alms_(std::move(alms)),
      frame_(PatchFrame(patch.longitude, patch.latitude, patch.pixel, patch.pixels).with_margin(margin)),
      name_(patch.name),
      polarized_(polarized),
      plane_(patch.pixels + 2 * margin, patch.pixel) {
    const Matrix3 to_sky = rotation_between(frame, sky.parts().base->frame);
    directions_ = frame_.directions();
    for (Vector3& n : directions_)
        n = rotate(to_sky, n);
    template_ = synthesize_at(alms_->intensity, directions_);
    if (polarized_) {
        turns_ = frame_.turns(rotation_between(frame, frame));
        sky_turns_ = frame_.turns(to_sky);
        template_stokes_ = synthesize_at(alms_->polarization, directions_);
        turn(template_stokes_, sky_turns_, -1);
    }
    if (sky.has_detail()) prepare_detail();
}

void PatchMaker::turn(StokesValues& stokes, std::span<const double> angles, double sign) const {
    for (std::size_t i = 0; i < angles.size(); ++i) {
        const double c = std::cos(2 * angles[i]), s = sign * std::sin(2 * angles[i]);
        const double q = stokes.q[i], u = stokes.u[i];
        stokes.q[i] = c * q - s * u;
        stokes.u[i] = s * q + c * u;
    }
}

std::vector<double> PatchMaker::interpolate_float(std::span<const float> map) const {
    return interpolate_at(sky_.parts().base->grid, map, directions_);
}

std::vector<double> PatchMaker::interpolate_double(std::span<const double> map) const {
    return interpolate_at(sky_.parts().base->grid, map, directions_);
}

void PatchMaker::prepare_detail() {
    const DetailParts parts = sky_.parts();
    const DetailReport& report = sky_.report();
    seam_ = report.lmax;
    const SkySpectra full = sky_.spectra_up_to(plane_.highest_l());
    plane_spectra_ = make_complement(full, report.intensity_beam, report.polarization_beam);
    for (std::size_t l = 0; l < full.tt.size(); ++l) {
        const bool on_sphere = l <= static_cast<std::size_t>(seam_);
        if (l <= static_cast<std::size_t>(alms_->lmax) && !on_sphere) continue;
        // Beyond what the template's pixels hold it holds nothing.
        plane_spectra_.tt[l] = on_sphere ? 0.0 : full.tt[l];
        if (full.ee.empty()) continue;
        plane_spectra_.ee[l] = on_sphere ? 0.0 : full.ee[l];
        plane_spectra_.bb[l] = on_sphere ? 0.0 : full.bb[l];
        plane_spectra_.correlation[l] = full.correlation[l];
    }
    if (polarized_ && report.overlap > 0) raise_correlation(plane_spectra_, report.overlap);
    const IntensityParts intensity = parts.intensity->parts();
    weights_ = interpolate_float(intensity.weights);
    if (!intensity.steepness.empty()) steepness_ = interpolate_float(intensity.steepness);
    if (polarized_) polarized_weights_ = interpolate_float(parts.polarized_weights);
    if (!intensity.lognormal) return;
    // A small-scale factor multiplies large scales of relative variance v: its own spectrum is the target
    // over 1 + v, and that of its logarithm again over 1 + its variance.
    for (double& cl : plane_spectra_.tt)
        cl *= intensity.scale;
    const double large = variance_of_spectrum(report.added.tt) * intensity.scale;
    const double own = plane_.variance(plane_spectra_.tt) / (1 + large);
    for (double& cl : plane_spectra_.tt)
        cl *= intensity.norm / ((1 + large) * (1 + own));
    plane_half_variance_ = 0.5 * plane_.variance(plane_spectra_.tt);
}

void PatchMaker::add_intensity(int realization, std::vector<double>& intensity) const {
    const DetailParts parts = sky_.parts();
    const IntensityParts form = parts.intensity->parts();
    const std::vector<double> large =
        synthesize_at(draw_intensity(form.drawn_cl, seam_, {parts.seed, realization}), directions_);
    const std::vector<double> small = plane_.intensity(plane_spectra_.tt, {parts.seed, realization, name_});
    for (std::size_t i = 0; i < intensity.size(); ++i) {
        const double g = large[i] + small[i], base = intensity[i];
        if (!form.lognormal || !(base > 0)) {
            intensity[i] = base + weights_[i] * g;
        } else if (steepness_.empty()) {
            intensity[i] = base * std::exp(g - form.half_variance - plane_half_variance_);
        } else {
            const double s = steepness_[i];
            intensity[i] = base * std::exp(s * g - s * s * (0.5 + plane_half_variance_));
        }
    }
}

void PatchMaker::add_polarization(int realization, StokesValues& stokes) const {
    const DetailParts parts = sky_.parts();
    StokesValues large =
        synthesize_at(draw_polarization(sky_.report().added, seam_, {parts.seed, realization}), directions_);
    turn(large, sky_turns_, -1);
    const StokesValues small = plane_.polarization(plane_spectra_, {parts.seed, realization, name_});
    for (std::size_t i = 0; i < stokes.q.size(); ++i) {
        stokes.q[i] += polarized_weights_[i] * (large.q[i] + small.q[i]);
        stokes.u[i] += polarized_weights_[i] * (large.u[i] + small.u[i]);
    }
}

PatchSky PatchMaker::make(int realization, const SkyModel& whole) const {
    PatchSky out;
    out.values.intensity = template_;
    StokesValues stokes = template_stokes_;
    if (sky_.has_detail()) {
        add_intensity(realization, out.values.intensity);
        if (polarized_) add_polarization(realization, stokes);
    }
    out.values.q = std::move(stokes.q);
    out.values.u = std::move(stokes.u);
    const SkyStrip full = make_sky_strip(whole, {0, whole.grid.ring_count(), false}, polarized_);
    const auto take = [&](const std::vector<double>& from, std::vector<double>& to) {
        if (from.empty()) return;
        to = interpolate_double(from);
        fill_with_mean(to);
    };
    take(full.index, out.values.index);
    take(full.curvature, out.values.curvature);
    take(full.slope, out.values.slope);
    take(full.field, out.values.field);
    take(full.break_energy, out.values.break_energy);
    take(full.cutoff_energy, out.values.cutoff_energy);
    take(full.polarized_index, out.values.polarized_index);
    take(full.polarized_curvature, out.values.polarized_curvature);
    if (alms_->filled.empty()) return out;
    const auto filled = interpolate_double(alms_->filled);
    out.undefined.resize(filled.size());
    for (std::size_t i = 0; i < filled.size(); ++i)
        out.undefined[i] = filled[i] > largest_filled_share;
    return out;
}

}  // namespace foreglow
