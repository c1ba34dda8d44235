// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/electron_sky.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/error.h"
#include "model/basis_error.h"
#include "model/component_maps.h"
#include "model/pixel_route.h"
#include "support/messages.h"
#include "support/sky_builder.h"
#include "support/threads.h"

namespace foreglow {
namespace {

using testing::channel_spec;
using testing::study_spec;
using testing::whole_sky;

// The test sky's index under electrons that have a break, a cut-off and ages.
SkyModel electron_sky(int nside, bool polarized) {
    SkyModel sky = testing::make_test_sky(nside, polarized);
    ElectronSky& electrons = sky.electrons.emplace();
    electrons.law.energy_break = EnergyBreak{4, 0.5};
    electrons.law.cutoff = EnergyCutoff{200, CutoffShape::Exponential};
    electrons.law.aging = IsotropizedAging{8, CutoffShape::Sharp};
    electrons.definition = sky.reference;
    find_electron_slopes(sky);
    return sky;
}

std::vector<BandSum> bands_from(double low_ghz, double high_ghz, int count) {
    std::vector<BandSum> bands;
    for (int i = 0; i < count; ++i) {
        const double ghz = low_ghz * std::pow(high_ghz / low_ghz, i / (count - 1.0));
        bands.push_back(make_channels(study_spec(4, {channel_spec("x", ghz, 0.1 * ghz)})).front().band);
    }
    return bands;
}

TEST(ElectronSky, GivesEachPixelTheIndexItHad) {
    const SkyModel sky = electron_sky(4, false);
    EXPECT_EQ(sky.electrons->clamped_pixels, 0);
    EXPECT_EQ(describe_clamped_pixels(sky), "");
    SkyStrip strip = make_sky_strip(sky, whole_sky(sky.grid), false);
    add_local_spectrum(sky, strip);
    for (std::size_t p = 0; p < strip.index.size(); ++p) {
        const double given = testing::test_index(sky.grid.direction(static_cast<std::int64_t>(p)));
        EXPECT_NEAR(strip.index[p], given, 5e-9);  // two polynomials of 1e-9 and what is between their checks
        if (p % 37 != 0) continue;
        const LocalSpectrum local = local_spectrum(sky.electrons->law, strip.slope[p], sky.reference);
        EXPECT_NEAR(local.index, given, 5e-9);
    }
}

TEST(ElectronSky, GoesThroughThePixelRouteAndTheBasis) {
    SkyModel sky = electron_sky(4, true);
    sky.polarization->reference = Frequency::from_ghz(22.8);
    const auto bands = bands_from(0.03, 400, 12);
    const PixelRoute route(sky, bands, true, 1e-7);
    const SkyStrip strip = make_sky_strip(sky, whole_sky(sky.grid), true);
    const std::size_t n = strip.intensity.size();
    std::array<std::vector<double>, 3> columns{std::vector<double>(n), std::vector<double>(n),
                                               std::vector<double>(n)};
    const std::array<std::span<double>, 3> views{columns[0], columns[1], columns[2]};
    const SpectralBasis basis = make_intensity_basis(sky, bands_from(20, 350, 30), 1e-4);
    EXPECT_LT(basis.components.size(), 16U);
    EXPECT_LE(basis.worst_error, 1e-4);
    for (const std::size_t c : {0U, 5U, 11U}) {
        route.make_pixels(strip, c, 0, n, views);
        EXPECT_LE(route.error_of(c), 1e-7);
        const auto map = make_intensity_component(sky, bands[c]);
        for (std::size_t p = 0; p < n; p += 61) {
            const ElectronLaw& law = sky.electrons->law;
            const double i =
                exact_electron_band_value(law, strip.slope[p], bands[c], sky.reference, EmissionPart::Total);
            const double q = exact_electron_band_value(law, strip.slope[p], bands[c],
                                                       sky.polarization->reference, EmissionPart::Polarized);
            EXPECT_NEAR(columns[0][p] / (strip.intensity[p] * i), 1, 2e-7);  // twice the tolerance
            EXPECT_NEAR(columns[1][p], strip.q[p] * q, 2e-7 * std::abs(strip.q[p] * q));
            EXPECT_NEAR(map[p] / (strip.intensity[p] * i), 1,
                        1e-8);  // component_tolerance and the oracle's own
        }
    }
}

TEST(ElectronSky, NeverDependsOnTheThreads) {
    std::vector<double> before;
    for (const int threads : {1, 2, 3}) {
        const testing::Threads set(threads);
        const SkyModel sky = electron_sky(8, false);
        const auto map = make_intensity_component(sky, bands_from(20, 350, 3)[1]);
        EXPECT_TRUE(threads == 1 || map == before);
        before = map;
    }
}

TEST(ElectronSky, CountsIndicesOutOfReachAndKeepsUndefinedPixels) {
    SkyModel sky = testing::make_test_sky(2, false);
    auto map = testing::make_map(sky.grid, testing::test_index);
    map->values[3] = -1.5;
    map->values[9] = undefined_pixel;
    sky.index = PixelField::of_map(map);
    sky.electrons.emplace().definition = sky.reference;
    find_electron_slopes(sky);
    EXPECT_EQ(sky.electrons->clamped_pixels, 1);
    EXPECT_TRUE(testing::has(describe_clamped_pixels(sky), "1 of 48 pixels"));
    const SkyStrip strip = make_sky_strip(sky, whole_sky(sky.grid), false);
    EXPECT_EQ(strip.slope[3], 1);
    EXPECT_TRUE(std::isnan(strip.slope[9]));
}

TEST(ElectronSky, RefusesAFieldThatIsNotAboveZero) {
    SkyModel sky = testing::make_test_sky(2, false);
    sky.electrons.emplace().definition = sky.reference;
    auto field = testing::make_map(sky.grid, [](const Vector3& n) { return n[2]; });
    sky.electrons->field = PixelField::of_map(field);
    EXPECT_TRUE(testing::has(testing::message_of<DataError>([&] {
                                 find_electron_slopes(sky);
                                 return 0;
                             }),
                             "field_map has the value"));
}

}  // namespace
}  // namespace foreglow
