// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/component_maps.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <set>

#include "support/sky_builder.h"
#include "support/threads.h"

namespace foreglow {
namespace {

using testing::channel_spec;
using testing::make_test_sky;
using testing::study_spec;
using testing::Threads;
using testing::whole_sky;

BandSum band_at(double ghz, double width) {
    return make_channels(study_spec(8, {channel_spec("x", ghz, width)})).front().band;
}

TEST(ComponentMaps, AreTheLawInEachPixel) {
    SkyModel sky = make_test_sky(8, true);
    sky.polarization->reference = Frequency::from_ghz(22.8);
    auto holed = testing::make_map(sky.grid, testing::test_index);
    holed->values[33] = undefined_pixel;
    sky.index = PixelField::of_map(holed);
    const BandSum band = band_at(70, 20);
    const auto map = make_intensity_component(sky, band);
    const auto stokes = make_polarized_component(sky, band);
    const SkyStrip strip = make_sky_strip(sky, whole_sky(sky.grid), true);
    for (std::size_t p = 0; p < map.size(); ++p) {
        if (p == 33) {
            EXPECT_FALSE(is_defined(map[p]) || is_defined(stokes.q[p]) || is_defined(stokes.u[p]));
            continue;
        }
        EXPECT_NEAR(map[p] / (strip.intensity[p] *
                              exact_band_value(band, sky.reference, strip.index[p], strip.curvature[p])),
                    1, 2e-9);
        const double f = exact_band_value(band, sky.polarization->reference, strip.index_of_polarization()[p],
                                          strip.curvature_of_polarization()[p]);
        EXPECT_NEAR(stokes.q[p], strip.q[p] * f, 2e-9 * f * 3);  // |Q|, |U| < 3 K
        EXPECT_NEAR(stokes.u[p], strip.u[p] * f, 2e-9 * f * 3);
    }
}

TEST(ComponentMaps, NeverDependOnTheThreads) {
    const SkyModel sky = make_test_sky(32, true);
    const BandSum band = band_at(70, 20);
    std::vector<double> map;
    StokesComponent stokes;
    for (const int threads : {1, 2, 3}) {
        const Threads set(threads);
        const auto again = make_intensity_component(sky, band);
        const auto stokes_again = make_polarized_component(sky, band);
        if (threads > 1) {
            EXPECT_EQ(again, map);
            EXPECT_EQ(stokes_again.q, stokes.q);
            EXPECT_EQ(stokes_again.u, stokes.u);
        }
        map = again;
        stokes = stokes_again;
    }
}

TEST(SkySample, TakesPixelsEvenlyWithTheirDirections) {
    const SkyModel sky = make_test_sky(16, true);
    const SkySample sample = make_sky_sample(sky, 512, true);  // every sixth of 3072
    ASSERT_EQ(sample.directions.size(), 512U);
    ASSERT_EQ(sample.values.intensity.size(), 512U);
    ASSERT_EQ(sample.values.curvature_of_polarization().size(), 512U);
    std::set<std::int64_t> seen;
    Vector3 mean{};
    for (std::size_t i = 0; i < 512; ++i) {
        const Vector3& n = sample.directions[i];
        EXPECT_EQ(sample.values.intensity[i], testing::test_brightness(n));
        EXPECT_EQ(sample.values.index[i], testing::test_index(n));
        EXPECT_EQ(sample.values.u[i], testing::test_u(n));
        seen.insert(sky.grid.pixel_at(n));
        for (std::size_t k = 0; k < 3; ++k)
            mean[k] += n[k] / 512;
    }
    EXPECT_EQ(seen.size(), 512U);
    for (const double component : mean)
        EXPECT_LT(std::abs(component), 0.03);  // a random sample would have 0.026 rms
}

TEST(SkySample, TakesAllPixelsOfASmallSky) {
    const SkyModel sky = make_test_sky(4, false);
    const SkySample sample = make_sky_sample(sky, 65536, false);
    auto values = sample.values.intensity, expected = testing::sample(sky.grid, testing::test_brightness);
    std::sort(values.begin(), values.end());
    std::sort(expected.begin(), expected.end());
    EXPECT_EQ(values, expected);
    EXPECT_TRUE(sample.values.q.empty());
}

TEST(SkyStrips, CoverTheSkyOnce) {
    const SkyModel sky = make_test_sky(8, false);
    std::vector<int> seen(768, 0);
    for_each_sky_strip(sky, false, [&](const RingStrip& strip, const SkyStrip& values) {
        EXPECT_EQ(static_cast<std::int64_t>(values.intensity.size()), pixel_count(sky.grid, strip));
        for (const PixelRange& range : pixel_ranges(sky.grid, strip))
            for (std::int64_t i = 0; i < range.count; ++i)
                ++seen[static_cast<std::size_t>(range.first_pixel + i)];
    });
    EXPECT_EQ(seen, std::vector<int>(768, 1));
}

}  // namespace
}  // namespace foreglow
