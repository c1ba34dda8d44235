// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/transform_plan.h"

#include <algorithm>
#include <cmath>
#include <limits>

#include "base/error.h"
#include "sphere/converged_analysis.h"

namespace foreglow {
namespace {

constexpr double largest_cl_ratio = 1e-4;    // of the error's C_l to the map's (interface page) ...
constexpr double window_that_counts = 1e-3;  // ... where B_l^2 is above this ...
constexpr double power_that_counts =
    1e-14;  // ... and the map has more than this of its variance: a coarser template has none
            // above its own lmax, where only rounding and its own transform's error are left
constexpr int most_refinements = 16;

BeamWindow unit_window(int lmax) {
    return make_gaussian_beam(Angle(), lmax);
}

// What the last correction left, and what the one before it did, in units of the last correction.
struct Remaining {
    double after_last = 1, before_last = 2;
};
Remaining remaining_after(const ConvergenceReport& report) {
    const double ratio = report.contraction > 0 ? report.contraction : 0.5;
    if (ratio >= 1) return {1.0, std::numeric_limits<double>::infinity()};
    return {ratio / (1 - ratio), 1 / (1 - ratio)};
}

// The largest C_l of `remaining` corrections over that of the map, where it counts.
double worst_cl_ratio(const ConvergenceReport& report, double remaining, std::span<const double> window) {
    const auto power = [&](std::size_t l) {
        return (2 * static_cast<double>(l) + 1) * report.map_cl[l] * window[l] * window[l];
    };
    double total = 0;
    for (std::size_t l = 2; l < report.map_cl.size(); ++l)
        total += power(l);
    double worst = 0;
    for (std::size_t l = 2; l < report.map_cl.size(); ++l) {
        if (window[l] * window[l] <= window_that_counts || !(power(l) > power_that_counts * total)) continue;
        worst = std::max(worst, remaining * remaining * report.correction_cl[l] / report.map_cl[l]);
    }
    return worst;
}

// Runs the refinement of the first component, harder until the spectrum of what remains is small enough as
// well.
template <class Analyse>
auto measure(const Analyse& analyse, double tolerance, std::span<const double> window,
             TransformState& state) {
    auto result = analyse(tolerance, most_refinements);
    const auto cl_ratio = [&] {
        return worst_cl_ratio(result.report, remaining_after(result.report).after_last, window);
    };
    state.worst_cl_ratio = cl_ratio();
    for (int round = 0; round < 3 && result.report.reached && state.worst_cl_ratio > largest_cl_ratio;
         ++round) {
        tolerance *= 0.1;
        result = analyse(tolerance, most_refinements);
        state.worst_cl_ratio = cl_ratio();
    }
    state.measured = true;
    state.converged = result.report.reached && state.worst_cl_ratio <= largest_cl_ratio;
    // The last correction says what the one before it had left: where that is good enough already, the others
    // stop there.
    const ConvergenceReport& report = result.report;
    const double before_last = remaining_after(report).before_last;
    const double without_last = before_last * report.relative_correction;
    const double cl_without_last = report.iterations >= 1 ? worst_cl_ratio(report, before_last, window) : 0.0;
    const bool last_was_needless =
        report.iterations >= 1 && without_last <= tolerance && cl_without_last <= largest_cl_ratio;
    state.iterations = last_was_needless ? report.iterations - 1 : report.iterations;
    state.relative_error = last_was_needless ? without_last : report.relative_error;
    if (last_was_needless) state.worst_cl_ratio = cl_without_last;
    return std::move(result.alm);
}

}  // namespace

BeamWindow channel_window(const Channel& channel, const HarmonicOptions& options) {
    BeamWindow window = channel.beam ? *channel.beam : unit_window(options.lmax);
    if (options.pixel_window) window = product(window, *options.pixel_window);
    return window;
}

BeamWindow widest_window(std::span<const Channel> channels, const HarmonicOptions& options) {
    const auto rows = static_cast<std::size_t>(options.lmax) + 1;
    BeamWindow widest{std::vector<double>(rows, 0.0), std::vector<double>(rows, 0.0)};
    for (const Channel& channel : channels) {
        const BeamWindow window = channel_window(channel, options);
        for (std::size_t l = 0; l < widest.temperature.size(); ++l) {
            widest.temperature[l] = std::max(widest.temperature[l], std::abs(window.temperature[l]));
            widest.polarization[l] = std::max(widest.polarization[l], std::abs(window.polarization[l]));
        }
    }
    return widest;
}

TransformPlan::TransformPlan(const HealpixGrid& grid, int lmax, double tolerance,
                             std::vector<double> temperature_window, std::vector<double> polarization_window)
    : grid_(grid),
      lmax_(lmax),
      tolerance_(tolerance),
      temperature_window_(std::move(temperature_window)),
      polarization_window_(std::move(polarization_window)),
      weights_(make_ring_weights(grid.nside(), std::min(2 * lmax, 3 * grid.nside() - 1))) {}

Alm TransformPlan::analyse(std::span<const double> map, TransformState& state) const {
    const auto run = [&](double tolerance, int refinements) {
        return analyse_converged(grid_, map, lmax_, {tolerance, refinements, &weights_, temperature_window_});
    };
    if (!state.measured) return measure(run, tolerance_, temperature_window_, state);
    return run(0.0, state.iterations).alm;
}

AlmEB TransformPlan::analyse_spin2(std::span<const double> q, std::span<const double> u,
                                   TransformState& state) const {
    const auto run = [&](double tolerance, int refinements) {
        return analyse_converged_spin2(grid_, q, u, lmax_,
                                       {tolerance, refinements, &weights_, polarization_window_});
    };
    if (!state.measured) return measure(run, tolerance_, polarization_window_, state);
    return run(0.0, state.iterations).alm;
}

}  // namespace foreglow
