// SPDX-License-Identifier: GPL-2.0-or-later
#include "physics/electron_integral.h"

#include <algorithm>
#include <cmath>
#include <optional>

#include "base/error.h"
#include "math/gauss_legendre.h"
#include "math/least_squares.h"
#include "math/vector_exp.h"
#include "physics/electron_kernel.h"
#include "physics/synchrotron_kernel.h"

namespace foreglow {
namespace {

constexpr double negligible =
    60;  // exponents below the largest by so much, powers of E0 at slope 12 included
constexpr double longest_range = 60;  // of ln E0 above where it radiates: E0^(1/3 - s) has fallen below 1e-17
constexpr double scan_step = 0.05;    // of ln E0
constexpr int points = 16;            // of a panel

const QuadratureRule& panel_rule() {
    static const QuadratureRule rule = make_gauss_legendre(points);
    return rule;
}

}  // namespace

/// Lays the panels of one integral and fills them.
class ElectronPanels {
  public:
    ElectronPanels(const ElectronLaw& law, Frequency frequency, EmissionPart part)
        : law_(law), kernel_(law, part), hz_(frequency.hz() * (1 + law.redshift)), part_(part) {
        const double critical = critical_frequency(1, law.field_uG).hz();
        radiates_ = 0.5 * std::log(hz_ / critical);
        if (law.energy_break) break_ = std::log(law.energy_break->energy_GeV);
        if (std::isfinite(kernel_.edge_gev())) edge_ = std::log(kernel_.edge_gev());
        if (std::isfinite(kernel_.exponential_gev())) exponential_ = std::log(kernel_.exponential_gev());
    }

    void fill(ElectronIntegral& out) {
        find_range();
        out.log_scale_ = highest_;
        double from = low_;
        while (from < high_) {
            const double end = break_ && *break_ > from && *break_ < high_ ? *break_ : high_;
            double to = std::min(end, from + panel_width(from));
            if (end - to < 1e-3 * (to - from)) to = end;
            add_panel(out, from, to);
            from = to;
        }
        if (has_tail_) add_tail(out);
    }

  private:
    [[nodiscard]] double exponent(double u) const {
        const double energy = std::exp(u);
        return kernel_.exponent(energy, hz_) - energy / kernel_.exponential_gev();
    }

    // The end is a sharp cut-off, where an exponential one has fallen, or where the integrand has become a
    // sum of powers of E0.
    void find_end() {
        constexpr double small = 7;  // ln E0 above that where x = 1e-6, three powers of which leave 1e-18
        constexpr double deep = 12;  // ln E0 above the edge where (E_T/E0)^3 = 1e-16
        const double farthest = radiates_ + longest_range;
        if (law_.cutoff && law_.cutoff->shape == CutoffShape::Sharp) {
            const double end = std::log(law_.cutoff->energy_GeV);
            high_ = edge_ ? end : std::min(end, farthest);
            return;
        }
        if (exponential_) {
            high_ = std::max(radiates_, *exponential_) + 5;  // exp(-148) at the cut-off
            return;
        }
        high_ = radiates_ + small;
        if (edge_) high_ = std::max(high_, *edge_ + deep);
        if (break_) high_ = std::max(high_, *break_ + 1e-6);
        has_tail_ = high_ < farthest;
        high_ = std::min(high_, farthest);
    }

    void find_range() {
        find_end();
        const double start = std::min(radiates_, high_) - 12;
        highest_ = exponent(high_);
        for (double u = start; u < high_; u += scan_step)
            highest_ = std::max(highest_, exponent(u));
        low_ = start;
        while (low_ < high_ - scan_step && exponent(low_ + scan_step) < highest_ - negligible)
            low_ += scan_step;
        if (exponential_)
            while (high_ > low_ + scan_step && exponent(high_ - scan_step) < highest_ - negligible)
                high_ -= scan_step;
        if (highest_ > -1) highest_ = 0;  // nothing to be rescued
    }

    // Narrow where exponentials are steep, judged at both ends.
    [[nodiscard]] double panel_width(double from) const {
        const double quiet_from = std::max(radiates_ + 3.5, edge_ ? *edge_ + 2 : radiates_);
        double width = from > quiet_from ? 1.4 : 0.7;
        for (int i = 0; i < 4; ++i) {
            const double steep = std::max(kernel_.steepness(std::exp(from), hz_),
                                          std::exp(from + width) / kernel_.exponential_gev());
            width = std::min(width, 5 / std::max(steep, 1e-3));
        }
        return width;
    }

    [[nodiscard]] double scaled_kernel(double energy) const {
        return kernel_.value(energy, hz_, -highest_ - energy / kernel_.exponential_gev());
    }

    void add_panel(ElectronIntegral& out, double from, double to) const {
        const QuadratureRule& rule = panel_rule();
        for (std::size_t i = 0; i < rule.nodes.size(); ++i) {
            const double u = 0.5 * (from + to) + 0.5 * (to - from) * rule.nodes[i];
            const double energy = std::exp(u);
            double weight = 0.5 * (to - from) * rule.weights[i] * energy * scaled_kernel(energy);
            if (law_.energy_break && energy > law_.energy_break->energy_GeV)
                weight *= std::pow(energy / law_.energy_break->energy_GeV, -law_.energy_break->step);
            out.u_.push_back(u);
            out.weights_.push_back(weight);
        }
    }

    // Three powers of 1/E0 through three values: x^(1/3), x (G: x^(5/3)), x^(7/3) where nothing has aged;
    // 1, 1/E0, 1/E0^2 beyond the edge, (1/E0)^(5/3) instead of the last for the mean over ages.
    void add_tail(ElectronIntegral& out) const {
        ElectronIntegral::Tail& tail = out.tail_;
        const bool aged = edge_.has_value();
        tail.is_used = true;
        tail.from = high_;
        tail.step = law_.energy_break ? law_.energy_break->step : 0;
        const double bend = part_ == EmissionPart::Polarized ? 10.0 / 3 : 2.0;
        tail.powers = !aged                     ? std::array{2.0 / 3, bend, 14.0 / 3}
                      : kernel_.is_continuous() ? std::array{0.0, 1.0, 5.0 / 3}
                                                : std::array{0.0, 1.0, 2.0};
        Matrix a(3, 3);
        std::vector<double> b(3);
        for (std::size_t i = 0; i < 3; ++i) {
            const double ratio = std::exp2(static_cast<double>(i));
            for (std::size_t j = 0; j < 3; ++j)
                a(i, j) = std::pow(ratio, -tail.powers[j]);
            b[i] = scaled_kernel(ratio * std::exp(high_));
        }
        const std::vector<double> x = solve_least_squares(std::move(a), std::move(b));
        const double factor =
            law_.energy_break ? std::pow(std::exp(high_) / law_.energy_break->energy_GeV, -tail.step) : 1;
        for (std::size_t j = 0; j < 3; ++j)
            tail.coefficients[j] = x[j] * factor * std::exp(high_);
    }

    const ElectronLaw& law_;
    ElectronKernel kernel_;
    double hz_ = 0;  // emitted
    EmissionPart part_;
    // All of ln E0: where x = 1 without ageing; break, edge and exponential fall; the panels' ends.
    double radiates_ = 0;
    std::optional<double> break_, edge_, exponential_;
    double low_ = 0, high_ = 0;
    double highest_ = 0;  // of the exponents
    bool has_tail_ = false;
};

ElectronIntegral::ElectronIntegral(const ElectronLaw& law, Frequency frequency, EmissionPart part) {
    FOREGLOW_EXPECTS(frequency.hz() > 0 && law.field_uG > 0);
    ElectronPanels(law, frequency, part).fill(*this);
}

double ElectronIntegral::value(double slope) const {
    double sum = 0;
    for (std::size_t i = 0; i < u_.size(); ++i)
        sum += weights_[i] * vector_exp(std::clamp(-slope * u_[i], -690.0, 690.0));
    if (!tail_.is_used) return sum;
    double above = 0;
    for (std::size_t j = 0; j < 3; ++j)
        above += tail_.coefficients[j] / (slope + tail_.step + tail_.powers[j] - 1);
    return sum + above * std::exp(-slope * tail_.from);
}

double ElectronIntegral::log_value(double slope) const {
    return std::log(value(slope)) + log_scale_;
}

}  // namespace foreglow
