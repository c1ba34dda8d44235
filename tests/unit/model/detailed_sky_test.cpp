// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/detailed_sky.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>

#include "model/detail_modulation.h"
#include "model/sky_region.h"
#include "sphere/harmonics.h"
#include "sphere/power_spectrum.h"

namespace foreglow {
namespace {

const HealpixGrid grid(32);

std::shared_ptr<SkyMap> map_of(double (*value)(const Vector3&)) {
    auto map = std::make_shared<SkyMap>();
    map->grid = grid;
    map->unit = "K_RJ";
    for (std::int64_t p = 0; p < grid.npix(); ++p)
        map->values.push_back(value(grid.direction(p)));
    return map;
}

SkyModel make_base(std::shared_ptr<const SkyMap> intensity, bool polarized = false) {
    SkyModel sky;
    sky.grid = grid;
    sky.reference = Frequency::from_ghz(0.408);
    sky.intensity = PixelField::of_map(std::move(intensity));
    sky.beam_fwhm = Angle::from_degrees(5);
    if (!polarized) return sky;
    auto stokes = std::make_shared<StokesMaps>();
    stokes->grid = grid;
    stokes->q.assign(static_cast<std::size_t>(grid.npix()), 2.0);
    stokes->u.assign(stokes->q.size(), 0.0);
    PolarizedSky p;
    p.stokes.source = std::shared_ptr<const StokesMaps>(std::move(stokes));
    p.reference = sky.reference;
    sky.polarization = std::move(p);
    return sky;
}

ModelSpec make_model_of(DetailForm form, double amplitude) {
    ModelSpec model;
    DetailSpec detail;
    detail.form = form;
    detail.intensity = PowerLawSpec{-2.6, {amplitude, {BrightnessUnit::Kind::RayleighJeans, 1.0}}, 30};
    detail.polarization = PowerLawSpec{-2.6, {amplitude, {BrightnessUnit::Kind::RayleighJeans, 1.0}}, 30};
    detail.latitude_cut = Angle::from_degrees(0);
    detail.envelope_fwhm = Angle::from_degrees(15);
    model.detail = detail;
    return model;
}

DetailedSky make(const ModelSpec& model, SkyModel base, bool polarized = false) {
    Progress quiet;
    return {model, std::move(base), 77, polarized, quiet};
}

double bright_plane(const Vector3& n) {
    return 5 + 40 * std::exp(-n[2] * n[2] / 0.02);
}

TEST(DetailedSky, IsTheTemplateWhereNothingIsRandom) {
    const auto map = map_of(bright_plane);
    const auto sky = make(ModelSpec{}, make_base(map));
    EXPECT_FALSE(sky.varies());
    EXPECT_EQ(sky.realize(3).intensity.map(), map);
    EXPECT_TRUE(sky.realize(3).beam_fwhm.has_value());
}

TEST(DetailedSky, HasNoBeamOfItsOwnLeft) {
    const auto sky = make(make_model_of(DetailForm::Additive, 0.1), make_base(map_of(bright_plane)));
    EXPECT_TRUE(sky.varies());
    EXPECT_FALSE(sky.realize(0).beam_fwhm.has_value());
    EXPECT_NE(sky.realize(0).intensity.map()->values, sky.realize(1).intensity.map()->values);
    EXPECT_EQ(sky.realize(1).intensity.map()->values, sky.realize(1).intensity.map()->values);
}

// A hundred realizations with a relative rms of 0.5, in which the additive form goes negative.
TEST(DetailedSky, LognormalStaysPositiveAndKeepsItsMean) {
    const auto flat = map_of([](const Vector3&) { return 10.0; });
    const auto lognormal = make(make_model_of(DetailForm::Lognormal, 12), make_base(flat));
    const auto additive = make(make_model_of(DetailForm::Additive, 12), make_base(flat));
    EXPECT_NEAR(lognormal.report().relative_rms, 0.5, 0.2);
    double lowest = 1e9, lowest_additive = 1e9, mean = 0;
    for (int r = 0; r < 100; ++r) {
        const auto map = lognormal.realize(r).intensity.map();
        lowest = std::min(lowest, *std::min_element(map->values.begin(), map->values.end()));
        for (const double v : map->values)
            mean += v / (100.0 * static_cast<double>(grid.npix()));
        const auto other = additive.realize(r).intensity.map();
        lowest_additive =
            std::min(lowest_additive, *std::min_element(other->values.begin(), other->values.end()));
    }
    EXPECT_GT(lowest, 0);
    EXPECT_LT(lowest_additive, 0);
    EXPECT_NEAR(mean, 10, 0.05);  // rms 5 over 100 skies of some 1000 independent patches: 0.016, three times
}

// Of the relative fluctuation, over 60 realizations; the target is what the additive form adds.
TEST(DetailedSky, LognormalHasTheSpectrumAskedFor) {
    const auto sky =
        make(make_model_of(DetailForm::Lognormal, 3), make_base(map_of([](const Vector3&) { return 10.0; })));
    std::vector<double> sum(65);
    for (int r = 0; r < 60; ++r) {
        const auto map = sky.realize(r).intensity.map();
        const auto cl = power_spectrum(analyse(grid, map->values, 64));
        for (std::size_t l = 0; l < sum.size(); ++l)
            sum[l] += cl[l] / 60;
    }
    double ratio = 0, modes = 0;
    for (std::size_t l = 15; l <= 64; ++l) {
        const double n = 2.0 * static_cast<double>(l) + 1;
        ratio += n * sum[l] / sky.report().added.tt[l];
        modes += n;
    }
    EXPECT_NEAR(ratio / modes, 1, 0.03);  // the 3 %; the sample's error is 0.3 %
}

TEST(DetailedSky, AddsWhereALognormalTemplateIsNotPositive) {
    auto map = map_of(bright_plane);
    map->values[17] = -1;
    map->values[18] = undefined_pixel;
    const auto sky = make(make_model_of(DetailForm::Lognormal, 0.1), make_base(map));
    DetailCounts counts;
    const auto drawn = sky.realize(0, &counts).intensity.map();
    EXPECT_EQ(counts.not_positive, 1);
    EXPECT_NE(drawn->values[17], -1);
    EXPECT_NEAR(drawn->values[17], -1, 2);
    EXPECT_FALSE(is_defined(drawn->values[18]));
}

TEST(DetailedSky, AnotherModulationOfALognormalFollowsTheEnvelope) {
    ModelSpec model = make_model_of(DetailForm::Lognormal, 1);
    model.detail->modulation = 0.5;
    const auto sky = make(model, make_base(map_of(bright_plane)));
    double ratio = 0, modes = 0;
    std::vector<double> sum(65);
    const auto base = map_of(bright_plane);
    for (int r = 0; r < 30; ++r) {
        auto values = sky.realize(r).intensity.map()->values;
        EXPECT_GT(*std::min_element(values.begin(), values.end()), 0);
        for (std::size_t i = 0; i < values.size(); ++i)
            values[i] -= base->values[i];
        const auto cl = power_spectrum(analyse(grid, values, 64));
        for (std::size_t l = 0; l < sum.size(); ++l)
            sum[l] += cl[l] / 30;
    }
    for (std::size_t l = 40; l <= 60; ++l) {
        const double n = 2.0 * static_cast<double>(l) + 1;
        ratio += n * sum[l] / sky.report().added.tt[l];
        modes += n;
    }
    EXPECT_NEAR(ratio / modes, 1, 0.1);  // the form is approximate, of order sigma^2 (here up to 0.1)
}

TEST(DetailedSky, CountsAndCapsWhatIsTooPolarized) {
    ModelSpec model = make_model_of(DetailForm::Additive, 1);
    const auto flat = map_of([](const Vector3&) { return 4.0; });
    const auto free = make(model, make_base(flat, true), true);
    DetailCounts counts;
    static_cast<void>(free.realize(0, &counts));
    EXPECT_GT(counts.too_polarized, 10);
    model.detail->cap_polarization = true;
    const auto capped = make(model, make_base(flat, true), true);
    const SkyModel sky = capped.realize(0);
    const SkyStrip strip = make_sky_strip(sky, {0, grid.ring_count(), false}, true);
    for (std::size_t i = 0; i < strip.q.size(); ++i)
        if (strip.intensity[i] > 0) {
            ASSERT_LE(std::hypot(strip.q[i], strip.u[i]), 0.75 * strip.intensity[i] * (1 + 1e-12));
        }
}

TEST(DetailedSky, ScattersIndexAndCurvatureAsAsked) {
    ModelSpec model;
    model.index.scatter = ScatterSpec{0.1, -2.6, {2, 80}, 0};
    model.curvature_scatter = ScatterSpec{0.02, -2.6, {2, 80}, 0};
    SkyModel base = make_base(map_of(bright_plane));
    base.index = PixelField::uniform(-2.8);
    const auto sky = make(model, std::move(base));
    EXPECT_FALSE(sky.has_detail());
    double index = 0, curvature = 0;
    constexpr int realizations = 60;
    for (int r = 0; r < realizations; ++r) {
        const SkyModel one = sky.realize(r);
        const SkyStrip strip = make_sky_strip(one, {0, grid.ring_count(), false}, false);
        for (std::size_t i = 0; i < strip.index.size(); ++i) {
            index += std::pow(strip.index[i] + 2.8, 2) / (realizations * static_cast<double>(grid.npix()));
            curvature += std::pow(strip.curvature[i], 2) / (realizations * static_cast<double>(grid.npix()));
        }
    }
    // With this slope l = 2 to 4 hold most of the variance, some 20 modes: its error over 60 draws is 4 %,
    // that of the rms 2 %; four times.
    EXPECT_NEAR(std::sqrt(index) / 0.1, 1, 0.08);
    EXPECT_NEAR(std::sqrt(curvature) / 0.02, 1, 0.08);
}

TEST(DetailModulation, HasAMeanSquareOfOneBeyondTheCut) {
    const auto map = map_of(bright_plane);
    const auto region = make_latitude_weights(grid, Frame::Galactic, Angle::from_degrees(20));
    const auto w = make_modulation(map->values, region, 1.3, 0.1);
    EXPECT_NEAR(
        region_mean(region, [&](std::size_t i) { return std::pow(static_cast<double>(w.weights[i]), 2); }), 1,
        1e-6);  // single precision
    const auto highest = std::max_element(map->values.begin(), map->values.end()) - map->values.begin();
    const auto lowest = std::min_element(map->values.begin(), map->values.end()) - map->values.begin();
    EXPECT_NEAR(w.weights[static_cast<std::size_t>(highest)] / w.weights[static_cast<std::size_t>(lowest)],
                std::pow(map->values[static_cast<std::size_t>(highest)] /
                             map->values[static_cast<std::size_t>(lowest)],
                         1.3),
                1e-4);  // single precision of a ratio near 18
    const auto floored = make_modulation(map->values, region, 1, 1);
    EXPECT_GT(floored.floored, 0.3);
    EXPECT_EQ(make_modulation(map->values, region, 0, 0.1).weights[5], 1.0F);
}

TEST(DetailModulation, SmoothsFromTheTemplatesOwnBeam) {
    // One multipole: the envelope is what a Gaussian of sqrt(15^2 - 5^2) deg leaves of it.
    Alm alm(20);
    alm(10, 4) = 1;
    const auto envelope =
        make_envelope(grid, synthesize(alm, grid), Angle::from_degrees(5), Angle::from_degrees(15));
    const double sigma = std::sqrt(200.0) / 57.29577951308232 / std::sqrt(8 * std::log(2.0));
    const Alm back = analyse(grid, envelope, 20);
    EXPECT_NEAR(back(10, 4).real(), std::exp(-0.5 * 110 * sigma * sigma), 2e-3);  // one unweighted analysis
}

}  // namespace
}  // namespace foreglow
