// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/harmonic_route.h"

#include <algorithm>
#include <cmath>

#include "base/error.h"
#include "base/interrupt.h"
#include "base/parallel.h"
#include "model/basis_error.h"
#include "model/component_maps.h"
#include "model/transform_plan.h"
#include "sphere/fill.h"
#include "sphere/harmonics.h"
#include "sphere/regrid.h"
#include "sphere/rotation.h"

namespace foreglow {
namespace {

constexpr double negligible_window = 1e-7;  // a channel's a_lm end where its beam falls below this
constexpr double law_tolerance = 1e-9;      // of component maps: far below any accuracy that transforms reach

std::vector<BandSum> bands_of(const std::vector<Channel>& channels) {
    std::vector<BandSum> bands;
    for (const Channel& channel : channels)
        bands.push_back(channel.band);
    return bands;
}

template <class Coefficients>
Coefficients combine(const std::vector<Coefficients>& terms, const Matrix& weights, std::size_t channel);

template <>
Alm combine(const std::vector<Alm>& terms, const Matrix& weights, std::size_t channel) {
    Alm sum(terms.front().lmax());
    for (std::size_t k = 0; k < terms.size(); ++k)
        if (weights(channel, k) != 0) add_scaled(sum, weights(channel, k), terms[k]);
    return sum;
}

template <>
AlmEB combine(const std::vector<AlmEB>& terms, const Matrix& weights, std::size_t channel) {
    AlmEB sum{Alm(terms.front().e.lmax()), Alm(terms.front().e.lmax())};
    for (std::size_t k = 0; k < terms.size(); ++k) {
        if (weights(channel, k) == 0) continue;
        add_scaled(sum.e, weights(channel, k), terms[k].e);
        add_scaled(sum.b, weights(channel, k), terms[k].b);
    }
    return sum;
}

int last_l(std::span<const double> window) {
    std::size_t l = window.size();
    while (l > 1 && std::abs(window[l - 1]) < negligible_window)
        --l;
    return static_cast<int>(l) - 1;
}

void undefine_where(std::span<const double> share, std::vector<double>& values) {
    for (std::size_t i = 0; i < values.size(); ++i)
        if (share[i] > largest_filled_share) values[i] = undefined_pixel;
}

}  // namespace

HarmonicRoute::HarmonicRoute(const SkyModel& sky, std::vector<Channel> channels,
                             const HarmonicOptions& options, Progress& progress)
    : grid_(sky.grid), sky_frame_(sky.frame), channels_(std::move(channels)), options_(options) {
    FOREGLOW_EXPECTS(!channels_.empty());
    const double tolerance =
        options.accuracy / 3;  // basis and transforms share the accuracy, with something in hand
    progress.begin("choosing component maps");
    make_bases(sky, tolerance);
    progress.end();
    transform_components(sky, progress);
    turn_components(progress);
    const BasisErrors basis_errors = measure_basis_errors(sky, channels_, intensity_basis_,
                                                          options.polarized ? &polarized_basis_ : nullptr);
    for (std::size_t c = 0; c < channels_.size(); ++c)
        errors_.push_back(std::hypot(basis_errors.relative[c], report_.transform_error));
}

void HarmonicRoute::make_bases(const SkyModel& sky, double tolerance) {
    const auto bands = bands_of(channels_);
    intensity_basis_ = make_spectral_basis(bands, sky.reference, parameter_range(sky), tolerance);
    report_.intensity_components = intensity_basis_.components.size();
    if (!options_.polarized) return;
    polarized_basis_ = polarization_shares_law(sky)
                           ? intensity_basis_
                           : make_spectral_basis(bands, sky.polarization->reference,
                                                 polarized_parameter_range(sky), tolerance);
    report_.polarized_components = polarized_basis_.components.size();
}

void HarmonicRoute::transform_components(const SkyModel& sky, Progress& progress) {
    const auto widest = widest_window(channels_, options_);
    const TransformPlan plan(grid_, options_.lmax, options_.accuracy / 3, widest.temperature,
                             widest.polarization);
    const ParameterRange range = parameter_range(sky);
    const auto total = static_cast<std::int64_t>(report_.intensity_components + report_.polarized_components);
    progress.begin("transforming component maps", total);
    std::int64_t done = 0;
    TransformState state;
    for (const BandSum& component : intensity_basis_.components) {
        check_interrupt();
        auto map = make_intensity_component(sky, BandLaw(component, sky.reference, range, law_tolerance));
        if (intensity_alms_.empty()) filled_intensity_.emplace(grid_, sky_frame_, map, narrowest_beam());
        if (filled_intensity_->any()) fill_undefined(grid_, map);
        intensity_alms_.push_back(plan.analyse(map, state));
        progress.step(++done);
    }
    report_.add(state);
    if (!options_.polarized) {
        progress.end();
        return;
    }
    const ParameterRange polarized_range = polarized_parameter_range(sky);
    TransformState polarized_state;
    for (const BandSum& component : polarized_basis_.components) {
        check_interrupt();
        auto maps = make_polarized_component(
            sky, BandLaw(component, sky.polarization->reference, polarized_range, law_tolerance));
        if (polarized_alms_.empty())
            filled_polarization_.emplace(grid_, sky_frame_, maps.q, narrowest_beam());
        if (filled_polarization_->any()) {
            fill_undefined(grid_, maps.q);
            fill_undefined(grid_, maps.u);
        }
        polarized_alms_.push_back(plan.analyse_spin2(maps.q, maps.u, polarized_state));
        progress.step(++done);
    }
    report_.add(polarized_state);
    progress.end();
}

// Rotation costs far more than the other steps and commutes with round beams: the few components are turned,
// not the channels.
void HarmonicRoute::turn_components(Progress& progress) {
    if (options_.frame == sky_frame_) return;
    progress.begin("turning component maps to " + to_text(options_.frame));
    for (std::size_t k = 0; k < std::max(intensity_alms_.size(), polarized_alms_.size()); ++k) {
        check_interrupt();
        const bool has_both = k < intensity_alms_.size() && k < polarized_alms_.size();
        if (has_both)
            rotate_alm(intensity_alms_[k], polarized_alms_[k], sky_frame_, options_.frame);
        else if (k < intensity_alms_.size())
            rotate_alm(intensity_alms_[k], sky_frame_, options_.frame);
        else
            rotate_alm(polarized_alms_[k], sky_frame_, options_.frame);
    }
    progress.end();
}

void HarmonicReport::add(const TransformState& state) {
    iterations = std::max(iterations, state.iterations);
    transform_error = std::max(transform_error, state.relative_error);
    worst_cl_ratio = std::max(worst_cl_ratio, state.worst_cl_ratio);
    converged = converged && state.converged;
}

ChannelMaps HarmonicRoute::make_channel(std::size_t channel) const {
    const BeamWindow window = channel_window(channels_[channel], options_);
    ChannelMaps maps;
    Alm t = combine(intensity_alms_, intensity_basis_.weights, channel);
    multiply_by_l(t, window.temperature);
    maps.i = synthesize(t, grid_, last_l(window.temperature));
    if (options_.polarized) {
        AlmEB eb = combine(polarized_alms_, polarized_basis_.weights, channel);
        multiply_by_l(eb.e, window.polarization);
        multiply_by_l(eb.b, window.polarization);
        StokesValues values = synthesize_spin2(eb, grid_, last_l(window.polarization));
        maps.q = std::move(values.q);
        maps.u = std::move(values.u);
    }
    undefine(window, maps);
    return maps;
}

Angle HarmonicRoute::narrowest_beam() const {
    Angle narrowest = Angle::from_degrees(180);
    for (const Channel& channel : channels_)
        narrowest = std::min(narrowest, equivalent_fwhm(channel_window(channel, options_), grid_));
    return narrowest;
}

void HarmonicRoute::undefine(const BeamWindow& window, ChannelMaps& maps) const {
    const Angle fwhm = equivalent_fwhm(window, grid_);
    if (filled_intensity_->any()) undefine_where(filled_intensity_->under_beam(fwhm, options_.frame), maps.i);
    if (!filled_polarization_ || !filled_polarization_->any()) return;
    const auto share = filled_polarization_->under_beam(fwhm, options_.frame);
    undefine_where(share, maps.q);
    undefine_where(share, maps.u);
}

}  // namespace foreglow
