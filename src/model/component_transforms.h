// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstddef>
#include <optional>
#include <vector>

#include "model/transform_plan.h"
#include "sphere/alm.h"

namespace foreglow {

/// How the component maps of one field were analysed, and what error remains.
struct TransformState {
    int iterations = 0;       ///< refinements of each component that was refined
    std::size_t refined = 0;  ///< components that were refined
    double relative_error = 0;
    double worst_cl_ratio = 0;
    bool converged = true;
};

/// Analyses the component maps of one field (Alm of I, AlmEB of Q and U) one after the other with as few
/// transforms as a tolerance allows.
///
/// Every analysis begins with ring weights. Where what such an analysis leaves (predict_leak, with its
/// allowance) is below the tolerance, that is all. Else the first component is refined until the estimated
/// error under every beam is below the tolerance and the error's C_l is below 1e-4 of the map's wherever
/// B_l^2 > 1e-3; of the others only what is not proportional to it is analysed, without refinement:
/// transforms are linear, so that their error shrinks with the map (the error of the proportional part is
/// that of the first). What remains is predict_leak's figure times what the refined maps measured of it,
/// doubled. Where that is too much, such a difference is refined as well and serves the components after it
/// like the first; where three of them are not enough, every component is refined as often as the first.
template <class Coefficients>
class ComponentTransforms {
  public:
    using Columns = std::vector<std::vector<double>>;  ///< [1][npix] of I or [2][npix] of Q and U

    /// @param refine_all  refines every component
    explicit ComponentTransforms(const TransformPlan& plan, bool refine_all = false)
        : plan_(plan), refine_all_(refine_all) {}

    /// Returns the a_lm of one component; the first one should be in the middle of their spectra, the
    /// outermost ones next. Returns nothing where the work is to be begun again with refine_all.
    [[nodiscard]] std::optional<Coefficients> add(Columns columns);

    [[nodiscard]] const TransformState& state() const { return state_; }

  private:
    enum class Way { Undecided, Weights, Differences, RefineAll };
    struct Leak {
        std::vector<double> cl;  ///< of the error
        double relative = 0, worst_cl_ratio = 0;
    };
    Coefficients add_first(Columns columns);
    Coefficients add_refined(const Columns& columns);
    std::optional<Coefficients> add_weighted(const Columns& columns);
    std::optional<Coefficients> add_difference(Columns columns);
    Coefficients refine_until_reached(Coefficients start, const Columns& columns);
    [[nodiscard]] Leak predicted_leak(const Columns& columns, const Coefficients& alm) const;
    [[nodiscard]] const WindowSet& windows() const;

    const TransformPlan& plan_;
    bool refine_all_;
    Way way_ = Way::Undecided;
    TransformState state_;
    struct Base {
        Columns columns;
        Coefficients alm;
        double square = 0;  ///< sum over pixels
    };
    void keep_as_base(Columns columns, const Coefficients& alm, const Leak& leak);
    std::vector<Base> bases_;  ///< orthogonal to each other
    double first_error_ = 0;
    double first_correction_ = 0;         // of the component refined last, relative
    double measured_over_predicted_ = 0;  // of what first analyses left
    bool is_predicted_ = false;           // the error of weights alone, rather than measured
};

extern template class ComponentTransforms<Alm>;
extern template class ComponentTransforms<AlmEB>;

}  // namespace foreglow
