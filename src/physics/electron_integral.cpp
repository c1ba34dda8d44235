// SPDX-License-Identifier: GPL-2.0-or-later
#include "physics/electron_integral.h"

#include <algorithm>
#include <cmath>
#include <limits>

#include "base/error.h"
#include "math/gauss_legendre.h"
#include "math/least_squares.h"
#include "math/vector_exp.h"
#include "physics/electron_kernel.h"

namespace foreglow {
namespace {

constexpr double infinity = std::numeric_limits<double>::infinity();
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
    ElectronPanels(const ElectronLaw& law, const BandSum& sum, EmissionPart part)
        : law_(law), kernel_(law, part) {
        for (std::size_t i = 0; i < sum.hz.size(); ++i) {
            hz_.push_back(sum.hz[i] * (1 + law.redshift));
            weights_.push_back(sum.weights[i]);
        }
        low_hz_ = *std::min_element(hz_.begin(), hz_.end());
        high_hz_ = *std::max_element(hz_.begin(), hz_.end());
    }

    void fill(ElectronIntegral& out) {
        find_range();
        out.log_scale_ = highest_;
        double from = low_;
        std::size_t next = 0;
        while (from < high_) {
            while (next < inner_ends_.size() && inner_ends_[next] <= from)
                ++next;
            const double end = next < inner_ends_.size() ? std::min(inner_ends_[next], high_) : high_;
            double to = std::min(end, from + panel_width(from));
            if (end - to < 1e-3 * (to - from)) to = end;
            add_panel(out, from, to);
            from = to;
        }
        if (has_tail_) add_tail(out);
    }

  private:
    [[nodiscard]] double exponent(double u, double hz) const {
        const double energy = std::exp(u);
        return kernel_.exponent(energy, hz) - energy / kernel_.exponential_GeV();
    }

    // From where the lowest frequency's exponent comes within reach of the highest to a hard end, the end of
    // an exponential fall, or where the integrand has become a sum of powers.
    void find_range() {
        const bool sharp = law_.cutoff && law_.cutoff->shape == CutoffShape::Sharp;
        const double hard_end = sharp ? std::log(law_.cutoff->energy_GeV) : infinity;
        const double radiates = 0.5 * std::log(high_hz_ / -kernel_one_GeV());  // ln E0 where x = 1, unaged
        constexpr double small = 7;  // ln E0 above that where x = 1e-6, three powers of which leave 1e-18
        constexpr double deep = 12;  // ln E0 above the edge where (E_T/E0)^3 = 1e-16
        double end =
            std::isfinite(kernel_.edge_GeV()) ? std::log(kernel_.edge_GeV()) + deep : radiates + small;
        if (law_.energy_break) end = std::max(end, std::log(law_.energy_break->energy_GeV) + 1e-6);
        if (std::isfinite(kernel_.edge_GeV())) end = std::max(end, radiates + small);
        has_tail_ = !sharp && !std::isfinite(kernel_.exponential_GeV()) && end < radiates + longest_range;
        if (std::isfinite(kernel_.exponential_GeV()))
            end = std::max(radiates + 1, std::log(kernel_.exponential_GeV())) + longest_range;
        high_ = std::min(end, radiates + longest_range + 40);
        if (sharp) high_ = std::isfinite(kernel_.edge_GeV()) ? hard_end : std::min(hard_end, radiates + longest_range);
        const double start = std::min(0.5 * std::log(low_hz_ / high_hz_) + radiates - 12, high_ - 12);
        highest_ = -infinity;
        for (double u = start; u < high_ + scan_step; u += scan_step)
            highest_ = std::max(highest_, exponent(std::min(u, high_), high_hz_));
        double highest_low = -infinity;
        for (double u = start; u < high_ + scan_step; u += scan_step)
            highest_low = std::max(highest_low, exponent(std::min(u, high_), low_hz_));
        low_ = start;
        while (low_ < high_ - scan_step && exponent(low_ + scan_step, low_hz_) < highest_low - negligible)
            low_ += scan_step;
        if (std::isfinite(kernel_.exponential_GeV()))
            while (high_ > low_ + scan_step &&
                   exponent(high_ - scan_step, high_hz_) < highest_ - negligible &&
                   exponent(high_ - scan_step, low_hz_) < highest_low - negligible)
                high_ -= scan_step;
        highest_ = std::max(highest_, highest_low);
        if (highest_ > -1) highest_ = 0;  // nothing to be rescued
        if (law_.energy_break) inner_ends_.push_back(std::log(law_.energy_break->energy_GeV));
    }

    // exponent of 1 GeV unaged per Hz, negative: -1/(c1 B).
    [[nodiscard]] double kernel_one_GeV() const {
        ElectronLaw plain;
        plain.field_uG = law_.field_uG;
        return 1 / ElectronKernel(plain, EmissionPart::Total).exponent(1, 1);
    }

    // Narrow where exponentials are steep, judged at both ends.
    [[nodiscard]] double panel_width(double from) const {
        double width = from > quiet_from() ? 1.4 : 0.7;
        for (int i = 0; i < 4; ++i) {
            const double steep = std::max(kernel_.steepness(std::exp(from), high_hz_),
                                          std::exp(from + width) / kernel_.exponential_GeV());
            width = std::min(width, 5 / std::max(steep, 1e-3));
        }
        return width;
    }

    [[nodiscard]] double quiet_from() const {
        const double radiates = 0.5 * std::log(high_hz_ / -kernel_one_GeV()) + 3.5;
        return std::isfinite(kernel_.edge_GeV()) ? std::max(radiates, std::log(kernel_.edge_GeV()) + 2)
                                                 : radiates;
    }

    [[nodiscard]] double kernel_sum(double energy) const {
        double sum = 0;
        for (std::size_t i = 0; i < hz_.size(); ++i)
            sum +=
                weights_[i] * kernel_.value(energy, hz_[i], -highest_ - energy / kernel_.exponential_GeV());
        return sum;
    }

    void add_panel(ElectronIntegral& out, double from, double to) const {
        const QuadratureRule& rule = panel_rule();
        for (std::size_t i = 0; i < rule.nodes.size(); ++i) {
            const double u = 0.5 * (from + to) + 0.5 * (to - from) * rule.nodes[i];
            const double energy = std::exp(u);
            double weight = 0.5 * (to - from) * rule.weights[i] * energy * kernel_sum(energy);
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
        const bool aged = std::isfinite(kernel_.edge_GeV());
        tail.is_used = true;
        tail.from = high_;
        tail.step = law_.energy_break ? law_.energy_break->step : 0;
        const double bend = polarized_ ? 10.0 / 3 : 2.0;
        tail.powers = !aged                     ? std::array{2.0 / 3, bend, 14.0 / 3}
                      : kernel_.is_continuous() ? std::array{0.0, 1.0, 5.0 / 3}
                                                : std::array{0.0, 1.0, 2.0};
        Matrix a(3, 3);
        std::vector<double> b(3);
        for (std::size_t i = 0; i < 3; ++i) {
            const double ratio = std::exp2(static_cast<double>(i));
            for (std::size_t j = 0; j < 3; ++j)
                a(i, j) = std::pow(ratio, -tail.powers[j]);
            b[i] = kernel_sum(ratio * std::exp(high_));
        }
        const std::vector<double> x = solve_least_squares(std::move(a), std::move(b));
        const double factor =
            law_.energy_break ? std::pow(std::exp(high_) / law_.energy_break->energy_GeV, -tail.step) : 1;
        for (std::size_t j = 0; j < 3; ++j)
            tail.coefficients[j] = x[j] * factor * std::exp(high_);
    }

  public:
    void set_polarized(bool polarized) { polarized_ = polarized; }

  private:
    const ElectronLaw& law_;
    ElectronKernel kernel_;
    std::vector<double> hz_, weights_, inner_ends_;  // emitted
    double low_hz_ = 0, high_hz_ = 0;
    double low_ = 0, high_ = 0, highest_ = 0;  // of ln E0; of the exponents
    bool has_tail_ = false, polarized_ = false;
};

ElectronIntegral::ElectronIntegral(const ElectronLaw& law, const BandSum& sum, EmissionPart part) {
    FOREGLOW_EXPECTS(!sum.hz.empty() && law.field_uG > 0);
    ElectronPanels panels(law, sum, part);
    panels.set_polarized(part == EmissionPart::Polarized);
    panels.fill(*this);
}

ElectronIntegral::ElectronIntegral(const ElectronLaw& law, Frequency frequency, EmissionPart part)
    : ElectronIntegral(law, BandSum{{frequency.hz()}, {1.0}}, part) {}

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
