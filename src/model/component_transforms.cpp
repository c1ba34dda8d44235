// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/component_transforms.h"

#include <algorithm>
#include <cmath>
#include <limits>

#include "base/constants.h"
#include "base/error.h"
#include "base/parallel.h"
#include "sphere/converged_analysis.h"
#include "sphere/harmonics.h"
#include "sphere/power_spectrum.h"
#include "sphere/quadrature_leak.h"

namespace foreglow {
namespace {

constexpr double largest_cl_ratio = 1e-4;    // of the error's C_l to the map's (interface page) ...
constexpr double window_that_counts = 1e-3;  // ... where B_l^2 is above this ...
constexpr double power_that_counts =
    1e-14;  // ... and the map has more than this of its variance: a coarser template has none
            // above its own lmax, where only rounding and its own transform's error are left
constexpr int most_refinements = 16;
constexpr int least_nside_of_prediction = 64;  // smaller ones cost nothing to measure
constexpr std::size_t most_bases = 3;          // maps kept in memory
constexpr double difference_allowance = 2;     // of a measured error carried over to another map
constexpr std::int64_t block = std::int64_t{1} << 16;

// What the last correction left, and what the one before it did, in units of the last correction.
struct Remaining {
    double after_last = 1, before_last = 2;
};
Remaining remaining_after(const ConvergenceReport& report) {
    const double ratio = report.contraction > 0 ? report.contraction : 0.5;
    if (ratio >= 1) return {1.0, std::numeric_limits<double>::infinity()};
    return {ratio / (1 - ratio), 1 / (1 - ratio)};
}

// The largest factor^2 error_cl / map_cl, where it counts.
double worst_ratio(std::span<const double> error_cl, double factor, std::span<const double> map_cl,
                   std::span<const double> window) {
    const auto power = [&](std::size_t l) {
        return (2 * static_cast<double>(l) + 1) * map_cl[l] * window[l] * window[l];
    };
    double total = 0;
    for (std::size_t l = 2; l < map_cl.size(); ++l)
        total += power(l);
    double worst = 0;
    for (std::size_t l = 2; l < map_cl.size(); ++l) {
        if (window[l] * window[l] <= window_that_counts || !(power(l) > power_that_counts * total)) continue;
        worst = std::max(worst, factor * factor * error_cl[l] / map_cl[l]);
    }
    return worst;
}

double dot(std::span<const double> a, std::span<const double> b) {
    return parallel_sum(
        static_cast<std::int64_t>(a.size()), block, [&](std::int64_t begin, std::int64_t end) {
            double sum = 0;
            for (auto i = static_cast<std::size_t>(begin); i < static_cast<std::size_t>(end); ++i)
                sum += a[i] * b[i];
            return sum;
        });
}

void subtract(std::vector<double>& from, double factor, const std::vector<double>& map) {
    parallel_for_blocks(
        static_cast<std::int64_t>(from.size()), block, [&](std::int64_t begin, std::int64_t end) {
            for (auto i = static_cast<std::size_t>(begin); i < static_cast<std::size_t>(end); ++i)
                from[i] -= factor * map[i];
        });
}

double mean_of(const std::vector<double>& map) {
    return parallel_sum(static_cast<std::int64_t>(map.size()), block,
                        [&](std::int64_t begin, std::int64_t end) {
                            double sum = 0;
                            for (auto i = static_cast<std::size_t>(begin); i < static_cast<std::size_t>(end);
                                 ++i)
                                sum += map[i];
                            return sum;
                        }) /
           static_cast<double>(map.size());
}

/// What differs between intensity and polarization.
template <class Coefficients>
struct Field;

template <>
struct Field<Alm> {
    static constexpr int spin = 0;
    static Alm analyse_once(const TransformPlan& plan, const std::vector<std::vector<double>>& columns) {
        return analyse(plan.grid, columns[0], plan.lmax, &plan.weights);
    }
    static ConvergedAlm refine(Alm start, const TransformPlan& plan,
                               const std::vector<std::vector<double>>& columns,
                               const ConvergenceOptions& options) {
        return refine_analysis(std::move(start), plan.grid, columns[0], options);
    }
    static std::vector<double> power(const Alm& alm) { return power_spectrum(alm); }
    static void add(Alm& alm, double factor, const Alm& other) { add_scaled(alm, factor, other); }
};

template <>
struct Field<AlmEB> {
    static constexpr int spin = 2;
    static AlmEB analyse_once(const TransformPlan& plan, const std::vector<std::vector<double>>& columns) {
        return analyse_spin2(plan.grid, columns[0], columns[1], plan.lmax, &plan.weights);
    }
    static ConvergedAlmEB refine(AlmEB start, const TransformPlan& plan,
                                 const std::vector<std::vector<double>>& columns,
                                 const ConvergenceOptions& options) {
        return refine_analysis_spin2(std::move(start), plan.grid, columns[0], columns[1], options);
    }
    static std::vector<double> power(const AlmEB& alm) {
        auto out = power_spectrum(alm.e);
        const auto b = power_spectrum(alm.b);
        for (std::size_t l = 0; l < out.size(); ++l)
            out[l] += b[l];
        return out;
    }
    static void add(AlmEB& alm, double factor, const AlmEB& other) {
        add_scaled(alm.e, factor, other.e);
        add_scaled(alm.b, factor, other.b);
    }
};

}  // namespace

template <class Coefficients>
const WindowSet& ComponentTransforms<Coefficients>::windows() const {
    return plan_.windows[Field<Coefficients>::spin == 0 ? 0 : 1];
}

template <class Coefficients>
auto ComponentTransforms<Coefficients>::predicted_leak(const Columns& columns, const Coefficients& alm) const
    -> Leak {
    const auto cl = Field<Coefficients>::power(alm);
    double above = 0;
    for (const auto& column : columns)
        above += dot(column, column) * 4 * constants::pi / static_cast<double>(column.size());
    for (std::size_t l = 0; l < cl.size(); ++l)
        above -= (2 * static_cast<double>(l) + 1) * cl[l];
    auto leak = predict_leak(cl, std::max(0.0, above), plan_.grid.nside(), Field<Coefficients>::spin);
    const double relative = relative_rms(leak, cl, windows().all);
    const double cl_ratio = worst_ratio(leak, 1, cl, windows().widest);
    return {std::move(leak), relative, cl_ratio};
}

// Refines harder until the spectrum of what remains is small enough as well.
template <class Coefficients>
Coefficients ComponentTransforms<Coefficients>::refine_until_reached(Coefficients start,
                                                                     const Columns& columns) {
    double tolerance = plan_.tolerance;
    ConvergenceReport report;
    const auto refine = [&](Coefficients alm) {
        auto result = Field<Coefficients>::refine(std::move(alm), plan_, columns,
                                                  {tolerance, most_refinements, nullptr, windows().all});
        report = std::move(result.report);
        state_.iterations += report.iterations;
        return std::move(result.alm);
    };
    const auto cl_ratio = [&] {
        return worst_ratio(report.correction_cl, remaining_after(report).after_last, report.map_cl,
                           windows().widest);
    };
    Coefficients alm = refine(std::move(start));
    first_correction_ = report.first_correction;
    for (int round = 0; round < 3 && report.reached && cl_ratio() > largest_cl_ratio; ++round) {
        tolerance *= 0.1;
        alm = refine(std::move(alm));
    }
    state_.relative_error = report.relative_error;
    state_.worst_cl_ratio = cl_ratio();
    state_.converged = report.reached && state_.worst_cl_ratio <= largest_cl_ratio;
    // The last correction says what the one before it had left: where that is good enough already, the others
    // stop there.
    const double before_last = remaining_after(report).before_last;
    const double without_last = before_last * report.relative_correction;
    const double cl_without_last =
        worst_ratio(report.correction_cl, before_last, report.map_cl, windows().widest);
    if (without_last <= tolerance && cl_without_last <= largest_cl_ratio) {
        --state_.iterations;
        state_.relative_error = without_last;
        state_.worst_cl_ratio = cl_without_last;
    }
    return alm;
}

template <class Coefficients>
Coefficients ComponentTransforms<Coefficients>::add_first(Columns columns) {
    Coefficients alm = Field<Coefficients>::analyse_once(plan_, columns);
    Leak leak;
    const bool predicts =
        plan_.grid.nside() >= least_nside_of_prediction && plan_.lmax <= 2 * plan_.grid.nside();
    if (predicts && !refine_all_) {
        leak = predicted_leak(columns, alm);
        state_.relative_error = leak_allowance * leak.relative;
        state_.worst_cl_ratio = leak_allowance * leak_allowance * leak.worst_cl_ratio;
        if (state_.relative_error <= plan_.tolerance && state_.worst_cl_ratio <= largest_cl_ratio) {
            way_ = Way::Weights;
            is_predicted_ = true;
            return alm;
        }
    }
    alm = refine_until_reached(std::move(alm), columns);
    state_.refined = state_.iterations > 0 ? 1 : 0;
    way_ = state_.iterations == 0 ? Way::Weights : Way::RefineAll;
    if (predicts && !refine_all_ && way_ == Way::RefineAll && leak.relative > 0) {
        way_ = Way::Differences;
        first_error_ = state_.relative_error;
        keep_as_base(std::move(columns), alm, leak);
    }
    return alm;
}

template <class Coefficients>
void ComponentTransforms<Coefficients>::keep_as_base(Columns columns, const Coefficients& alm,
                                                     const Leak& leak) {
    measured_over_predicted_ = std::max(measured_over_predicted_, first_correction_ / leak.relative);
    double square = 0;
    for (const auto& column : columns)
        square += dot(column, column);
    bases_.push_back({std::move(columns), alm, square});
}

template <class Coefficients>
std::optional<Coefficients> ComponentTransforms<Coefficients>::add_weighted(const Columns& columns) {
    Coefficients alm = Field<Coefficients>::analyse_once(plan_, columns);
    if (!is_predicted_) return alm;
    const double error = leak_allowance * predicted_leak(columns, alm).relative;
    if (error > plan_.tolerance) return std::nullopt;
    state_.relative_error = std::max(state_.relative_error, error);
    return alm;
}

template <class Coefficients>
Coefficients ComponentTransforms<Coefficients>::add_refined(const Columns& columns) {
    const auto refine = [&](Coefficients start, double tolerance, int refinements) {
        return Field<Coefficients>::refine(std::move(start), plan_, columns,
                                           {tolerance, refinements, nullptr, windows().all});
    };
    auto result = refine(Field<Coefficients>::analyse_once(plan_, columns), 0.0, state_.iterations);
    if (state_.converged && result.report.relative_error > plan_.tolerance)
        result = refine(std::move(result.alm), plan_.tolerance, most_refinements);
    state_.relative_error = std::max(state_.relative_error, result.report.relative_error);
    ++state_.refined;
    return std::move(result.alm);
}

template <class Coefficients>
std::optional<Coefficients> ComponentTransforms<Coefficients>::add_difference(Columns columns) {
    std::vector<double> factors;
    for (const Base& base : bases_) {
        double cross = 0;
        for (std::size_t c = 0; c < columns.size(); ++c)
            cross += dot(columns[c], base.columns[c]);
        factors.push_back(base.square > 0 ? cross / base.square : 0.0);
        for (std::size_t c = 0; c < columns.size(); ++c)
            subtract(columns[c], factors.back(), base.columns[c]);
    }
    Coefficients rest = Field<Coefficients>::analyse_once(plan_, columns);
    const Leak leak = predicted_leak(columns, rest);
    const auto with_bases = [&](Coefficients alm) {
        for (std::size_t b = 0; b < factors.size(); ++b)
            Field<Coefficients>::add(alm, factors[b], bases_[b].alm);
        return alm;
    };
    Coefficients alm = with_bases(rest);
    const double scale = difference_allowance * measured_over_predicted_;
    const double own = scale * relative_rms(leak.cl, Field<Coefficients>::power(alm), windows().all);
    const double error = std::hypot(own, first_error_);
    if (error <= plan_.tolerance) {
        state_.relative_error = std::max(state_.relative_error, error);
        return alm;
    }
    if (bases_.size() == most_bases) return std::nullopt;
    auto refined = Field<Coefficients>::refine(std::move(rest), plan_, columns,
                                               {0.0, state_.iterations, nullptr, windows().all});
    first_correction_ = refined.report.first_correction;
    ++state_.refined;
    alm = with_bases(refined.alm);
    keep_as_base(std::move(columns), refined.alm, leak);
    return alm;
}

template <class Coefficients>
std::optional<Coefficients> ComponentTransforms<Coefficients>::add(Columns columns) {
    FOREGLOW_EXPECTS(columns.size() == (Field<Coefficients>::spin == 0 ? 1U : 2U));
    // A constant is known without a transform, and would leak like all else.
    const double mean = Field<Coefficients>::spin == 0 ? mean_of(columns[0]) : 0.0;
    if (mean != 0)
        for (double& value : columns[0])
            value -= mean;
    std::optional<Coefficients> alm;
    switch (way_) {
        case Way::Undecided:
            alm = add_first(std::move(columns));
            break;
        case Way::Differences:
            alm = add_difference(std::move(columns));
            break;
        case Way::Weights:
            alm = add_weighted(columns);
            break;
        case Way::RefineAll:
            alm = add_refined(columns);
            break;
    }
    if constexpr (Field<Coefficients>::spin == 0)
        if (alm) (*alm)(0, 0) += mean * std::sqrt(4 * constants::pi);
    return alm;
}

template class ComponentTransforms<Alm>;
template class ComponentTransforms<AlmEB>;

}  // namespace foreglow
