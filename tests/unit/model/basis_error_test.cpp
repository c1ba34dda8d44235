// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/basis_error.h"

#include <gtest/gtest.h>

#include <cmath>

#include "model/component_maps.h"
#include "support/sky_builder.h"
#include "support/threads.h"

namespace foreglow {
namespace {

using testing::channel_spec;
using testing::make_test_sky;
using testing::study_spec;
using testing::whole_sky;

std::vector<Channel> log_channels(int count) {
    std::vector<ChannelSpec> specs;
    for (int i = 0; i < count; ++i) {
        const double ghz = 20 * std::pow(350.0 / 20, i / (count - 1.0));
        specs.push_back(channel_spec(std::to_string(i), ghz, 0.2 * ghz, 5));
    }
    return make_channels(study_spec(8, specs, true));
}

std::vector<BandSum> bands_of(const std::vector<Channel>& channels) {
    std::vector<BandSum> bands;
    for (const Channel& channel : channels)
        bands.push_back(channel.band);
    return bands;
}

// On a sky of which every pixel is sampled the number must be the rms itself, here summed pixel by pixel.
TEST(BasisErrors, AreTheRmsOverTheSky) {
    SkyModel sky = make_test_sky(8, true);
    sky.polarization->reference = Frequency::from_ghz(22.8);
    const auto channels = log_channels(16);
    const SpectralBasis basis = make_intensity_basis(sky, bands_of(channels), 1e-3);
    const SpectralBasis polarized = make_polarized_basis(sky, bands_of(channels), 1e-3);
    ASSERT_FALSE(basis.is_exact);
    const BasisErrors errors = measure_basis_errors(sky, channels, basis, &polarized);
    const BasisErrors of_intensity = measure_basis_errors(sky, channels, basis, nullptr);
    ASSERT_EQ(errors.relative.size(), 16U);
    const SkyStrip strip = make_sky_strip(sky, whole_sky(sky.grid), true);
    const auto low_rank = [&](const SpectralBasis& b, Frequency reference, std::size_t c, double index,
                              double curvature) {
        double sum = 0;
        for (std::size_t k = 0; k < b.components.size(); ++k)
            sum += b.weights(c, k) * exact_band_value(b.components[k], reference, index, curvature);
        return sum;
    };
    for (std::size_t c = 0; c < 16; ++c) {
        double error_p = 0, size_p = 0, mean = 0, error = 0, error_mean = 0;
        Vector3 dipole{}, error_dipole{};
        std::vector<double> map, off;
        for (std::size_t p = 0; p < strip.q.size(); ++p) {
            const double exact =
                exact_band_value(channels[c].band, sky.reference, strip.index[p], strip.curvature[p]);
            const double found = low_rank(basis, sky.reference, c, strip.index[p], strip.curvature[p]);
            map.push_back(strip.intensity[p] * exact);
            off.push_back(strip.intensity[p] * (found - exact));
            const double pol =
                exact_band_value(channels[c].band, sky.polarization->reference,
                                 strip.index_of_polarization()[p], strip.curvature_of_polarization()[p]);
            const double pol_found =
                low_rank(polarized, sky.polarization->reference, c, strip.index_of_polarization()[p],
                         strip.curvature_of_polarization()[p]);
            const double length2 = strip.q[p] * strip.q[p] + strip.u[p] * strip.u[p];
            error_p += length2 * (pol_found - pol) * (pol_found - pol);
            size_p += length2 * pol * pol;
            const Vector3 n = sky.grid.direction(static_cast<std::int64_t>(p));
            mean += map.back() / 768;
            error_mean += off.back() / 768;
            for (std::size_t k = 0; k < 3; ++k) {
                dipole[k] += 3 * n[k] * map.back() / 768;
                error_dipole[k] += 3 * n[k] * off.back() / 768;
            }
        }
        double size = 0;
        for (std::size_t p = 0; p < map.size();
             ++p) {  // HEALPix pixels have <n_i n_j> = delta_ij/3 to 1e-3 or so at nside 8
            const Vector3 n = sky.grid.direction(static_cast<std::int64_t>(p));
            size += std::pow(map[p] - mean - dipole[0] * n[0] - dipole[1] * n[1] - dipole[2] * n[2], 2);
            error += std::pow(off[p] - error_mean - error_dipole[0] * n[0] - error_dipole[1] * n[1] -
                                  error_dipole[2] * n[2],
                              2);
        }
        EXPECT_NEAR(of_intensity.relative[c] / std::sqrt(error / size), 1, 0.01);
        EXPECT_NEAR(errors.relative[c] / std::max(std::sqrt(error / size), std::sqrt(error_p / size_p)), 1,
                    0.01);
        EXPECT_GT(errors.relative[c], 0);
    }
}

TEST(BasisErrors, AreZeroWhereTheChannelsAreTheBasis) {
    const SkyModel sky = make_test_sky(4, false);
    const auto channels = log_channels(3);
    const SpectralBasis basis = make_intensity_basis(sky, bands_of(channels), 1e-5);
    ASSERT_TRUE(basis.is_exact);
    EXPECT_EQ(measure_basis_errors(sky, channels, basis, nullptr).relative, std::vector<double>(3, 0.0));
}

TEST(BasisErrors, LeaveUndefinedPixelsOutAndNeverDependOnTheThreads) {
    SkyModel sky = make_test_sky(8, true);
    const auto channels = log_channels(12);
    const SpectralBasis basis = make_intensity_basis(sky, bands_of(channels), 1e-3);
    auto map = testing::make_map(sky.grid, testing::test_brightness);
    for (std::size_t p = 100; p < 300; ++p)
        map->values[p] = undefined_pixel;
    sky.intensity = PixelField::of_map(map);
    std::vector<double> before;
    for (const int threads : {1, 2}) {
        const testing::Threads set(threads);
        const auto errors = measure_basis_errors(sky, channels, basis, &basis).relative;
        for (const double error : errors)
            EXPECT_TRUE(std::isfinite(error) && error > 0 && error < 3e-3) << error;
        EXPECT_TRUE(threads == 1 || errors == before);
        before = errors;
    }
}

}  // namespace
}  // namespace foreglow
