// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/spectral_basis.h"

#include <gtest/gtest.h>

#include <cmath>

namespace foreglow {
namespace {

std::vector<BandSum> log_channels(double low_ghz, double high_ghz, int count, double width) {
    std::vector<BandSum> channels;
    for (int i = 0; i < count; ++i) {
        const double ghz = low_ghz * std::pow(high_ghz / low_ghz, i / (count - 1.0));
        const Response response = width > 0 ? Response::flat(Frequency::from_ghz(ghz * (1 - width / 2)),
                                                             Frequency::from_ghz(ghz * (1 + width / 2)))
                                            : Response::at(Frequency::from_ghz(ghz));
        channels.push_back(make_band_sum(response, ResponseWeights::Temperature,
                                         {*find_brightness_unit("uK_CMB"), Frequency::from_ghz(ghz), 0, 0}));
    }
    return channels;
}

constexpr ParameterRange wide{-3.4, -2.4, -0.15, 0.05};

double worst_between(const SpectralBasis& basis, const std::vector<BandSum>& channels, Frequency nu0) {
    double worst = 0;
    for (double beta = -3.393; beta < -2.4; beta += 0.0417)
        for (double c = -0.147; c < 0.05; c += 0.0213)
            for (std::size_t n = 0; n < channels.size(); ++n) {
                double sum = 0;
                for (std::size_t k = 0; k < basis.components.size(); ++k)
                    sum += basis.weights(n, k) * exact_band_value(basis.components[k], nu0, beta, c);
                worst = std::max(worst, std::abs(sum / exact_band_value(channels[n], nu0, beta, c) - 1));
            }
    return worst;
}

TEST(SpectralBasis, KeepsItsToleranceBetweenItsSamplesWithFewComponents) {
    const Frequency nu0 = Frequency::from_ghz(0.408);
    struct Case {
        double low, high, width, tolerance;
        std::size_t most;  // components: 8, 9, 10 were measured for 20-350 GHz, 13 to 15 for 41-408 MHz; one
                           // more for bands
    };
    for (const Case& one : {Case{20, 350, 0.2, 1e-4, 9},
                            {20, 350, 0.2, 1e-5, 10},
                            {20, 350, 0.2, 1e-6, 11},
                            {0.041, 0.408, 0, 1e-5, 15}}) {
        const auto channels = log_channels(one.low, one.high, 40, one.width);
        const SpectralBasis basis = make_spectral_basis(channels, CurvedSkyLaw{nu0, wide}, one.tolerance);
        EXPECT_FALSE(basis.is_exact);
        EXPECT_LE(basis.components.size(), one.most);
        EXPECT_LE(basis.worst_error, one.tolerance);
        EXPECT_LE(worst_between(basis, channels, nu0),
                  1.5 * one.tolerance);  // other points than the basis checked itself on
    }
}

TEST(SpectralBasis, UsesTheChannelsThemselvesWhenTheyAreFew) {
    const auto channels = log_channels(20, 350, 3, 0.2);
    const SpectralBasis basis =
        make_spectral_basis(channels, CurvedSkyLaw{Frequency::from_ghz(30), wide}, 1e-5);
    EXPECT_TRUE(basis.is_exact);
    EXPECT_EQ(basis.components.size(), 3U);
    EXPECT_EQ(worst_between(basis, channels, Frequency::from_ghz(30)), 0.0);
}

TEST(SpectralBasis, NeedsOneComponentForAUniformSpectrum) {
    const auto channels = log_channels(20, 350, 12, 0.2);
    const SpectralBasis basis =
        make_spectral_basis(channels, CurvedSkyLaw{Frequency::from_ghz(30), {-3, -3, -0.02, -0.02}}, 1e-9);
    EXPECT_EQ(basis.components.size(), 1U);
}

}  // namespace
}  // namespace foreglow
