// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <span>
#include <vector>

#include "sphere/alm.h"
#include "sphere/grid.h"
#include "sphere/harmonics.h"
#include "sphere/ring_weights.h"

namespace foreglow {

/// How far the refinement of a_lm goes.
struct ConvergenceOptions {
    double tolerance = 1e-7;  ///< of the estimated relative error; 0 does exactly max_iterations
    int max_iterations = 20;
    const RingWeights* start_weights = nullptr;  ///< of the first analysis; none: uniform
    /// B_l of the beams that matter, [beams][l]; none: one that is 1 at all l.
    std::span<const std::vector<double>> windows = {};
};

/// How far it went. Relative means: rms over l >= 2 over that of the map, both under a window, the largest of
/// all windows.
struct ConvergenceReport {
    int iterations = 0;
    bool reached = false;            ///< the tolerance
    double relative_correction = 0;  ///< of the last iteration
    double first_correction = 0;     ///< of the first iteration
    double contraction = 0;     ///< last correction over the one before; 0 with fewer than two iterations
    double relative_error = 0;  ///< estimated to remain; see analyse_converged
    std::vector<double> correction_cl;  ///< [lmax + 1], without the window; spin 2: EE + BB
    std::vector<double> map_cl;         ///< [lmax + 1], likewise
};

struct ConvergedAlm {
    Alm alm;
    ConvergenceReport report;
};

struct ConvergedAlmEB {
    AlmEB alm;
    ConvergenceReport report;
};

/// Returns the a_lm up to lmax that fit a map best: a <- a + Y^T (4 pi / npix) (m - Y a), begun with one
/// (weighted) analysis.
///
/// The refinement has uniform weights whatever the start's, so its fixed point is the unweighted
/// least-squares solution, which is where the usual map-to-a_lm routines go with many iterations. With d_k
/// the size of correction k and r = d_k / d_(k-1), what remains is estimated as d_k r / (1 - r); with one
/// correction only, as d_1 (r = 1/2). Transforms go by strips, so that the residual map is never whole in
/// memory.
/// A refinement that does not reach its tolerance is no error here: the report says so.
/// @param map  [npix], each pixel defined
/// @throws ContractError where a pixel is undefined
[[nodiscard]] ConvergedAlm analyse_converged(const HealpixGrid& grid, std::span<const double> map, int lmax,
                                             const ConvergenceOptions& options = {});
[[nodiscard]] ConvergedAlmEB analyse_converged_spin2(const HealpixGrid& grid, std::span<const double> q,
                                                     std::span<const double> u, int lmax,
                                                     const ConvergenceOptions& options = {});

/// The same from a first analysis that is there already.
[[nodiscard]] ConvergedAlm refine_analysis(Alm start, const HealpixGrid& grid, std::span<const double> map,
                                           const ConvergenceOptions& options = {});
[[nodiscard]] ConvergedAlmEB refine_analysis_spin2(AlmEB start, const HealpixGrid& grid,
                                                   std::span<const double> q, std::span<const double> u,
                                                   const ConvergenceOptions& options = {});

}  // namespace foreglow
