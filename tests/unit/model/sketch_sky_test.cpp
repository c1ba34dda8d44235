// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/sketch_sky.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <numeric>

#include "sphere/harmonics.h"
#include "sphere/power_spectrum.h"
#include "sphere/regrid.h"
#include "support/messages.h"
#include "support/sky_builder.h"
#include "support/threads.h"

namespace foreglow {
namespace {

using testing::whole_sky;

const Frequency reference = Frequency::from_hz(408e6);

SkyStrip make_strip(const SketchSpec& sketch, int nside, bool polarized = true) {
    const SkyModel sky = make_sketch_sky(sketch, reference, HealpixGrid(nside), polarized);
    return make_sky_strip(sky, whole_sky(sky.grid), polarized);
}

double mean(const std::vector<double>& values) {
    return std::accumulate(values.begin(), values.end(), 0.0) / static_cast<double>(values.size());
}
double scatter(const std::vector<double>& values) {
    double sum = 0;
    for (const double value : values)
        sum += std::pow(value - mean(values), 2);
    return std::sqrt(sum / static_cast<double>(values.size()));
}

TEST(SketchSky, IsLabelledInvented) {
    const SkyModel sky = make_sketch_sky({}, reference, HealpixGrid(8), false);
    ASSERT_EQ(sky.labels.size(), 1U);
    EXPECT_TRUE(testing::has(sky.labels[0], "Invented"));
    EXPECT_TRUE(testing::has(sky.labels[0], "not a measurement"));
    EXPECT_EQ(sky.frame, Frame::Galactic);
    EXPECT_FALSE(sky.polarization);
    EXPECT_DOUBLE_EQ(sky.beam_fwhm->degrees(), 1);
}

TEST(SketchSky, HasTheBrightnessesOfItsKeys) {
    SketchSpec sketch;
    sketch.texture = sketch.loops = false;
    const SkyStrip strip = make_strip(sketch, 64, false);
    const HealpixGrid grid(64);
    const auto at = [&](const Vector3& n) {
        return strip.intensity[static_cast<std::size_t>(grid.pixel_at(n))];
    };
    // From the formulas of docs/models.md: the disc layer's pole brightness; the plane adds 1/cosh(90/4)
    // there, nothing.
    EXPECT_NEAR(at({0, 0, 1}), 10, 0.01);
    EXPECT_NEAR(at({0, 0, -1}), 10, 0.01);
    // In the plane the layer reaches 10 sqrt((1 + 0.12^2)/0.12^2) = 84; at the anticentre 60 is added, at the
    // centre five times that. Pixels of 0.9 deg whose centres lie up to 0.6 deg off the plane: 1/cosh(0.15)
    // is 1 %.
    EXPECT_NEAR(at({-1, 0, 0}), 84 + 60, 3);
    EXPECT_NEAR(at({1, 0, 0}), 84 + 300, 8);
    sketch.disc = false;
    const SkyStrip dark = make_strip(sketch, 4, false);
    EXPECT_EQ(*std::max_element(dark.intensity.begin(), dark.intensity.end()), 0.0);
}

// Berkhuijsen 1971: the first radio loop is centred on (329, 17.5) deg and 116 deg wide.
TEST(SketchSky, LoopsAreRingsOfThePublishedSize) {
    SketchSpec sketch;
    sketch.disc = sketch.texture = false;
    const SkyStrip strip = make_strip(sketch, 64, false);
    const HealpixGrid grid(64);
    const double lon = 329 * 3.14159265358979323846 / 180, lat = 17.5 * 3.14159265358979323846 / 180;
    const Vector3 centre{std::cos(lat) * std::cos(lon), std::cos(lat) * std::sin(lon), std::sin(lat)};
    std::vector<double> profile(180, 0), count(180, 0);
    for (std::int64_t p = 0; p < grid.npix(); ++p) {
        const Vector3 n = grid.direction(p);
        const double cosine = n[0] * centre[0] + n[1] * centre[1] + n[2] * centre[2];
        const auto bin =
            static_cast<std::size_t>(std::acos(std::clamp(cosine, -1.0, 1.0)) * 180 / 3.14159265358979323846);
        profile[bin] += strip.intensity[static_cast<std::size_t>(p)];
        count[bin] += 1;
    }
    for (std::size_t i = 0; i < 180; ++i)
        profile[i] /= std::max(count[i], 1.0);
    const auto brightest = std::max_element(profile.begin(), profile.end()) - profile.begin();
    EXPECT_NEAR(static_cast<double>(brightest), 58, 1);  // half of 116, in bins of one degree
}

TEST(SketchSky, IsTheSameSkyAtEveryNside) {
    const SkyModel coarse = make_sketch_sky({}, reference, HealpixGrid(32), true),
                   fine = make_sketch_sky({}, reference, HealpixGrid(64), true);
    const auto alm_of = [](const SkyModel& sky) {
        return analyse(sky.grid, make_sky_strip(sky, whole_sky(sky.grid), false).intensity, 20);
    };
    Alm a = alm_of(coarse);
    const Alm b = alm_of(fine);
    add_scaled(a, -1, b);
    // Both are point samples of one sky, whose 1 to 3 deg structure pixels of 1.8 deg alias a little.
    EXPECT_LT(rms_of_spectrum(power_spectrum(a)) / rms_of_spectrum(power_spectrum(b)), 0.01);
}

TEST(SketchSky, HasTheScatterOfItsKeys) {
    SketchSpec sketch;
    const SkyStrip strip = make_strip(sketch, 64);
    // One realization of a field with structure down to 10 deg: some hundred independent patches.
    EXPECT_NEAR(mean(strip.index), -2.75, 0.02);
    EXPECT_NEAR(scatter(strip.index), 0.06, 0.015);
    EXPECT_NEAR(mean(strip.curvature), -0.04, 0.004);
    EXPECT_NEAR(scatter(strip.curvature), 0.01, 0.0025);
    SketchSpec plain = sketch;
    plain.texture = false;
    const SkyStrip smooth = make_strip(plain, 64);
    std::vector<double> log_ratio;
    for (std::size_t p = 0; p < smooth.intensity.size(); ++p)
        log_ratio.push_back(std::log(strip.intensity[p] / smooth.intensity[p]));
    EXPECT_NEAR(scatter(log_ratio), 0.12, 0.03);
    EXPECT_TRUE(std::all_of(strip.intensity.begin(), strip.intensity.end(), [](double t) { return t > 0; }));
    sketch.index_rms = sketch.curvature_rms = 0;
    EXPECT_TRUE(make_sketch_sky(sketch, reference, HealpixGrid(4), false).index.is_uniform());
}

TEST(SketchSky, PolarizationIsNeverMoreThanElectronsGive) {
    const SkyStrip strip = make_strip({}, 32);
    double sum = 0;
    for (std::size_t p = 0; p < strip.q.size(); ++p) {
        const double fraction = std::hypot(strip.q[p], strip.u[p]) / strip.intensity[p];
        EXPECT_LE(fraction, 0.7 + 1e-12);
        sum += fraction / static_cast<double>(strip.q.size());
    }
    EXPECT_NEAR(sum, 0.2, 0.06);  // polarized_fraction, less in the plane
}

TEST(SketchSky, DependsOnItsSeedAndNotOnTheThreads) {
    SketchSpec sketch;
    SkyStrip first, again;
    {
        const testing::Threads one(1);
        first = make_strip(sketch, 16);
    }
    {
        const testing::Threads two(2);
        again = make_strip(sketch, 16);
    }
    EXPECT_EQ(first.intensity, again.intensity);
    EXPECT_EQ(first.index, again.index);
    EXPECT_EQ(first.u, again.u);
    sketch.seed = 2;
    const SkyStrip other = make_strip(sketch, 16);
    EXPECT_NE(first.intensity, other.intensity);
    EXPECT_NE(first.index, other.index);
    EXPECT_NE(first.curvature, other.curvature);
    EXPECT_NE(first.u, other.u);
}

}  // namespace
}  // namespace foreglow
