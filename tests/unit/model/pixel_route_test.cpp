// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/pixel_route.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/error.h"
#include "support/sky_builder.h"

namespace foreglow {
namespace {

using testing::channel_spec;
using testing::make_map;
using testing::make_test_sky;
using testing::study_spec;
using testing::whole_sky;

std::vector<BandSum> bands_of(const StudySpec& study) {
    std::vector<BandSum> bands;
    for (const Channel& channel : make_channels(study))
        bands.push_back(channel.band);
    return bands;
}

using Maps = std::array<std::vector<double>, 3>;

Maps make_maps(const PixelRoute& route, const SkyStrip& strip, std::size_t channel, std::size_t begin,
               std::size_t end, bool polarized) {
    Maps maps;
    std::array<std::span<double>, 3> views;
    for (std::size_t s = 0; s < 3; ++s) {
        maps[s].resize(end - begin);
        views[s] = maps[s];
    }
    route.make_pixels(strip, channel, begin, end, {views.data(), polarized ? 3U : 1U});
    return maps;
}

// Three skies: polarization with the intensity's law, from another reference, with its own index.
std::vector<SkyModel> skies() {
    std::vector<SkyModel> out(3, make_test_sky(8, true));
    out[1].polarization->reference = Frequency::from_ghz(22.8);
    out[1].index_log_ratio = 0.5;
    out[2].polarization->index = PixelField::uniform(-3.1);
    return out;
}

TEST(PixelRoute, IsTheBandSumInEachPixel) {
    const StudySpec study = study_spec(8,
                                       {channel_spec("delta", 30), channel_spec("narrow", 70, 2),
                                        channel_spec("wide", 150, 90), channel_spec("low", 0.408)},
                                       true);
    const auto bands = bands_of(study);
    for (const double tolerance : {1e-5, 1e-8, 1e-11})
        for (const SkyModel& sky : skies()) {
            const PixelRoute route(sky, bands, true, tolerance);
            ASSERT_EQ(route.channel_count(), bands.size());
            const SkyStrip strip = make_sky_strip(sky, whole_sky(sky.grid), true);
            for (std::size_t c = 0; c < bands.size(); ++c) {
                const Maps maps = make_maps(route, strip, c, 0, strip.q.size(), true);
                double worst = 0;
                for (std::size_t p = 0; p < strip.q.size(); ++p) {
                    const double i =
                        strip.intensity[p] *
                        exact_band_value(bands[c], sky.reference, strip.index[p], strip.curvature[p]);
                    const double f = exact_band_value(bands[c], sky.polarization->reference,
                                                      strip.index_of_polarization()[p],
                                                      strip.curvature_of_polarization()[p]);
                    const double length = f * std::hypot(strip.q[p], strip.u[p]);
                    worst = std::max({worst, std::abs(maps[0][p] / i - 1),
                                      std::abs(maps[1][p] - f * strip.q[p]) / length,
                                      std::abs(maps[2][p] - f * strip.u[p]) / length});
                }
                EXPECT_LE(route.error_of(c), tolerance);
                EXPECT_LE(worst,
                          1.5 * route.error_of(c) +
                              1e-13);  // pixels lie between the law's check points; exp rounds at 1e-14
            }
        }
}

TEST(PixelRoute, ADeltaBandIsTheLimitOfANarrowOne) {
    const SkyModel sky = make_test_sky(4, false);
    const auto bands = bands_of(study_spec(
        4, {channel_spec("delta", 30), channel_spec("a", 30, 0.03), channel_spec("b", 30, 0.003)}));
    const PixelRoute route(sky, bands, false, 1e-11);
    const SkyStrip strip = make_sky_strip(sky, whole_sky(sky.grid), false);
    const auto delta = make_maps(route, strip, 0, 0, 192, false)[0];
    const auto a = make_maps(route, strip, 1, 0, 192, false)[0],
               b = make_maps(route, strip, 2, 0, 192, false)[0];
    for (std::size_t p = 0; p < 192; ++p) {
        // The correction is second order: p (p - 1) w^2/24 nu^2 with |p| < 4 in numerator and calibration,
        // below w^2/nu^2.
        EXPECT_NEAR(a[p] / delta[p], 1, 1e-6);
        EXPECT_NEAR(b[p] / delta[p], 1, 1e-8);
    }
    EXPECT_GT(testing::relative_rms(a, delta), 1e-8);  // yet there
}

TEST(PixelRoute, AtTheReferenceTheTemplateComesBack) {
    const SkyModel sky = make_test_sky(4, false);
    StudySpec study = study_spec(4, {channel_spec("same", 0.408)});
    study.unit = *find_brightness_unit("K_RJ");
    const PixelRoute route(sky, bands_of(study), false, 1e-11);
    const SkyStrip strip = make_sky_strip(sky, whole_sky(sky.grid), false);
    const auto map = make_maps(route, strip, 0, 0, 192, false)[0];
    for (std::size_t p = 0; p < 192; ++p)
        EXPECT_NEAR(map[p] / strip.intensity[p], 1, 1e-14);  // 408e6 from 0.408 GHz rounds once
}

TEST(PixelRoute, AnyPartOfAStripGivesTheSameBits) {
    const SkyModel sky = make_test_sky(16, true);
    const PixelRoute route(sky, bands_of(study_spec(16, {channel_spec("wide", 30, 9)}, true)), true, 1e-9);
    const SkyStrip strip = make_sky_strip(sky, whole_sky(sky.grid), true);
    const Maps whole = make_maps(route, strip, 0, 0, 3072, true);
    for (const auto& [begin, end] :
         {std::pair<std::size_t, std::size_t>{0, 1}, {5, 5}, {511, 514}, {100, 1700}, {3071, 3072}}) {
        const Maps part = make_maps(route, strip, 0, begin, end, true);
        for (std::size_t s = 0; s < 3; ++s)
            for (std::size_t i = 0; i < end - begin; ++i)
                ASSERT_EQ(part[s][i], whole[s][begin + i]);
    }
}

TEST(PixelRoute, UndefinedInAnyInputIsUndefinedInThatPixelOnly) {
    SkyModel sky = make_test_sky(4, true);
    const auto with_hole = [&](const testing::SkyFunction& function, std::size_t pixel) {
        auto map = make_map(sky.grid, function);
        map->values[pixel] = undefined_pixel;
        return PixelField::of_map(map);
    };
    sky.intensity = with_hole(testing::test_brightness, 1);
    sky.index = with_hole(testing::test_index, 2);
    sky.curvature = with_hole(testing::test_curvature, 3);
    auto stokes = *std::get<std::shared_ptr<const StokesMaps>>(sky.polarization->stokes.source);
    stokes.q[4] = stokes.u[4] = undefined_pixel;
    sky.polarization->stokes.source = std::make_shared<const StokesMaps>(stokes);
    const PixelRoute route(sky, bands_of(study_spec(4, {channel_spec("wide", 30, 9)}, true)), true, 1e-9);
    const Maps maps = make_maps(route, make_sky_strip(sky, whole_sky(sky.grid), true), 0, 0, 192, true);
    for (std::size_t p = 0; p < 192; ++p) {
        EXPECT_EQ(is_defined(maps[0][p]), p < 1 || p > 3);
        EXPECT_EQ(is_defined(maps[1][p]), p < 2 || p > 4);  // Q and U need no defined I, but its law
        EXPECT_EQ(is_defined(maps[2][p]), p < 2 || p > 4);
    }
}

TEST(PixelRoute, NegativePixelsScaleAsOthersDo) {
    SkyModel sky = make_test_sky(2, false);
    sky.intensity =
        PixelField::of_map(make_map(sky.grid, [](const Vector3& n) { return -testing::test_brightness(n); }));
    const auto bands = bands_of(study_spec(2, {channel_spec("x", 30, 3)}));
    const PixelRoute route(sky, bands, false, 1e-9), mirrored(make_test_sky(2, false), bands, false, 1e-9);
    const auto a = make_maps(route, make_sky_strip(sky, whole_sky(sky.grid), false), 0, 0, 48, false)[0];
    const auto b = make_maps(mirrored, make_sky_strip(make_test_sky(2, false), whole_sky(sky.grid), false), 0,
                             0, 48, false)[0];
    for (std::size_t p = 0; p < 48; ++p)
        EXPECT_EQ(a[p], -b[p]);
}

TEST(PixelRoute, TakesTheExactSumWhereABandIsTooWideForAPolynomial) {
    SkyModel sky = make_test_sky(1, false);
    sky.index = PixelField::of_map(make_map(sky.grid, [](const Vector3& n) { return -10 + 30 * n[2]; }));
    const auto bands = bands_of(study_spec(1, {channel_spec("huge", 1, 1.9)}));
    const PixelRoute route(sky, bands, false, 1e-11);
    EXPECT_EQ(route.error_of(0), 0.0);
    const SkyStrip strip = make_sky_strip(sky, whole_sky(sky.grid), false);
    const auto map = make_maps(route, strip, 0, 0, 12, false)[0];
    for (std::size_t p = 0; p < 12; ++p) {
        const double exact = strip.intensity[p] *
                             exact_band_value(bands[0], sky.reference, strip.index[p], strip.curvature[p]);
        EXPECT_NEAR(map[p] / exact, 1,
                    1e-13);  // exponents of up to 70 carry a few 1e-16 each, of 1e-14 in all
    }
}

}  // namespace
}  // namespace foreglow
