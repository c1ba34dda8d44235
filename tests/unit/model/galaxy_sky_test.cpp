// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/galaxy_sky.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <array>
#include <cmath>

#include "model/component_maps.h"
#include "model/galaxy_maps.h"
#include "model/harmonic_route.h"
#include "model/node_sky.h"
#include "model/pixel_route.h"
#include "support/temporary_folder.h"
#include "support/threads.h"

namespace foreglow {
namespace {

Channel make_channel(double ghz, double width_ghz) {
    Channel channel;
    channel.reference = Frequency::from_ghz(ghz);
    channel.response = width_ghz > 0 ? Response::flat(Frequency::from_ghz(ghz - 0.5 * width_ghz),
                                                      Frequency::from_ghz(ghz + 0.5 * width_ghz))
                                     : Response::at(channel.reference);
    channel.band = make_band_sum(*channel.response, channel.response_weights, channel.calibration);
    return channel;
}

std::vector<Channel> high_channels() {
    return {make_channel(30, 6),  make_channel(44, 8),   make_channel(70, 14),
            make_channel(95, 24), make_channel(150, 38), make_channel(220, 50)};
}

SkyModel make_sky(const std::vector<Channel>& channels, bool polarized, double accuracy = 1e-5,
                  std::optional<std::filesystem::path> cache = std::nullopt, int nside = 4) {
    Progress quiet;
    return make_galaxy_sky(GalaxySpec(), Frequency::from_hz(408e6), HealpixGrid(nside), polarized,
                           {channels, accuracy, std::move(cache)}, quiet);
}

std::vector<BandSum> bands_of(const std::vector<Channel>& channels) {
    std::vector<BandSum> bands;
    for (const Channel& channel : channels)
        bands.push_back(channel.band);
    return bands;
}

// I, Q and U of a channel, pixel by pixel.
std::array<std::vector<double>, 3> pixel_maps(const SkyModel& sky, const std::vector<Channel>& channels,
                                              std::size_t channel) {
    const PixelRoute route(sky, bands_of(channels), true, 1e-6);
    const RingStrip whole{0, sky.grid.ring_count(), false};
    const SkyStrip strip = route.make_strip(sky, whole);
    std::array<std::vector<double>, 3> maps;
    for (auto& map : maps)
        map.resize(static_cast<std::size_t>(sky.grid.npix()));
    const std::array<std::span<double>, 3> out{maps[0], maps[1], maps[2]};
    route.make_pixels(strip, channel, 0, maps[0].size(), out);
    return maps;
}

// From outside: the sums over each band's own nodes, integrated one by one.
void expect_band_sums(const SkyModel& sky, const std::vector<Channel>& channels, double tolerance) {
    const GalaxySpec galaxy;
    const GalaxyMaker maker(galaxy, std::make_shared<const GalaxyTable>(galaxy), sky.grid, true);
    Progress quiet;
    for (std::size_t c = 0; c < channels.size(); ++c) {
        const BandSum band = refine_band(channels[c], {1e-4, most_band_nodes});
        std::vector<Frequency> nodes;
        for (const double hz : band.hz)
            nodes.push_back(Frequency::from_hz(hz));
        const GalaxyMaps exact = maker.make_maps(nodes, true, quiet);
        const auto got = pixel_maps(sky, channels, c);
        for (std::size_t p = 0; p < got[0].size(); ++p) {
            std::array<double, 3> sum{};
            for (std::size_t k = 0; k < nodes.size(); ++k) {
                sum[0] += band.weights[k] * exact.i[k][p];
                sum[1] += band.weights[k] * exact.q[k][p];
                sum[2] += band.weights[k] * exact.u[k][p];
            }
            ASSERT_NEAR(got[0][p] / sum[0], 1, tolerance) << c << " " << p;
            ASSERT_NEAR(got[1][p], sum[1], tolerance * sum[0]) << c << " " << p;
            ASSERT_NEAR(got[2][p], sum[2], tolerance * sum[0]) << c << " " << p;
        }
    }
}

TEST(GalaxySky, HighBandsFollowFromAFewNodes) {
    const auto channels = high_channels();
    const SkyModel sky = make_sky(channels, true);
    ASSERT_NE(sky.nodes, nullptr);
    EXPECT_LE(sky.nodes->nodes.log_hz.size(), 8U);
    EXPECT_FALSE(sky.nodes->q.empty());
    expect_band_sums(sky, channels, 1e-5);  // what was asked for
}

TEST(GalaxySky, StrongRotationIsAveragedBandByBand) {
    const std::vector<Channel> channels{make_channel(0.408, 0.02), make_channel(1.42, 0.14),
                                        make_channel(2.3, 0.2), make_channel(23, 4)};
    const SkyModel sky = make_sky(channels, true);
    EXPECT_TRUE(sky.nodes->q.empty());
    EXPECT_EQ(sky.nodes->band_q.size(), 4U);
    EXPECT_TRUE(make_polarized_basis(sky, bands_of(channels), 1e-5).is_exact);
    expect_band_sums(sky, {channels.begin() + 1, channels.end()}, 1e-5);
}

TEST(GalaxySky, AFinerAccuracyTakesMoreNodesAndIsReached) {
    const auto channels = high_channels();
    const SkyModel coarse = make_sky(channels, false, 1e-3);
    const SkyModel fine = make_sky(channels, false, 1e-8);
    EXPECT_LT(coarse.nodes->nodes.log_hz.size(), fine.nodes->nodes.log_hz.size());
    const PixelRoute route(fine, bands_of(channels), false, 1e-8);
    for (std::size_t c = 0; c < channels.size(); ++c) {
        EXPECT_LE(route.error_of(c), 1e-8);
        EXPECT_GT(route.error_of(c), 0);
    }
}

TEST(GalaxySky, TruthIsTheTangentAtTheReferenceFrequency) {
    const auto channels = high_channels();
    const SkyModel sky = make_sky(channels, true);
    const RingStrip whole{0, sky.grid.ring_count(), false};
    const SkyStrip truth = make_sky_strip(sky, whole, true);
    const double h = 0.02;
    std::vector<Frequency> near;
    for (const double shift : {-h, 0.0, h})
        near.push_back(Frequency::from_hz(408e6 * std::exp(shift)));
    const GalaxySpec galaxy;
    const GalaxyMaker maker(galaxy, std::make_shared<const GalaxyTable>(galaxy), sky.grid, true);
    Progress quiet;
    const GalaxyMaps maps = maker.make_maps(near, true, quiet);
    for (std::size_t p = 0; p < truth.index.size(); ++p) {
        EXPECT_NEAR(truth.intensity[p] / maps.i[1][p], 1,
                    1e-9);  // the same integral beside other frequencies
        EXPECT_NEAR(truth.q[p], maps.q[1][p], 1e-9 * maps.i[1][p]);
        const double low = std::log(maps.i[0][p] / maps.i[1][p]);
        const double high = std::log(maps.i[2][p] / maps.i[1][p]);
        EXPECT_NEAR(truth.index[p], (high - low) / (2 * h), 1e-5);  // h^2/6 of a third derivative near 0.1
        EXPECT_NEAR(truth.curvature[p], 0.5 * (high + low) / (h * h), 1e-4);  // table errors of 1e-8 over h^2
    }
    EXPECT_FALSE(sky.labels.empty());
}

TEST(GalaxySky, BeamsGoThroughTheSameNodes) {
    auto channels = high_channels();
    for (Channel& channel : channels)
        channel.beam = make_gaussian_beam(Angle::from_degrees(40), 8);
    const SkyModel sky = make_sky(channels, true, 1e-4);
    HarmonicOptions options;
    options.polarized = true;
    options.lmax = 8;
    options.accuracy = 1e-4;
    Progress quiet;
    const HarmonicRoute route(sky, channels, options, quiet);
    const ChannelMaps wide = route.make_channel(2);
    const auto sharp = pixel_maps(sky, channels, 2);
    double mean_wide = 0, mean_sharp = 0;
    for (std::size_t p = 0; p < wide.i.size(); ++p) {
        mean_wide += wide.i[p];
        mean_sharp += sharp[0][p];
    }
    EXPECT_NEAR(mean_wide / mean_sharp, 1,
                5e-3);  // a beam keeps the mean; the plane is finer than these pixels
    EXPECT_LT(*std::max_element(wide.i.begin(), wide.i.end()),
              *std::max_element(sharp[0].begin(), sharp[0].end()));
    EXPECT_LT(route.error_of(2), 1e-2);
}

TEST(GalaxySky, TheCacheChangesNothing) {
    const testing::TemporaryFolder folder;
    const std::vector<Channel> channels{make_channel(1.42, 0.1), make_channel(30, 6)};
    const SkyModel without = make_sky(channels, true);
    const SkyModel first = make_sky(channels, true, 1e-5, folder.path());
    EXPECT_EQ(folder.names().size(), 2U);  // I at nodes, Q and U in bands
    const SkyModel second = make_sky(channels, true, 1e-5, folder.path());
    EXPECT_EQ(folder.names().size(), 2U);
    for (const SkyModel* sky : {&first, &second}) {
        EXPECT_EQ(sky->nodes->i, without.nodes->i);
        EXPECT_EQ(sky->nodes->band_q, without.nodes->band_q);
        EXPECT_EQ(sky->nodes->band_u, without.nodes->band_u);
    }
    (void)make_sky(channels, false, 1e-5, folder.path());
    EXPECT_EQ(folder.names().size(), 2U);  // the same intensity serves a study without polarization
    (void)make_sky({make_channel(31, 6)}, false, 1e-5, folder.path());
    EXPECT_EQ(folder.names().size(), 3U);
}

TEST(GalaxySky, IsTheSameForAnyNumberOfThreads) {
    const std::vector<Channel> channels{make_channel(1.42, 0.1), make_channel(30, 6)};
    const auto with = [&](int threads) {
        const testing::Threads set(threads);
        return make_sky(channels, true);
    };
    const SkyModel one = with(1);
    const SkyModel three = with(3);
    EXPECT_EQ(one.nodes->i, three.nodes->i);
    EXPECT_EQ(one.nodes->band_q, three.nodes->band_q);
}

}  // namespace
}  // namespace foreglow
