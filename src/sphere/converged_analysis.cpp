// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/converged_analysis.h"

#include <algorithm>
#include <cmath>
#include <utility>

#include "base/error.h"
#include "base/interrupt.h"
#include "base/parallel.h"
#include "sphere/power_spectrum.h"

namespace foreglow {
namespace {

constexpr std::int64_t strip_pixels = std::int64_t{1}
                                      << 24;  // 128 MiB a map; up to nside 1024 the sky is one strip
constexpr std::int64_t block = std::int64_t{1} << 16;

/// Replaces a strip of the model by what it leaves of the map.
void subtract_from_map(std::span<const double> map, const std::array<PixelRange, 2>& ranges,
                       std::span<double> strip) {
    for (const PixelRange& range : ranges)
        parallel_for_blocks(range.count, block, [&](std::int64_t begin, std::int64_t end) {
            for (std::int64_t i = begin; i < end; ++i) {
                double& value = strip[static_cast<std::size_t>(range.offset + i)];
                value = map[static_cast<std::size_t>(range.first_pixel + i)] - value;
            }
        });
}

/// What one refinement leaves of the error in the long run, measured on rough skies at nside 64 to 256 and
/// rounded up: 0.07 at lmax = 1.5 nside, 0.12 at 2, 0.27 to 0.31 at 2.5; from about 3 nside on it no longer
/// contracts.
double usual_contraction(int nside, int lmax) {
    const double ratio = static_cast<double>(lmax) / nside;
    return ratio <= 2.0 ? 0.15 : ratio <= 2.5 ? 0.35 : 0.5;
}

Alm correction_of(const Alm& alm, const HealpixGrid& grid, std::span<const double> map) {
    Alm out(alm.lmax());
    std::vector<double> strip;
    for (const RingStrip& rings : cut_into_strips(grid, strip_pixels)) {
        check_interrupt();
        strip.resize(static_cast<std::size_t>(pixel_count(grid, rings)));
        synthesize_strip(alm, grid, rings, strip);
        subtract_from_map(map, pixel_ranges(grid, rings), strip);
        add_analysis_of_strip(out, grid, rings, strip);
    }
    return out;
}

AlmEB correction_of(const AlmEB& alm, const HealpixGrid& grid, std::span<const double> q,
                    std::span<const double> u) {
    AlmEB out{Alm(alm.e.lmax()), Alm(alm.e.lmax())};
    std::vector<double> strip_q, strip_u;
    for (const RingStrip& rings : cut_into_strips(grid, strip_pixels)) {
        check_interrupt();
        const auto ranges = pixel_ranges(grid, rings);
        strip_q.resize(static_cast<std::size_t>(pixel_count(grid, rings)));
        strip_u.resize(strip_q.size());
        synthesize_strip_spin2(alm, grid, rings, strip_q, strip_u);
        subtract_from_map(q, ranges, strip_q);
        subtract_from_map(u, ranges, strip_u);
        add_analysis_of_strip_spin2(out, grid, rings, strip_q, strip_u);
    }
    return out;
}

std::vector<double> total_power(const Alm& alm) {
    return power_spectrum(alm);
}

std::vector<double> total_power(const AlmEB& alm) {
    auto out = power_spectrum(alm.e);
    const auto b = power_spectrum(alm.b);
    for (std::size_t l = 0; l < out.size(); ++l)
        out[l] += b[l];
    return out;
}

void add(Alm& alm, const Alm& correction) {
    add_scaled(alm, 1.0, correction);
}

void add(AlmEB& alm, const AlmEB& correction) {
    add(alm.e, correction.e);
    add(alm.b, correction.b);
}

template <typename Coefficients, typename Correct>
ConvergenceReport refine(Coefficients& alm, const Correct& correct, double usual,
                         const ConvergenceOptions& options) {
    FOREGLOW_EXPECTS(options.tolerance >= 0 && options.max_iterations >= 0);
    ConvergenceReport report;
    while (report.iterations < options.max_iterations && !report.reached) {
        const Coefficients correction = correct(alm);
        add(alm, correction);
        ++report.iterations;
        report.correction_cl = total_power(correction);
        const double relative = relative_rms(report.correction_cl, total_power(alm), options.windows);
        const bool has_ratio = report.iterations > 1 && report.relative_correction > 0;
        report.contraction = has_ratio ? relative / report.relative_correction : 0.0;
        report.relative_correction = relative;
        if (report.iterations == 1) report.first_correction = relative;
        // The first ratios are too good: smooth parts converge at once and the slow ones are still hidden
        // behind them.
        const double ratio = std::max(report.contraction, usual);
        report.relative_error = ratio < 1.0 ? relative * ratio / (1.0 - ratio) : relative;
        report.reached = options.tolerance > 0 && report.relative_error <= options.tolerance;
    }
    report.map_cl = total_power(alm);
    return report;
}

}  // namespace

ConvergedAlm refine_analysis(Alm start, const HealpixGrid& grid, std::span<const double> map,
                             const ConvergenceOptions& options) {
    const double usual = usual_contraction(grid.nside(), start.lmax());
    ConvergedAlm out{std::move(start), {}};
    out.report = refine(
        out.alm, [&](const Alm& alm) { return correction_of(alm, grid, map); }, usual, options);
    return out;
}

ConvergedAlmEB refine_analysis_spin2(AlmEB start, const HealpixGrid& grid, std::span<const double> q,
                                     std::span<const double> u, const ConvergenceOptions& options) {
    const double usual = usual_contraction(grid.nside(), start.e.lmax());
    ConvergedAlmEB out{std::move(start), {}};
    out.report = refine(
        out.alm, [&](const AlmEB& alm) { return correction_of(alm, grid, q, u); }, usual, options);
    return out;
}

ConvergedAlm analyse_converged(const HealpixGrid& grid, std::span<const double> map, int lmax,
                               const ConvergenceOptions& options) {
    return refine_analysis(analyse(grid, map, lmax, options.start_weights), grid, map, options);
}

ConvergedAlmEB analyse_converged_spin2(const HealpixGrid& grid, std::span<const double> q,
                                       std::span<const double> u, int lmax,
                                       const ConvergenceOptions& options) {
    return refine_analysis_spin2(analyse_spin2(grid, q, u, lmax, options.start_weights), grid, q, u, options);
}

}  // namespace foreglow
