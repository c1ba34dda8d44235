// SPDX-License-Identifier: GPL-2.0-or-later
// Two hundred random studies: whatever way the engine takes, each channel agrees with the exact law in each
// pixel followed by a converged transform, to the accuracy that the engine states.
#include <gtest/gtest.h>

#include <cmath>
#include <random>
#include <sstream>

#include "base/constants.h"
#include "model/harmonic_route.h"
#include "model/pixel_route.h"
#include "sphere/gaussian_field.h"
#include "support/route_oracle.h"
#include "support/sky_builder.h"

namespace foreglow {
namespace {

using testing::make_oracle;
using testing::true_error;
using testing::whole_sky;

#ifdef __SANITIZE_ADDRESS__
constexpr int studies = 20;  // ten times slower there, and it looks at memory, not at numbers
#else
constexpr int studies = 200;
#endif

/// Draws the choices of one study.
class Dice {
  public:
    explicit Dice(std::uint64_t seed) : engine_(seed) {}
    double between(double low, double high) {
        return low + (high - low) * static_cast<double>(engine_() >> 11) * 0x1p-53;
    }
    int whole(int low, int high) {
        return low + static_cast<int>(engine_() % static_cast<unsigned>(high - low + 1));
    }
    bool chance(double p) { return between(0, 1) < p; }

  private:
    std::mt19937_64 engine_;
};

// A Gaussian field of unit rms, rougher for a flatter slope.
std::vector<double> field(const HealpixGrid& grid, double slope, std::uint64_t seed) {
    const int lmax = 2 * grid.nside();
    std::vector<double> cl(static_cast<std::size_t>(lmax) + 1, 0.0);
    for (std::size_t l = 1; l < cl.size(); ++l)
        cl[l] = std::pow(static_cast<double>(l) + 2, slope);
    RandomKey key;
    key.seed = seed;
    auto map = synthesize(make_gaussian_alm(cl, lmax, key), grid);
    const double scale = 1 / rms_of_spectrum(cl, {}, 1);
    for (double& value : map)
        value *= scale;
    return map;
}

std::shared_ptr<SkyMap> as_map(const HealpixGrid& grid, std::vector<double> values) {
    return std::make_shared<SkyMap>(SkyMap{grid, Frame::Galactic, "", std::move(values)});
}

// mean + rms times a field.
PixelField varied(const HealpixGrid& grid, double mean, double rms, std::uint64_t seed) {
    auto map = field(grid, -3, seed);
    for (double& value : map)
        value = mean + rms * value;
    return PixelField::of_map(as_map(grid, std::move(map)));
}

void undefine_disc(const HealpixGrid& grid, double z, std::vector<double>& values) {
    for (std::int64_t p = 0; p < grid.npix(); ++p)
        if (grid.direction(p)[0] > z) values[static_cast<std::size_t>(p)] = undefined_pixel;
}

SkyModel random_sky(Dice& dice, int nside, bool polarized, std::uint64_t seed) {
    SkyModel sky;
    sky.grid = HealpixGrid(nside);
    sky.reference = Frequency::from_ghz(std::exp(dice.between(-1, 4)));
    auto intensity = field(sky.grid, dice.between(-3.5, -2), 10 * seed);
    const bool negative = dice.chance(0.3);
    const double contrast = dice.between(0.1, 0.6);
    for (std::int64_t p = 0; p < sky.grid.npix(); ++p) {
        double& value = intensity[static_cast<std::size_t>(p)];
        const double plane = 10 / (std::abs(sky.grid.direction(p)[2]) + 0.2);
        value = negative ? 5 * value : plane * std::exp(contrast * value);
    }
    const bool masked = dice.chance(0.25);
    if (masked) undefine_disc(sky.grid, dice.between(0.9, 0.99), intensity);
    sky.intensity = PixelField::of_map(as_map(sky.grid, std::move(intensity)));
    const double index = dice.between(-3.2, -2.4);
    sky.index = dice.chance(0.8) ? varied(sky.grid, index, dice.between(0.01, 0.15), 10 * seed + 1)
                                 : PixelField::uniform(index);
    if (dice.chance(0.7))
        sky.curvature = dice.chance(0.5) ? PixelField::uniform(dice.between(-0.1, 0.05))
                                         : varied(sky.grid, -0.04, dice.between(0.005, 0.03), 10 * seed + 2);
    if (!polarized) return sky;
    PolarizedSky part;
    auto q = testing::sample(sky.grid, testing::test_q), u = testing::sample(sky.grid, testing::test_u);
    if (masked) {
        undefine_disc(sky.grid, 0.97, q);
        undefine_disc(sky.grid, 0.97, u);
    }
    part.stokes.source = std::make_shared<const StokesMaps>(
        StokesMaps{sky.grid, sky.frame, "K_RJ", std::move(q), std::move(u)});
    part.reference = dice.chance(0.5) ? sky.reference : Frequency::from_ghz(22.8);
    if (dice.chance(0.3)) part.index = varied(sky.grid, -3.0, 0.1, 10 * seed + 3);
    sky.polarization = std::move(part);
    return sky;
}

enum class Beams { None, Same, Diffraction, Unrelated };

std::vector<Channel> random_channels(Dice& dice, int nside, bool polarized, Beams beams) {
    const int count = dice.chance(0.2) ? 1 : dice.whole(2, 30);
    const double first = std::exp(dice.between(std::log(0.05), std::log(100)));
    const double octaves = dice.between(0.2, 4);
    const double pixel_deg = 58.6 / nside, beam = dice.between(2.5, 5) * pixel_deg;
    std::vector<ChannelSpec> specs;
    for (int c = 0; c < count; ++c) {
        const double ghz = first * std::exp2(count > 1 ? octaves * c / (count - 1) : 0.0);
        const double width = dice.chance(0.3) ? 0.0 : dice.between(0.01, 0.6) * ghz;
        double fwhm = 0;
        if (beams == Beams::Same) fwhm = beam;
        if (beams == Beams::Diffraction) fwhm = std::max(2.0 * pixel_deg, 1.5 * beam * first / ghz);
        if (beams == Beams::Unrelated) fwhm = dice.between(2, 6) * pixel_deg;
        specs.push_back(testing::channel_spec(std::to_string(c), ghz, width, fwhm));
    }
    StudySpec study = testing::study_spec(nside, specs, polarized);
    const std::array<const char*, 3> units{"K_RJ", "uK_CMB", "MJy/sr"};
    study.unit = *find_brightness_unit(units[static_cast<std::size_t>(dice.whole(0, 2))]);
    return make_channels(study);
}

// Every pixel against the sum over the band.
void check_pixels(const SkyModel& sky, const std::vector<Channel>& channels, bool polarized,
                  double accuracy) {
    std::vector<BandSum> bands;
    bands.reserve(channels.size());
    for (const Channel& channel : channels)
        bands.push_back(channel.band);
    const PixelRoute route(sky, bands, polarized, 0.1 * accuracy);
    const SkyStrip strip = make_sky_strip(sky, whole_sky(sky.grid), polarized);
    const std::size_t n = strip.intensity.size(), columns = polarized ? 3 : 1;
    std::array<std::vector<double>, 3> maps;
    maps.fill(std::vector<double>(n));
    const std::array<std::span<double>, 3> out{maps[0], maps[1], maps[2]};
    for (const std::size_t c : {std::size_t{0}, channels.size() - 1}) {
        route.make_pixels(strip, c, 0, n, {out.data(), columns});
        const double stated =
            1.05 * route.error_of(c) + 1e-13;  // found on a grid of parameters, not everywhere
        EXPECT_LE(route.error_of(c), accuracy);
        for (std::size_t p = 0; p < n; ++p) {
            const double exact = strip.intensity[p] * exact_band_value(bands[c], sky.reference,
                                                                       strip.index[p], strip.curvature[p]);
            ASSERT_EQ(is_defined(maps[0][p]), is_defined(exact));
            if (!is_defined(exact)) continue;
            ASSERT_LE(std::abs(maps[0][p] - exact), stated * std::abs(exact));
        }
    }
}

void check_harmonics(Dice& dice, const SkyModel& sky, const std::vector<Channel>& channels, bool polarized,
                     double accuracy) {
    HarmonicOptions options;
    options.polarized = polarized;
    options.lmax = 2 * sky.grid.nside();
    options.accuracy = accuracy;
    if (dice.chance(0.15)) options.frame = Frame::Icrs;
    Progress progress;
    const HarmonicRoute route(sky, channels, options, progress);
    for (const std::size_t c : {std::size_t{0}, channels.size() - 1}) {
        const ChannelMaps found = route.make_channel(c);
        const double error = true_error(found, make_oracle(sky, channels[c], options), sky.grid);
        // The transforms' part is an estimate by the last correction: within a factor of 1.5 of the truth.
        EXPECT_LE(error, 1.5 * route.error_of(c) + 1e-12) << "channel " << c << " of " << channels.size();
        if (route.report().converged) {
            EXPECT_LE(route.error_of(c), accuracy);
        }
    }
}

void check_study(int number) {
    Dice dice(static_cast<std::uint64_t>(number));
    const int nside = number % 40 == 39 ? 64 : dice.chance(0.5) ? 8 : 16;
    const bool polarized = dice.chance(0.4);
    const auto beams = static_cast<Beams>(dice.whole(0, 3));
    const double accuracy = std::pow(10.0, dice.between(-6, -3));
    const SkyModel sky = random_sky(dice, nside, polarized, static_cast<std::uint64_t>(number));
    const auto channels = random_channels(dice, nside, polarized, beams);
    std::ostringstream name;
    name << "study " << number << ", nside " << nside << ", " << channels.size() << " channels, beams "
         << static_cast<int>(beams) << ", accuracy " << accuracy;
    SCOPED_TRACE(name.str());
    if (beams == Beams::None)
        check_pixels(sky, channels, polarized, accuracy);
    else
        check_harmonics(dice, sky, channels, polarized, accuracy);
}

TEST(RandomStudies, AgreeWithTheExactLawAndAConvergedTransform) {
    for (int number = 0; number < studies; ++number)
        check_study(number);
}

}  // namespace
}  // namespace foreglow
