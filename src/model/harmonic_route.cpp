// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/harmonic_route.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <map>
#include <numeric>

#include "base/error.h"
#include "base/interrupt.h"
#include "model/basis_error.h"
#include "model/component_maps.h"
#include "model/component_transforms.h"
#include "model/transform_plan.h"
#include "sphere/fill.h"
#include "sphere/harmonics.h"
#include "sphere/regrid.h"
#include "sphere/rotation.h"

namespace foreglow {
namespace {

constexpr double negligible_window = 1e-7;  // a channel's a_lm end where its beam falls below this

std::vector<BandSum> bands_of(const std::vector<Channel>& channels) {
    std::vector<BandSum> bands;
    bands.reserve(channels.size());
    for (const Channel& channel : channels)
        bands.push_back(channel.band);
    return bands;
}

std::vector<const Alm*> pointers_to(const std::vector<Alm>& alms) {
    std::vector<const Alm*> pointers;
    pointers.reserve(alms.size());
    for (const Alm& alm : alms)
        pointers.push_back(&alm);
    return pointers;
}

std::vector<const Alm*> pointers_to(const std::vector<AlmEB>& alms, Alm AlmEB::*part) {
    std::vector<const Alm*> pointers;
    pointers.reserve(alms.size());
    for (const AlmEB& alm : alms)
        pointers.push_back(&(alm.*part));
    return pointers;
}

int last_l(std::span<const double> window) {
    std::size_t l = window.size();
    while (l > 1 && std::abs(window[l - 1]) < negligible_window)
        --l;
    return static_cast<int>(l) - 1;
}

constexpr double strip_bytes = 0.5e9;
constexpr std::size_t plain_group = 16;  // channels whose maps are held at once where none can be combined

// Components by frequency: the middle one, the outermost two, the others.
std::vector<std::size_t> outward_order(const SpectralBasis& basis) {
    std::vector<std::size_t> order(basis.components.size());
    std::iota(order.begin(), order.end(), std::size_t{0});
    std::stable_sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) {
        return basis.components[a].hz.front() < basis.components[b].hz.front();
    });
    std::rotate(order.begin(), order.begin() + static_cast<std::ptrdiff_t>(order.size() / 2), order.end());
    // Now: middle, upwards to the last, the first, upwards. The last and the first come next.
    const auto last = static_cast<std::ptrdiff_t>(order.size() - 1 - order.size() / 2);
    if (last > 0) std::rotate(order.begin() + 1, order.begin() + last, order.end());
    return order;
}

}  // namespace

HarmonicRoute::HarmonicRoute(const SkyModel& sky, std::vector<Channel> channels,
                             const HarmonicOptions& options, Progress& progress)
    : grid_(sky.grid), sky_frame_(sky.frame), channels_(std::move(channels)), options_(options) {
    FOREGLOW_EXPECTS(!channels_.empty());
    windows_.reserve(channels_.size());
    for (const Channel& channel : channels_)
        windows_.push_back(channel_window(channel, options));
    // Basis, transforms and skeletons share the accuracy: 0.3^2 + 0.5^2 + 0.7^2 < 0.92^2. The last costs most
    // to lower.
    progress.begin("choosing component maps");
    make_bases(sky, 0.3 * options.accuracy);
    progress.end();
    transform_components(sky, progress);
    turn_components(progress);
    progress.begin("finding skeleton channels");
    find_skeletons(0.7 * options.accuracy);
    progress.end();
    const BasisErrors basis_errors = measure_basis_errors(sky, channels_, intensity_basis_,
                                                          options.polarized ? &polarized_basis_ : nullptr);
    for (std::size_t c = 0; c < channels_.size(); ++c) {
        const double rank =
            std::max(intensity_rank_.errors[c], options.polarized ? polarized_rank_.errors[c] : 0.0);
        errors_.push_back(std::hypot(basis_errors.relative[c], report_.transform_error, rank));
    }
}

void HarmonicRoute::make_bases(const SkyModel& sky, double tolerance) {
    const auto bands = bands_of(channels_);
    intensity_basis_ = make_intensity_basis(sky, bands, tolerance);
    report_.intensity_components = intensity_basis_.components.size();
    if (!options_.polarized) return;
    polarized_basis_ = polarization_shares_law(sky) && !sky.nodes
                           ? intensity_basis_
                           : make_polarized_basis(sky, bands, tolerance);
    report_.polarized_components = polarized_basis_.components.size();
}

void HarmonicRoute::transform_components(const SkyModel& sky, Progress& progress) {
    const TransformPlan plan(grid_, options_.lmax, 0.5 * options_.accuracy, collect_windows(windows_));
    const auto total = static_cast<std::int64_t>(report_.intensity_components + report_.polarized_components);
    progress.begin("transforming component maps", total);
    std::int64_t done = 0;
    intensity_alms_ = analyse_components<Alm>(plan, intensity_basis_, [&](const BandSum& component) {
        auto map = make_intensity_component(sky, component);
        if (!filled_intensity_) filled_intensity_.emplace(grid_, sky_frame_, map, narrowest_beam());
        if (filled_intensity_->any()) fill_undefined(grid_, map);
        progress.step(++done);
        return ComponentTransforms<Alm>::Columns{std::move(map)};
    });
    if (!options_.polarized) return progress.end();
    polarized_alms_ = analyse_components<AlmEB>(plan, polarized_basis_, [&](const BandSum& component) {
        auto maps = make_polarized_component(sky, component);
        if (!filled_polarization_) filled_polarization_.emplace(grid_, sky_frame_, maps.q, narrowest_beam());
        if (filled_polarization_->any()) {
            fill_undefined(grid_, maps.q);
            fill_undefined(grid_, maps.u);
        }
        progress.step(++done);
        return ComponentTransforms<AlmEB>::Columns{std::move(maps.q), std::move(maps.u)};
    });
    progress.end();
}

template <class Coefficients, class MakeMaps>
std::vector<Coefficients> HarmonicRoute::analyse_components(const TransformPlan& plan,
                                                            const SpectralBasis& basis,
                                                            const MakeMaps& make_maps) {
    std::vector<Coefficients> alms(basis.components.size());
    for (const bool refine_all : {false, true}) {
        ComponentTransforms<Coefficients> transforms(plan, refine_all);
        bool reached = true;
        for (const std::size_t k : outward_order(basis)) {
            check_interrupt();
            auto alm = transforms.add(make_maps(basis.components[k]));
            if (!(reached = alm.has_value())) break;
            alms[k] = std::move(*alm);
        }
        if (!reached) continue;
        report_.add(transforms.state());
        return alms;
    }
    return alms;  // not reached: nothing is begun again where every component is refined
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
    refined += state.refined;
    transform_error = std::max(transform_error, state.relative_error);
    worst_cl_ratio = std::max(worst_cl_ratio, state.worst_cl_ratio);
    converged = converged && state.converged;
}

void HarmonicRoute::find_skeletons(double tolerance) {
    std::vector<std::vector<double>> temperature, polarization;
    for (const BeamWindow& window : windows_) {
        temperature.push_back(window.temperature);
        polarization.push_back(window.polarization);
    }
    intensity_rank_ =
        make_joint_rank(component_spectra(intensity_alms_), intensity_basis_.weights, temperature, tolerance);
    report_.intensity_skeletons = intensity_rank_.skeletons.size();
    report_.rank_error = *std::max_element(intensity_rank_.errors.begin(), intensity_rank_.errors.end());
    if (!intensity_rank_.is_plain) {
        std::vector<Alm> skeletons;
        for (const std::size_t channel : intensity_rank_.skeletons)
            skeletons.push_back(intensity_alm(channel));
        intensity_alms_ = std::move(skeletons);
    }
    if (!options_.polarized) return;
    polarized_rank_ = make_joint_rank(component_spectra(polarized_alms_), polarized_basis_.weights,
                                      polarization, tolerance);
    report_.polarized_skeletons = polarized_rank_.skeletons.size();
    report_.rank_error = std::max(
        report_.rank_error, *std::max_element(polarized_rank_.errors.begin(), polarized_rank_.errors.end()));
    if (polarized_rank_.is_plain) return;
    std::vector<AlmEB> skeletons;
    for (const std::size_t channel : polarized_rank_.skeletons)
        skeletons.push_back(polarized_alm(channel));
    polarized_alms_ = std::move(skeletons);
}

Alm HarmonicRoute::intensity_alm(std::size_t channel) const {
    Alm alm = combine_alms(pointers_to(intensity_alms_), intensity_basis_.weights, channel);
    multiply_by_l(alm, windows_[channel].temperature);
    return alm;
}

AlmEB HarmonicRoute::polarized_alm(std::size_t channel) const {
    AlmEB alm{combine_alms(pointers_to(polarized_alms_, &AlmEB::e), polarized_basis_.weights, channel),
              combine_alms(pointers_to(polarized_alms_, &AlmEB::b), polarized_basis_.weights, channel)};
    multiply_by_l(alm.e, windows_[channel].polarization);
    multiply_by_l(alm.b, windows_[channel].polarization);
    return alm;
}

std::size_t HarmonicRoute::group_size() const {
    const bool plain = intensity_rank_.is_plain || (options_.polarized && polarized_rank_.is_plain);
    return plain ? plain_group : channels_.size();
}

std::int64_t HarmonicRoute::strip_pixels() const {
    const auto held = [&](const JointRank& rank) {
        return rank.is_plain ? std::min(plain_group, channels_.size()) : rank.skeletons.size();
    };
    const std::size_t maps = held(intensity_rank_) + (options_.polarized ? 2 * held(polarized_rank_) : 0);
    return std::max<std::int64_t>(1 << 18,
                                  static_cast<std::int64_t>(strip_bytes / (8.0 * static_cast<double>(maps))));
}

SkeletonStrip HarmonicRoute::make_strip(const RingStrip& strip, std::size_t first, std::size_t count) const {
    const auto n = static_cast<std::size_t>(pixel_count(grid_, strip));
    SkeletonStrip out;
    out.first_channel = first;
    const auto serve = [&](const JointRank& rank) {
        std::vector<std::size_t> channels = rank.skeletons;
        if (rank.is_plain)
            channels.assign(rank.skeletons.begin() + static_cast<std::ptrdiff_t>(first),
                            rank.skeletons.begin() + static_cast<std::ptrdiff_t>(first + count));
        return channels;
    };
    const auto intensity = serve(intensity_rank_);
    for (std::size_t r = 0; r < intensity.size(); ++r) {
        const int last = last_l(windows_[intensity[r]].temperature);
        out.i.emplace_back(n);
        if (intensity_rank_.is_plain)
            synthesize_strip(intensity_alm(intensity[r]), grid_, strip, out.i.back(), last);
        else
            synthesize_strip(intensity_alms_[r], grid_, strip, out.i.back(), last);
    }
    if (options_.polarized) {
        const auto polarized = serve(polarized_rank_);
        for (std::size_t r = 0; r < polarized.size(); ++r) {
            const int last = last_l(windows_[polarized[r]].polarization);
            out.q.emplace_back(n);
            out.u.emplace_back(n);
            if (polarized_rank_.is_plain)
                synthesize_strip_spin2(polarized_alm(polarized[r]), grid_, strip, out.q.back(), out.u.back(),
                                       last);
            else
                synthesize_strip_spin2(polarized_alms_[r], grid_, strip, out.q.back(), out.u.back(), last);
        }
    }
    mark_undefined(strip, first, count, out);
    return out;
}

void HarmonicRoute::make_pixels(const SkeletonStrip& strip, std::size_t channel, std::size_t begin,
                                std::size_t end, std::span<const std::span<double>> out) const {
    FOREGLOW_EXPECTS(out[0].size() == end - begin && out.size() == (options_.polarized ? 3U : 1U));
    combine_skeletons(intensity_rank_, strip.i, channel, strip.first_channel, begin, out[0]);
    const std::size_t place = channel - strip.first_channel;
    if (!strip.undefined_i.empty()) undefine_marked(strip.undefined_i[place], begin, out[0]);
    if (out.size() == 1) return;
    combine_skeletons(polarized_rank_, strip.q, channel, strip.first_channel, begin, out[1]);
    combine_skeletons(polarized_rank_, strip.u, channel, strip.first_channel, begin, out[2]);
    if (strip.undefined_p.empty()) return;
    undefine_marked(strip.undefined_p[place], begin, out[1]);
    undefine_marked(strip.undefined_p[place], begin, out[2]);
}

ChannelMaps HarmonicRoute::make_channel(std::size_t channel) const {
    const RingStrip whole{0, grid_.ring_count(), false};
    const auto n = static_cast<std::size_t>(grid_.npix());
    const SkeletonStrip strip = make_strip(whole, channel, 1);
    ChannelMaps maps;
    maps.i.resize(n);
    if (options_.polarized) {
        maps.q.resize(n);
        maps.u.resize(n);
    }
    const std::array<std::span<double>, 3> columns{maps.i, maps.q, maps.u};
    make_pixels(strip, channel, 0, n, {columns.data(), options_.polarized ? 3U : 1U});
    return maps;
}

Angle HarmonicRoute::narrowest_beam() const {
    Angle narrowest = Angle::from_degrees(180);
    for (const BeamWindow& window : windows_)
        narrowest = std::min(narrowest, equivalent_fwhm(window, grid_));
    return narrowest;
}

void HarmonicRoute::mark_undefined(const RingStrip& strip, std::size_t first, std::size_t count,
                                   SkeletonStrip& out) const {
    const auto mark = [&](const FilledShare& share, std::vector<std::vector<std::uint8_t>>& marks) {
        std::map<double, std::vector<std::uint8_t>> of_width;  // channels often share a beam
        for (std::size_t c = first; c < first + count; ++c) {
            const Angle fwhm = equivalent_fwhm(windows_[c], grid_);
            auto& found = of_width[fwhm.radians()];
            if (found.empty())
                for (const double s : share.on_strip(fwhm, options_.frame, strip))
                    found.push_back(s > largest_filled_share ? 1 : 0);
            marks.push_back(found);
        }
    };
    if (filled_intensity_->any()) mark(*filled_intensity_, out.undefined_i);
    if (filled_polarization_ && filled_polarization_->any()) mark(*filled_polarization_, out.undefined_p);
}

}  // namespace foreglow
