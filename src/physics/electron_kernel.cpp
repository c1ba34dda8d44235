// SPDX-License-Identifier: GPL-2.0-or-later
#include "physics/electron_kernel.h"

#include <algorithm>
#include <cmath>
#include <limits>

#include "math/gauss_legendre.h"
#include "physics/synchrotron_kernel.h"

namespace foreglow {
namespace {

constexpr double infinity = std::numeric_limits<double>::infinity();
constexpr double negligible = 60;  // exponents below the largest by so much

template <KernelDerivatives (*derivatives)(double)>
double first_of(double x) {
    return derivatives(x).first;
}
template <KernelDerivatives (*derivatives)(double)>
double second_of(double x) {
    return derivatives(x).second;
}

// e^x K(x) of one field direction, or averaged over isotropic ones.
double (*choose_kernel(bool averaged, EmissionPart part))(double) {
    switch (part) {
        case EmissionPart::Polarized:
            return averaged ? scaled_kernel_r_polarized : scaled_kernel_g;
        case EmissionPart::TotalFirst:
            return averaged ? first_of<scaled_kernel_r_derivatives> : first_of<scaled_kernel_f_derivatives>;
        case EmissionPart::TotalSecond:
            return averaged ? second_of<scaled_kernel_r_derivatives> : second_of<scaled_kernel_f_derivatives>;
        case EmissionPart::Total:
            break;
    }
    return averaged ? scaled_kernel_r : scaled_kernel_f;
}

const QuadratureRule& age_rule() {
    static const QuadratureRule rule = make_gauss_legendre(12);
    return rule;
}

}  // namespace

ElectronKernel::ElectronKernel(const ElectronLaw& law, EmissionPart part)
    : critical_hz_(critical_frequency(1, law.field_uG).hz()),
      edge_gev_(infinity),
      exponential_gev_(infinity) {
    const bool tangled = law.geometry == FieldGeometry::Tangled;
    const auto* fixed = std::get_if<FixedPitchAging>(&law.aging);
    const bool angles = tangled && fixed != nullptr;
    kernel_ = choose_kernel(tangled && !angles, part);
    if (law.cutoff && law.cutoff->shape == CutoffShape::Exponential)
        exponential_gev_ = law.cutoff->energy_GeV;
    double age = 0;
    if (fixed != nullptr) age = fixed->age_Myr;
    if (const auto* isotropized = std::get_if<IsotropizedAging>(&law.aging)) {
        if (isotropized->edge == CutoffShape::Sharp)
            age = isotropized->age_Myr;
        else if (isotropized->age_Myr > 0)
            exponential_gev_ = 1 / (1 / exponential_gev_ +
                                    isotropized_loss_rate(law.field_uG, law.redshift) * isotropized->age_Myr);
    }
    if (const auto* injection = std::get_if<ContinuousInjection>(&law.aging)) {
        age = injection->age_Myr;
        continuous_ = age > 0;
    }
    if (!angles) {
        directions_.push_back({1, 1, loss_rate(law) * age});
    } else {
        // 1/2 integral over a of sin^2(a) F: with sin(a) = 1/cosh(v) the trapezoid rule converges
        // geometrically.
        constexpr double step = 0.1;
        for (int k = 0; k <= 110; ++k) {
            const double sine = 1 / std::cosh(k * step);
            directions_.push_back({(k == 0 ? 0.5 : 1.0) * step * sine * sine * sine, sine,
                                   fixed_pitch_loss_rate(law.field_uG, sine, law.redshift) * age});
        }
    }
    double least_loss = infinity;
    for (const Direction& direction : directions_)
        least_loss = std::min(least_loss, direction.loss);
    if (least_loss > 0) edge_gev_ = 1 / least_loss;
}

// nu/nu_c of an electron injected with E0 a part `age` of the age ago, E = E0/(1 + b E0 t).
double ElectronKernel::argument(const Direction& direction, double energy, double hz, double age) const {
    const double now = energy / (1 + direction.loss * age * energy);
    return hz / (critical_hz_ * direction.sine * now * now);
}

double ElectronKernel::exponent(double energy_GeV, double emitted_hz) const {
    double best = -infinity;
    for (const Direction& direction : directions_)
        best = std::max(best, -argument(direction, energy_GeV, emitted_hz, continuous_ ? 0 : 1));
    return best;
}

double ElectronKernel::steepness(double energy_GeV, double emitted_hz) const {
    double best = infinity;
    double slope = 0;
    for (const Direction& direction : directions_) {
        const double x = argument(direction, energy_GeV, emitted_hz, continuous_ ? 0 : 1);
        if (!(x < best)) continue;
        best = x;
        slope = 2 * x / (continuous_ ? 1 : 1 + direction.loss * energy_GeV);
    }
    return slope;
}

// z = 1 + b E0 t' runs from 1 to 1 + b E0 t with x = x0 z^2, all times equally weighted.
double ElectronKernel::mean_over_ages(const Direction& direction, double energy, double hz,
                                      double shift) const {
    const double x0 = argument(direction, energy, hz, 0);
    const double end = direction.loss * energy;
    const QuadratureRule& rule = age_rule();
    double sum = 0;
    double from = 0;  // z - 1, which may be tiny
    while (from < end) {
        const double z = 1 + from;
        const double x = x0 * z * z;
        if (x > x0 + negligible) break;
        const double width = z * std::min(0.5, 2 / x);
        const double to = std::min(end, from + width);
        for (std::size_t i = 0; i < rule.nodes.size(); ++i) {
            const double t = 0.5 * (from + to) + 0.5 * (to - from) * rule.nodes[i];
            const double xi = x0 * (1 + t) * (1 + t);
            sum += 0.5 * (to - from) * rule.weights[i] * kernel_(xi) * std::exp(shift - xi);
        }
        from = to;
    }
    return sum / end;
}

double ElectronKernel::value(double energy_GeV, double emitted_hz, double shift) const {
    double sum = 0;
    for (const Direction& direction : directions_) {
        if (continuous_) {
            sum += direction.weight * mean_over_ages(direction, energy_GeV, emitted_hz, shift);
            continue;
        }
        const double x = argument(direction, energy_GeV, emitted_hz, 1);
        if (x - shift < negligible + 20) sum += direction.weight * kernel_(x) * std::exp(shift - x);
    }
    return sum;
}

}  // namespace foreglow
