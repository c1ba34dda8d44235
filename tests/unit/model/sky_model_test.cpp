// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/sky_model.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/error.h"
#include "sphere/gaussian_field.h"
#include "support/messages.h"
#include "support/sky_builder.h"

namespace foreglow {
namespace {

using testing::make_map;
using testing::make_test_sky;
using testing::same_bits;
using testing::whole_sky;

SkyStrip whole_strip(const SkyModel& sky, bool polarized) {
    return make_sky_strip(sky, whole_sky(sky.grid), polarized);
}

// T(nu)/A of a curved law whose LOCAL index at nu1 is beta1, by its definition, with pow.
double law(double nu, double nu0, double beta0, double c) {
    return std::pow(nu / nu0, beta0 + c * std::log(nu / nu0));
}
double local_index_of(double nu, double nu0, double beta0, double c) {
    const double h = 1e-5;
    return (std::log(law(nu * (1 + h), nu0, beta0, c)) - std::log(law(nu * (1 - h), nu0, beta0, c))) /
           (std::log1p(h) - std::log1p(-h));
}

TEST(SkyStrip, HoldsWhatTheMapsHold) {
    const SkyModel sky = make_test_sky(4, true);
    const SkyStrip plain = whole_strip(sky, false);
    EXPECT_TRUE(same_bits(plain.intensity, testing::sample(sky.grid, testing::test_brightness)));
    EXPECT_TRUE(same_bits(plain.index, testing::sample(sky.grid, testing::test_index)));
    EXPECT_TRUE(same_bits(plain.curvature, testing::sample(sky.grid, testing::test_curvature)));
    EXPECT_TRUE(plain.q.empty() && plain.u.empty() && plain.polarized_index.empty() &&
                plain.polarized_curvature.empty());
    const SkyStrip full = whole_strip(sky, true);
    EXPECT_TRUE(same_bits(full.q, testing::sample(sky.grid, testing::test_q)));
    EXPECT_TRUE(same_bits(full.u, testing::sample(sky.grid, testing::test_u)));
    EXPECT_TRUE(
        same_bits(full.index_of_polarization(), full.index));  // same reference: the intensity's own curve
    EXPECT_TRUE(same_bits(full.curvature_of_polarization(), full.curvature));
}

TEST(SkyStrip, CarriesAnIndexMeasuredElsewhereToTheReference) {
    SkyModel sky = make_test_sky(2, false);
    sky.index_log_ratio = std::log(1e9 / 408e6);  // measured at 1 GHz
    const SkyStrip strip = whole_strip(sky, false);
    for (std::size_t p = 0; p < strip.index.size(); ++p) {
        const double measured = testing::test_index(sky.grid.direction(static_cast<std::int64_t>(p)));
        // The law that comes out has the measured local index at 1 GHz (numerical derivative: 1e-10 and its
        // own rounding).
        EXPECT_NEAR(local_index_of(1e9, 408e6, strip.index[p], strip.curvature[p]), measured, 1e-9);
    }
}

// `between` two frequencies is a chord; the model reader turns it into the geometric mean, where the curved
// law has that local index.
TEST(SkyStrip, AChordIsTheLocalIndexAtTheGeometricMean) {
    const double low = 408e6, high = 23e9;
    SkyModel sky = make_test_sky(1, false);
    sky.reference = Frequency::from_hz(1e9);
    sky.index_log_ratio = std::log(std::sqrt(low * high) / 1e9);
    const SkyStrip strip = whole_strip(sky, false);
    for (std::size_t p = 0; p < strip.index.size(); ++p) {
        const double chord = std::log(law(high, 1e9, strip.index[p], strip.curvature[p]) /
                                      law(low, 1e9, strip.index[p], strip.curvature[p])) /
                             std::log(high / low);
        EXPECT_NEAR(chord, testing::test_index(sky.grid.direction(static_cast<std::int64_t>(p))), 1e-13);
    }
}

TEST(SkyStrip, PolarizationAtAnotherReferenceFollowsTheIntensitysCurve) {
    SkyModel sky = make_test_sky(2, true);
    sky.index_log_ratio = std::log(1e9 / 408e6);
    sky.polarization->reference = Frequency::from_ghz(22.8);
    const SkyStrip strip = whole_strip(sky, true);
    for (std::size_t p = 0; p < strip.index.size(); ++p)
        for (const double ghz : {0.408, 5.0, 100.0}) {
            const double expected = law(ghz * 1e9, 408e6, strip.index[p], strip.curvature[p]) /
                                    law(22.8e9, 408e6, strip.index[p], strip.curvature[p]);
            const double found = law(ghz * 1e9, 22.8e9, strip.index_of_polarization()[p],
                                     strip.curvature_of_polarization()[p]);
            EXPECT_NEAR(found / expected, 1, 1e-13);  // rounding of exponents near 20
        }
    EXPECT_FALSE(polarization_shares_law(sky));
}

TEST(SkyStrip, PolarizationsOwnIndexIsAPowerLaw) {
    SkyModel sky = make_test_sky(2, true);
    EXPECT_TRUE(polarization_shares_law(sky));
    sky.polarization->index = PixelField::uniform(-3.1);
    const SkyStrip strip = whole_strip(sky, true);
    EXPECT_EQ(strip.index_of_polarization(), std::vector<double>(48, -3.1));
    EXPECT_EQ(strip.curvature_of_polarization(), std::vector<double>(48, 0.0));
    EXPECT_FALSE(polarization_shares_law(sky));
}

TEST(SkyStrip, AFractionSetsTheLengthAtThePolarizationsReference) {
    SkyModel sky = make_test_sky(2, true);
    sky.polarization->reference = Frequency::from_ghz(22.8);
    sky.polarization->fraction =
        PixelField::of_map(make_map(sky.grid, [](const Vector3& n) { return 0.2 + 0.1 * n[1]; }));
    const SkyStrip strip = whole_strip(sky, true);
    for (std::size_t p = 0; p < strip.q.size(); ++p) {
        const Vector3 n = sky.grid.direction(static_cast<std::int64_t>(p));
        const double intensity_there =
            strip.intensity[p] * law(22.8e9, 408e6, strip.index[p], strip.curvature[p]);
        EXPECT_NEAR(std::hypot(strip.q[p], strip.u[p]) / ((0.2 + 0.1 * n[1]) * intensity_there), 1, 1e-13);
        EXPECT_NEAR(std::atan2(strip.u[p], strip.q[p]), std::atan2(testing::test_u(n), testing::test_q(n)),
                    1e-14);
    }
}

TEST(SkyStrip, UndefinedStaysUndefinedAndSpreadsNowhere) {
    SkyModel sky = make_test_sky(2, true);
    const auto with_hole = [&](const testing::SkyFunction& function, std::size_t pixel) {
        auto map = make_map(sky.grid, function);
        map->values[pixel] = undefined_pixel;
        return PixelField::of_map(map);
    };
    sky.intensity = with_hole(testing::test_brightness, 1);
    sky.index = with_hole(testing::test_index, 2);
    sky.curvature = with_hole(testing::test_curvature, 3);
    sky.index_log_ratio = 0.1;
    const SkyStrip strip = whole_strip(sky, true);
    EXPECT_EQ(testing::undefined_count(strip.intensity), 1);
    EXPECT_EQ(testing::undefined_count(strip.index),
              2);  // the curvature's hole is one of the carried index, too
    EXPECT_EQ(testing::undefined_count(strip.curvature), 1);
    EXPECT_EQ(testing::undefined_count(strip.q), 0);
}

TEST(SkyStrip, StripsOfAnySizeGiveTheSameSky) {
    SkyModel sky = make_test_sky(8, true);
    sky.polarization->fraction = PixelField::uniform(0.3);
    const SkyStrip whole = whole_strip(sky, true);
    for (const std::int64_t pixels : {1, 77, 500})
        for (const RingStrip& strip : cut_into_strips(sky.grid, pixels)) {
            const SkyStrip part = make_sky_strip(sky, strip, true);
            for (const PixelRange& range : pixel_ranges(sky.grid, strip))
                for (std::int64_t i = 0; i < range.count; ++i) {
                    const auto a = static_cast<std::size_t>(range.first_pixel + i),
                               b = static_cast<std::size_t>(range.offset + i);
                    ASSERT_EQ(part.intensity[b], whole.intensity[a]);
                    ASSERT_EQ(part.u[b], whole.u[a]);
                    ASSERT_EQ(part.index_of_polarization()[b], whole.index_of_polarization()[a]);
                }
        }
}

TEST(SkyStrip, StokesFromCoefficientsAreTheirMap) {
    SkyModel sky = make_test_sky(8, true);
    const AlmEB alm{make_gaussian_alm(std::vector<double>(17, 1.0), 16, {1, 0, 1}),
                    make_gaussian_alm(std::vector<double>(17, 1.0), 16, {1, 0, 2})};
    sky.polarization->stokes.source = alm;
    sky.polarization->stokes.filled =
        make_map(sky.grid, [](const Vector3& n) { return n[2] > 0.9 ? 1.0 : 0.0; });
    const SkyStrip strip = whole_strip(sky, true);
    const StokesValues expected = synthesize_spin2(alm, sky.grid);
    EXPECT_LT(testing::relative_rms(strip.q, expected.q), 1e-13);  // rounding
    EXPECT_LT(testing::relative_rms(strip.u, expected.u), 1e-13);
    EXPECT_GT(testing::undefined_count(strip.q), 20);
    EXPECT_EQ(testing::undefined_count(strip.q), testing::undefined_count(strip.u));
}

TEST(ParameterRange, BoundsEveryPixel) {
    SkyModel sky = make_test_sky(8, true);
    sky.polarization->reference = Frequency::from_ghz(22.8);
    for (const double log_ratio : {-1.0, 0.0, 0.7}) {
        sky.index_log_ratio = log_ratio;
        const ParameterRange range = parameter_range(sky), polarized = polarized_parameter_range(sky);
        const SkyStrip strip = whole_strip(sky, true);
        for (std::size_t p = 0; p < strip.index.size(); ++p) {
            EXPECT_TRUE(strip.index[p] >= range.index_low - 1e-14 &&
                        strip.index[p] <= range.index_high + 1e-14);
            EXPECT_TRUE(strip.curvature[p] >= range.curvature_low &&
                        strip.curvature[p] <= range.curvature_high);
            EXPECT_TRUE(strip.index_of_polarization()[p] >= polarized.index_low - 1e-14 &&
                        strip.index_of_polarization()[p] <= polarized.index_high + 1e-14);
        }
        // The box of two maps' bounds is no wider than index range plus 2 |ln| times curvature range.
        EXPECT_LE(range.index_high - range.index_low, 0.7 + 2 * std::abs(log_ratio) * 0.06);
    }
    sky.polarization->index = PixelField::uniform(-3.05);
    const ParameterRange own = polarized_parameter_range(sky);
    EXPECT_EQ(own.index_low, -3.05);
    EXPECT_EQ(own.index_high, -3.05);
    EXPECT_EQ(own.curvature_low, 0);
    EXPECT_EQ(own.curvature_high, 0);
}

TEST(ParameterRange, NeedsADefinedPixel) {
    SkyModel sky = make_test_sky(1, false);
    sky.index = PixelField::of_map(make_map(sky.grid, [](const Vector3&) { return undefined_pixel; }));
    EXPECT_TRUE(testing::has(testing::message_of<DataError>([&] { return parameter_range(sky); }),
                             "index map has no defined pixel"));
}

}  // namespace
}  // namespace foreglow
