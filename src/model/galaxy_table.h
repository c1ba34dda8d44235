// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstddef>
#include <span>
#include <vector>

#include "base/quantity.h"
#include "model/galaxy_spec.h"

namespace foreglow {

/// What the electrons of the Galaxy radiate, for every frequency and field at once.
///
/// Phi(a, z) = integral of N(E, z) F(a/E^2) dE with a = nu/(c1 B) [GeV^2]; N of the old disc at the Sun's
/// radius and of the young disc in its plane [m^-3 GeV^-1]; the emissivity of isotropic electrons is then
/// sqrt(3) e^3 B/(16 pi^2 eps0 m c) Phi (Ginzburg & Syrovatskii 1965; Rybicki & Lightman eq. 6.31c). ln Phi
/// lies on a grid even in ln a and in t, z = height_limit t^2 (so that exp(-z/h) is smooth and even in t),
/// with a cubic B-spline through it. Relative error below 1e-7.
class GalaxyTable {
  public:
    explicit GalaxyTable(const GalaxySpec& galaxy);

    /// Returns ln Phi of the old disc.
    /// @param log_a   beyond the ends of the grid (6e-6 and 3e10 GeV^2) Phi continues as a power law
    /// @param height  |z| [kpc], at most height_limit
    [[nodiscard]] double log_old(double log_a, double height) const;
    /// Returns ln Phi of the young disc.
    [[nodiscard]] double log_young(double log_a) const;
    /// Returns d ln Phi/d ln a of the old disc.
    [[nodiscard]] double slope_old(double log_a, double height) const;

    /// Writes the coefficients of ln Phi(log_a, t) of the old disc as a spline in t alone, [height_points].
    void write_old_row(double log_a, std::span<double> out) const;

    static constexpr double height_step = 1.0 / 96;  ///< of t
    static constexpr int margin = 10;  ///< points beyond either end, where the spline's ends are forgotten
    static constexpr int height_points = 96 + 2 * margin + 1;

  private:
    [[nodiscard]] double along_height(std::span<const double> row, double height) const;

    double height_limit_;
    std::vector<double> old_, young_;  ///< spline coefficients, old_ [a][t]
};

/// The same at a few frequencies as a function of the field: rows over ln B and t, the frequencies side by
/// side, so that one place in the Galaxy serves them all.
class GalaxyNodes {
  public:
    /// @param frequencies  [K], at least one
    GalaxyNodes(const GalaxyTable& table, std::span<const Frequency> frequencies);

    static constexpr double field_low = 0.003;  ///< [uG]; weaker fields, whose light is nothing, count as it
    static constexpr double field_high = 3000;
    static constexpr double field_step = 0.08;  ///< of ln B
    static constexpr int margin = GalaxyTable::margin;
    static constexpr std::size_t lanes = 8;  ///< the frequencies of one widest vector
    static constexpr int field_points = 173 + 2 * margin + 2;

    [[nodiscard]] std::size_t padded_count() const { return padded_; }
    [[nodiscard]] std::size_t count() const { return frequencies_.size(); }
    [[nodiscard]] std::span<const Frequency> frequencies() const { return frequencies_; }
    [[nodiscard]] std::span<const double> old_disc() const { return old_; }      ///< [B][t][padded]
    [[nodiscard]] std::span<const double> young_disc() const { return young_; }  ///< [B][padded]

  private:
    std::vector<Frequency> frequencies_;
    std::size_t padded_;  ///< K rounded up to whole vectors; the last frequency fills the rest
    std::vector<double> old_, young_;
};

}  // namespace foreglow
