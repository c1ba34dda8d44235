// SPDX-License-Identifier: GPL-2.0-or-later
#include "math/fft.h"

#include <gtest/gtest.h>

#include <cmath>

namespace foreglow {
namespace {

// Against the defining sum, for even and odd sizes.
TEST(PlaneFourier, IsTheSumItSaysItIs) {
    for (const auto& [nx, ny] : {std::pair(6, 5), {5, 8}, {1, 3}}) {
        const PlaneFourier plane(nx, ny);
        std::vector<double> image;
        for (int i = 0; i < nx * ny; ++i)
            image.push_back(std::sin(1.7 * i) + 0.1 * i);
        const auto found = plane.forward(image);
        for (int ky = 0; ky < ny; ++ky)
            for (std::size_t kx = 0; kx < plane.row(); ++kx) {
                std::complex<double> sum = 0;
                for (int y = 0; y < ny; ++y)
                    for (int x = 0; x < nx; ++x)
                        sum += image[static_cast<std::size_t>(y * nx + x)] *
                               std::polar(1.0, -2 * M_PI *
                                                   (static_cast<double>(kx) * x / nx +
                                                    static_cast<double>(ky) * y / ny));
                EXPECT_NEAR(std::abs(found[static_cast<std::size_t>(ky) * plane.row() + kx] - sum), 0,
                            1e-13);  // rounding of 40 terms of order 1
            }
        const auto back = plane.inverse(found);
        for (std::size_t i = 0; i < image.size(); ++i)
            EXPECT_NEAR(back[i], image[i], 1e-14);
    }
}

TEST(PlaneFourier, NamesItsWaves) {
    const PlaneFourier plane(8, 5);
    EXPECT_EQ(plane.row(), 5U);
    EXPECT_EQ(plane.wave_x(4), 4);
    EXPECT_EQ(plane.wave_y(2), 2);
    EXPECT_EQ(plane.wave_y(3), -2);
}

TEST(QuickFftSize, HasNoLargePrime) {
    EXPECT_EQ(quick_fft_size(1), 1);
    EXPECT_EQ(quick_fft_size(7), 8);
    EXPECT_EQ(quick_fft_size(1200), 1200);
    EXPECT_EQ(quick_fft_size(1201), 1215);
}

}  // namespace
}  // namespace foreglow
