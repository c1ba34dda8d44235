// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <vector>

#include "physics/electron_integral.h"

namespace foreglow {

/// What one injected electron radiates now, averaged over its age (continuous injection) and pitch angle
/// (tangled field), at one emitted frequency: the kernel that ElectronIntegral puts N0(E0) dE0 to.
class ElectronKernel {
  public:
    ElectronKernel(const ElectronLaw& law, EmissionPart part);

    /// Returns the largest -x = -nu/nu_c that any age and angle gives: kernel ~ exp of it where it is large.
    [[nodiscard]] double exponent(double energy_GeV, double emitted_hz) const;
    /// Returns exp(shift) times the kernel, shift at most -exponent of the same energy.
    [[nodiscard]] double value(double energy_GeV, double emitted_hz, double shift) const;
    /// Returns how fast the exponent changes with ln E0 where it is largest.
    [[nodiscard]] double steepness(double energy_GeV, double emitted_hz) const;
    /// Returns E_T = 1/(b t), the largest over the angles; infinity without ageing that moves electrons.
    [[nodiscard]] double edge_gev() const { return edge_gev_; }
    /// Returns E of exp(-E0/E): the cut-off's, or the edge's where that is exponential; infinity without.
    [[nodiscard]] double exponential_gev() const { return exponential_gev_; }
    /// Tells whether the mean over ages is taken.
    [[nodiscard]] bool is_continuous() const { return continuous_; }

  private:
    struct Direction {
        double weight = 1;  // of the mean over the angles, sin(a) of the power included
        double sine = 1;
        double loss = 0;  // b t [1/GeV]
    };
    [[nodiscard]] double argument(const Direction& direction, double energy, double hz, double age) const;
    [[nodiscard]] double mean_over_ages(const Direction& direction, double energy, double hz,
                                        double shift) const;

    double (*kernel_)(double) = nullptr;  // e^x K(x)
    std::vector<Direction> directions_;
    double critical_hz_ = 0;  // of 1 GeV at sin(a) = 1
    double edge_gev_ = 0, exponential_gev_ = 0;
    bool continuous_ = false;
};

}  // namespace foreglow
