// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/harmonic_route.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/error.h"
#include "sphere/converged_analysis.h"
#include "sphere/fill.h"
#include "sphere/power_spectrum.h"
#include "sphere/rotation.h"
#include "support/route_oracle.h"
#include "support/sky_builder.h"
#include "support/threads.h"

namespace foreglow {
namespace {

using testing::channel_spec;
using testing::difference;
using testing::hard;
using testing::make_oracle;
using testing::make_test_sky;
using testing::Oracle;
using testing::relative_rms;
using testing::rms;
using testing::study_spec;
using testing::true_error;
using testing::whole_sky;

std::vector<Channel> channels_of(int count, int nside, double fwhm_deg = 0) {
    std::vector<ChannelSpec> specs;
    for (int i = 0; i < count; ++i) {
        const double ghz = 20 * std::pow(350.0 / 20, i / (count - 1.0));
        specs.push_back(channel_spec(std::to_string(i), ghz, i % 2 == 0 ? 0.2 * ghz : 0,
                                     fwhm_deg > 0 ? fwhm_deg : 4 + 8.0 * (i % 3)));
    }
    return make_channels(study_spec(nside, specs, true));
}

HarmonicOptions options_for(int nside, bool polarized, double accuracy = 1e-5,
                            Frame frame = Frame::Galactic) {
    HarmonicOptions options;
    options.polarized = polarized;
    options.lmax = 2 * nside;
    options.accuracy = accuracy;
    options.frame = frame;
    return options;
}

HarmonicRoute make_route(const SkyModel& sky, const std::vector<Channel>& channels,
                         const HarmonicOptions& options) {
    Progress progress;
    return {sky, channels, options, progress};
}

struct Case {
    int channels, nside;
    bool polarized;
    double accuracy;
    Frame frame;
    bool exact;  ///< the channels themselves are the basis
};

class HarmonicRouteCases : public ::testing::TestWithParam<Case> {};

// error_of must be an honest number: never much below the truth, and not so far above it that it means
// nothing.
TEST_P(HarmonicRouteCases, AgreesWithTheSlowWayAsWellAsItSays) {
    const Case& one = GetParam();
    SkyModel sky = make_test_sky(one.nside, one.polarized);
    if (one.polarized) sky.polarization->reference = Frequency::from_ghz(22.8);
    const auto channels = channels_of(one.channels, one.nside);
    const HarmonicOptions options = options_for(one.nside, one.polarized, one.accuracy, one.frame);
    const HarmonicRoute route = make_route(sky, channels, options);
    EXPECT_EQ(route.report().intensity_components < static_cast<std::size_t>(one.channels), !one.exact);
    EXPECT_TRUE(route.report().converged);
    for (std::size_t c = 0; c < channels.size(); c += one.exact ? 1 : 5) {
        SCOPED_TRACE(c);
        const ChannelMaps found = route.make_channel(c);
        EXPECT_EQ(found.q.empty(), !one.polarized);
        const double error = true_error(found, make_oracle(sky, channels[c], options), sky.grid);
        EXPECT_LE(route.error_of(c), one.accuracy);
        EXPECT_LE(error, 1.5 * route.error_of(c) + 1e-12);  // 1e-12: rounding of the transforms
        EXPECT_GE(error, route.error_of(c) / 100);
    }
}

INSTANTIATE_TEST_SUITE_P(HarmonicRoute, HarmonicRouteCases,
                         ::testing::Values(Case{3, 32, false, 1e-5, Frame::Galactic, true},
                                           Case{3, 16, true, 1e-4, Frame::Galactic, true},
                                           Case{3, 16, true, 1e-5, Frame::Icrs, true},
                                           Case{24, 32, false, 1e-3, Frame::Galactic, false},
                                           Case{24, 16, true, 1e-4, Frame::Galactic, false},
                                           Case{24, 16, true, 1e-5, Frame::Galactic, false},
                                           Case{24, 16, false, 1e-6, Frame::Ecliptic, false},
                                           Case{24, 16, false, 1e-7, Frame::Galactic, false}));

// Forty channels whose beams shrink as the wavelength does.
std::vector<Channel> diffraction_channels(int nside) {
    std::vector<ChannelSpec> specs;
    for (int i = 0; i < 40; ++i) {
        const double mhz = 100 * std::pow(2.0, i / 39.0);
        specs.push_back(channel_spec(std::to_string(i), 1e-3 * mhz, 1e-3, 12 * 100 / mhz));
    }
    return make_channels(study_spec(nside, specs, true));
}

TEST(HarmonicRoute, FewSkeletonsServeManyBeamsAsWellAsTheySay) {
    const SkyModel sky = make_test_sky(16, true);
    const auto channels = diffraction_channels(16);
    for (const double accuracy : {1e-3, 1e-5, 1e-7}) {
        SCOPED_TRACE(accuracy);
        const HarmonicOptions options = options_for(16, true, accuracy);
        const HarmonicRoute route = make_route(sky, channels, options);
        EXPECT_LT(route.report().intensity_skeletons, 30U);
        EXPECT_LT(route.report().polarized_skeletons, 30U);
        for (const std::size_t c : {0U, 7U, 20U, 33U, 39U}) {
            SCOPED_TRACE(c);
            const double error =
                true_error(route.make_channel(c), make_oracle(sky, channels[c], options), sky.grid);
            EXPECT_LE(route.error_of(c), accuracy);
            EXPECT_LE(error, 1.5 * route.error_of(c) + 1e-12);  // rounding of the transforms
            EXPECT_GE(error, route.error_of(c) / 100);
        }
    }
}

TEST(HarmonicRoute, StripsAndGroupsOfAnySizeGiveTheWholeMaps) {
    SkyModel sky = make_test_sky(16, true);
    auto map = testing::make_map(sky.grid, testing::test_brightness);
    for (std::size_t p = 1000; p < 1200; ++p)
        map->values[p] = undefined_pixel;
    sky.intensity = PixelField::of_map(map);
    const auto channels = diffraction_channels(16);
    const HarmonicRoute route = make_route(sky, channels, options_for(16, true, 1e-5, Frame::Icrs));
    const ChannelMaps whole = route.make_channel(21);
    for (const std::int64_t pixels : {100, 1000})
        for (const auto& [first, count] : {std::pair<std::size_t, std::size_t>{0, 40}, {21, 1}, {20, 5}}) {
            std::array<std::vector<double>, 3> maps;
            for (auto& one : maps)
                one.assign(3072, -1e300);
            for (const RingStrip& strip : cut_into_strips(sky.grid, pixels)) {
                const SkeletonStrip skeletons = route.make_strip(strip, first, count);
                for (const PixelRange& range : pixel_ranges(sky.grid, strip)) {
                    std::array<std::span<double>, 3> out;
                    for (std::size_t s = 0; s < 3; ++s)
                        out[s] = std::span(maps[s]).subspan(static_cast<std::size_t>(range.first_pixel),
                                                            static_cast<std::size_t>(range.count));
                    route.make_pixels(skeletons, 21, static_cast<std::size_t>(range.offset),
                                      static_cast<std::size_t>(range.offset + range.count), out);
                }
            }
            EXPECT_GT(testing::undefined_count(whole.i), 200);
            EXPECT_EQ(testing::undefined_count(maps[0]), testing::undefined_count(whole.i));
            EXPECT_EQ(testing::undefined_count(maps[1]), 0);
            EXPECT_LT(relative_rms(maps[0], whole.i), 1e-12);  // rounding, and weights of either sign
            EXPECT_LT(relative_rms(maps[1], whole.q), 1e-12);
            EXPECT_LT(relative_rms(maps[2], whole.u), 1e-12);
        }
    EXPECT_GE(route.group_size(), 1U);
    EXPECT_GE(route.strip_pixels(), 1);
}

TEST(HarmonicRoute, UndefinedPixelsStayUndefinedAndTheRestIsRight) {
    SkyModel sky = make_test_sky(32, true);
    auto map = testing::make_map(sky.grid, testing::test_brightness);
    auto stokes = *std::get<std::shared_ptr<const StokesMaps>>(sky.polarization->stokes.source);
    std::int64_t holes = 0;
    for (std::int64_t p = 0; p < sky.grid.npix(); ++p) {
        const Vector3 n = sky.grid.direction(p);
        if (n[2] < -0.9) map->values[static_cast<std::size_t>(p)] = undefined_pixel;
        if (n[0] > 0.95)
            stokes.q[static_cast<std::size_t>(p)] = stokes.u[static_cast<std::size_t>(p)] = undefined_pixel;
        holes += n[2] < -0.9 ? 1 : 0;
    }
    sky.intensity = PixelField::of_map(map);
    sky.polarization->stokes.source = std::make_shared<const StokesMaps>(stokes);
    for (const int count : {3, 24}) {
        const auto channels = channels_of(count, 32, 6);
        const HarmonicOptions options = options_for(32, true, 1e-4);
        const HarmonicRoute route = make_route(sky, channels, options);
        const ChannelMaps found = route.make_channel(1);
        const Oracle oracle = make_oracle(sky, channels[1], options);
        for (std::int64_t p = 0; p < sky.grid.npix(); ++p) {
            const Vector3 n = sky.grid.direction(p);
            const auto i = static_cast<std::size_t>(p);
            if (n[2] < -0.9) {
                EXPECT_FALSE(is_defined(found.i[i]));
            }
            if (n[0] > 0.95) {
                EXPECT_FALSE(is_defined(found.q[i]) || is_defined(found.u[i]));
            }
            // 3 sigma of the beam (0.045 rad each) and a pixel further out at most 0.2 % of the weight is
            // filled.
            if (std::acos(-n[2]) > std::acos(0.9) + 0.17) {
                EXPECT_TRUE(is_defined(found.i[i]));
            }
            if (std::acos(n[0]) > std::acos(0.95) + 0.17) {
                EXPECT_TRUE(is_defined(found.q[i]) && is_defined(found.u[i]));
            }
        }
        EXPECT_GT(testing::undefined_count(found.i), holes + 32);
        // The fill is not linear in the maps: components and channels are filled alike only nearly; a beam
        // away nothing of it is left.
        EXPECT_LE(relative_rms(found.i, oracle.maps.i), 1e-4);
        EXPECT_LE(relative_rms(found.q, oracle.maps.q), 1e-4);
        EXPECT_LE(relative_rms(found.u, oracle.maps.u), 1e-4);
    }
}

TEST(HarmonicRoute, NeverDependsOnTheThreads) {
    const SkyModel sky = make_test_sky(16, true);
    const auto channels = channels_of(14, 16);
    ChannelMaps before;
    double error = 0;
    for (const int threads : {1, 2, 3}) {
        const testing::Threads set(threads);
        const HarmonicRoute route = make_route(sky, channels, options_for(16, true, 1e-5, Frame::Icrs));
        ChannelMaps maps = route.make_channel(7);
        if (threads > 1) {
            EXPECT_TRUE(testing::same_bits(maps.i, before.i));
            EXPECT_TRUE(testing::same_bits(maps.q, before.q));
            EXPECT_TRUE(testing::same_bits(maps.u, before.u));
            EXPECT_EQ(route.error_of(7), error);
        }
        before = std::move(maps);
        error = route.error_of(7);
    }
}

TEST(HarmonicRoute, TurningTheFrameKeepsThePowerOfQAndU) {
    const SkyModel sky = make_test_sky(16, true);
    const auto channels = channels_of(3, 16, 15);
    const auto power = [&](Frame frame) {
        const ChannelMaps maps =
            make_route(sky, channels, options_for(16, true, 1e-6, frame)).make_channel(0);
        return std::pair(std::hypot(rms(maps.q), rms(maps.u)), rms(maps.i));
    };
    const auto [galactic, galactic_i] = power(Frame::Galactic);
    for (const Frame frame : {Frame::Icrs, Frame::Ecliptic}) {
        const auto [turned, turned_i] = power(frame);
        EXPECT_NEAR(turned / galactic, 1,
                    1e-3);  // pixel sums of squares of fields with l up to 20 at nside 16
        EXPECT_NEAR(turned_i / galactic_i, 1, 1e-3);
    }
}

TEST(HarmonicRoute, WithoutABeamASmoothSkyComesBackPixelForPixel) {
    // The sky is limited to l <= 8, but its spectrum varies, so that channels are not: e^x-like tails fall
    // below 1e-9 by l = 32.
    SkyModel sky = make_test_sky(16, false);
    sky.intensity = PixelField::of_map(
        testing::make_map(sky.grid, [](const Vector3& n) { return 5 + n[0] * n[1] + n[2]; }));
    sky.index =
        PixelField::of_map(testing::make_map(sky.grid, [](const Vector3& n) { return -2.8 + 0.05 * n[1]; }));
    auto channels = channels_of(3, 16);
    for (Channel& channel : channels)
        channel.beam.reset();
    const HarmonicRoute route = make_route(sky, channels, options_for(16, false, 1e-6));
    const SkyStrip strip = make_sky_strip(sky, whole_sky(sky.grid), false);
    const ChannelMaps maps = route.make_channel(1);
    for (std::size_t p = 0; p < maps.i.size(); ++p)
        EXPECT_NEAR(maps.i[p] / (strip.intensity[p] * exact_band_value(channels[1].band, sky.reference,
                                                                       strip.index[p], strip.curvature[p])),
                    1, 1e-6);
}

TEST(HarmonicRoute, MultipliesByThePixelWindowWhenAsked) {
    const SkyModel sky = make_test_sky(16, true);
    const auto channels = channels_of(3, 16, 10);
    HarmonicOptions options = options_for(16, true);
    options.pixel_window = make_gaussian_beam(Angle::from_degrees(8), 32);
    const ChannelMaps found = make_route(sky, channels, options).make_channel(2);
    const Oracle oracle = make_oracle(sky, channels[2], options);
    EXPECT_LE(relative_rms(found.i, oracle.maps.i), 1e-5);
    EXPECT_LE(relative_rms(found.q, oracle.maps.q), 1e-5);
    options.pixel_window.reset();
    EXPECT_GT(relative_rms(found.i, make_oracle(sky, channels[2], options).maps.i), 1e-3);
}

TEST(HarmonicRoute, NeedsADefinedPixel) {
    SkyModel sky = make_test_sky(8, false);
    sky.intensity =
        PixelField::of_map(testing::make_map(sky.grid, [](const Vector3&) { return undefined_pixel; }));
    EXPECT_THROW((void)make_route(sky, channels_of(3, 8), options_for(8, false)), DataError);
}

TEST(HarmonicReport, KeepsTheWorst) {
    HarmonicReport report;
    report.add({3, 2, 1e-6, 1e-5, true});
    report.add({1, 1, 1e-5, 1e-6, false});
    EXPECT_EQ(report.iterations, 3);
    EXPECT_EQ(report.refined, 3U);
    EXPECT_EQ(report.transform_error, 1e-5);
    EXPECT_EQ(report.worst_cl_ratio, 1e-5);
    EXPECT_FALSE(report.converged);
}

}  // namespace
}  // namespace foreglow
