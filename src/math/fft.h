// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <complex>
#include <cstddef>
#include <memory>
#include <span>
#include <vector>

namespace foreglow {

/// Fourier transforms of real images of one size (FFTW, Frigo & Johnson 2005; the same bits on every run).
///
/// Images are [ny][nx], x running fastest; F(kx, ky) = sum f(x, y) e^{-2 pi i (kx x/nx + ky y/ny)}, kept for
/// kx = 0..nx/2: [ny][nx/2 + 1].
class PlaneFourier {
  public:
    /// @param nx, ny  1 or more
    PlaneFourier(int nx, int ny);
    ~PlaneFourier();
    PlaneFourier(const PlaneFourier&) = delete;
    PlaneFourier& operator=(const PlaneFourier&) = delete;

    [[nodiscard]] int nx() const { return nx_; }
    [[nodiscard]] int ny() const { return ny_; }
    /// Returns the length of a row of F.
    [[nodiscard]] std::size_t row() const { return static_cast<std::size_t>(nx_ / 2) + 1; }
    /// Returns the signed wave numbers of a column and of a row of F, in waves per image.
    [[nodiscard]] int wave_x(std::size_t column) const { return static_cast<int>(column); }
    [[nodiscard]] int wave_y(std::size_t line) const {
        const int k = static_cast<int>(line);
        return 2 * k > ny_ ? k - ny_ : k;
    }

    [[nodiscard]] std::vector<std::complex<double>> forward(std::span<const double> image) const;
    /// Returns f, with the 1/(nx ny) of the inverse; F is used up.
    [[nodiscard]] std::vector<double> inverse(std::vector<std::complex<double>> transform) const;

  private:
    struct Plans;
    int nx_, ny_;
    std::unique_ptr<Plans> plans_;
};

/// Returns the smallest number not below n without prime factors above 5, for which transforms are quick.
[[nodiscard]] int quick_fft_size(int n);

}  // namespace foreglow
