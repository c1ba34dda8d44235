// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/map_source.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/error.h"
#include "support/messages.h"
#include "support/sky_builder.h"

namespace foreglow {
namespace {

using testing::fits_map;
using testing::has;
using testing::message_of;

constexpr double pi = 3.14159265358979323846;
const Frequency at_94 = Frequency::from_ghz(94);

BrightnessUnit unit(const char* text) {
    return *find_brightness_unit(text);
}

class MapSources : public ::testing::Test {
  protected:
    MapSource source(const char* section = "intensity") const {
        MapSource map;
        map.path = folder_ / "survey.fits";
        map.place = "model.toml:3:7";
        map.section = section;
        return map;
    }
    // Writes survey.fits with 12 pixels 0, 1, ... 11, in as many columns as wanted.
    testing::FitsMapBuilder survey(const std::string& tunit, std::size_t columns = 1) const {
        std::vector<std::vector<double>> values(columns);
        for (std::size_t c = 0; c < columns; ++c)
            for (int p = 0; p < 12; ++p)
                values[c].push_back(p + 100.0 * static_cast<double>(c));
        return fits_map(1, values, tunit);
    }
    SkyMap read(const MapSource& from) { return read_brightness_map(from, at_94, progress_); }

    testing::TemporaryFolder folder_;
    Progress progress_;
};

TEST_F(MapSources, TheUnitComesFromTheFileOrFromTheModel) {
    MapSource map = source();
    EXPECT_EQ(resolve_unit(map, "uK_CMB"), unit("uK_CMB"));
    EXPECT_EQ(resolve_unit(map, " MJy/sr "), unit("MJy/sr"));
    map.unit = unit("mK_CMB");
    for (const char* tunit :
         {"", "unknown", "mK_CMB", "mK", "MK", "mk ", "mK,thermodynamic", "mK (CMB)", "counts"})
        EXPECT_EQ(resolve_unit(map, tunit), unit("mK_CMB")) << tunit;
    map.unit = unit("K_RJ");
    for (const char* tunit : {"K", "Kelvin", "K_RJ", "K (Rayleigh-Jeans)", "K, antenna"})
        EXPECT_EQ(resolve_unit(map, tunit), unit("K_RJ")) << tunit;
}

TEST_F(MapSources, AMissingUnitIsAQuestionWithTheLineToAdd) {
    for (const char* tunit : {"", "  "}) {
        const std::string message = message_of<InputError>([&] { return resolve_unit(source(), tunit); });
        EXPECT_TRUE(
            has(message,
                "model.toml:3:7: the map survey.fits does not say its unit (TUNIT is absent or unknown)"))
            << message;
        EXPECT_TRUE(has(message, "add `unit = \"K_RJ\"`"));
        EXPECT_TRUE(has(message, "to [intensity]"));
        EXPECT_TRUE(has(message, "Jy/pixel"));
    }
    for (const char* tunit : {"mK", "K", "uK", "counts"}) {
        const std::string message = message_of<InputError>([&] { return resolve_unit(source(), tunit); });
        EXPECT_TRUE(
            has(message, std::string("has TUNIT '") + tunit + "', which does not say which scale it is in"))
            << message;
        EXPECT_TRUE(has(message, "add `unit = "));
    }
}

TEST_F(MapSources, AContradictionOfUnitsIsAnError) {
    const auto contradicts = [&](const char* tunit, const char* in_model) {
        MapSource map = source();
        map.unit = unit(in_model);
        const std::string message = message_of<InputError>([&] { return resolve_unit(map, tunit); });
        EXPECT_TRUE(
            has(message, std::string("has TUNIT '") + tunit + "' but [intensity] says \"" + in_model + "\""))
            << message;
        EXPECT_TRUE(has(message, "correct one of them"));
    };
    contradicts("uK_CMB", "uK_RJ");
    contradicts("K_RJ", "mK_RJ");
    contradicts("MJy/sr", "K_RJ");
    contradicts("mK", "K_CMB");  // a bare kelvin still says the scale
    contradicts("K", "MJy/sr");  // and that it is a temperature
    contradicts("mK,thermodynamic", "mK_RJ");
    contradicts("mK (CMB)", "mK_RJ");
    contradicts("K (Rayleigh-Jeans)", "K_CMB");
    contradicts("K, antenna", "K_CMB");
}

TEST_F(MapSources, TheFrameComesFromTheFileOrFromTheModel) {
    MapSource map = source();
    EXPECT_EQ(resolve_frame(map, Frame::Icrs), Frame::Icrs);
    map.frame = Frame::Ecliptic;
    EXPECT_EQ(resolve_frame(map, std::nullopt), Frame::Ecliptic);
    EXPECT_EQ(resolve_frame(map, Frame::Ecliptic), Frame::Ecliptic);
    const std::string contradiction =
        message_of<InputError>([&] { return resolve_frame(map, Frame::Galactic); });
    EXPECT_TRUE(
        has(contradiction,
            "model.toml:3:7: the map survey.fits has COORDSYS galactic but [intensity] says ecliptic"))
        << contradiction;
    const std::string question =
        message_of<InputError>([&] { return resolve_frame(source("index"), std::nullopt); });
    EXPECT_TRUE(has(question, "does not say its frame")) << question;
    EXPECT_TRUE(has(question, "add `frame = \"galactic\"` (or \"icrs\", \"ecliptic\") to [index]"));
}

TEST_F(MapSources, TheSignOfUComesFromTheFileOrFromTheModel) {
    MapSource map = source("polarization");
    EXPECT_EQ(resolve_convention(map, PolarizationConvention::Iau), PolarizationConvention::Iau);
    map.convention = PolarizationConvention::Cosmo;
    EXPECT_EQ(resolve_convention(map, std::nullopt), PolarizationConvention::Cosmo);
    EXPECT_TRUE(
        has(message_of<InputError>([&] { return resolve_convention(map, PolarizationConvention::Iau); }),
            "another POLCCONV than [polarization] says in `polarization_convention`: correct one of them"));
    EXPECT_TRUE(
        has(message_of<InputError>([&] { return resolve_convention(source("polarization"), std::nullopt); }),
            "add `polarization_convention = \"COSMO\"` (or \"IAU\") to [polarization]"));
}

TEST_F(MapSources, TheReadersAskTheSameQuestions) {
    survey("").write(folder_ / "survey.fits");
    EXPECT_TRUE(has(message_of<InputError>([&] { return read(source()); }), "add `unit ="));
    survey("unknown").write(folder_ / "survey.fits");
    EXPECT_TRUE(has(message_of<InputError>([&] { return read(source()); }), "add `unit ="));
    survey("mK").write(folder_ / "survey.fits");
    EXPECT_TRUE(has(message_of<InputError>([&] { return read(source()); }), "TUNIT 'mK'"));
    survey("K_RJ").without("COORDSYS").write(folder_ / "survey.fits");
    EXPECT_TRUE(has(message_of<InputError>([&] { return read(source()); }), "add `frame ="));
    survey("K_RJ").card("COORDSYS", "'unknown '").write(folder_ / "survey.fits");
    EXPECT_TRUE(has(message_of<InputError>([&] { return read(source()); }), "add `frame ="));
    MapSource wrong = source();
    wrong.frame = Frame::Icrs;
    survey("K_RJ").write(folder_ / "survey.fits");
    EXPECT_TRUE(has(message_of<InputError>([&] { return read(wrong); }), "COORDSYS"));
    MapSource stokes = source("polarization");
    stokes.columns = {1, 2};
    survey("K_RJ", 2).write(folder_ / "survey.fits");
    const auto read_stokes = [&] { return read_stokes_maps(stokes, at_94, progress_); };
    EXPECT_TRUE(has(message_of<InputError>(read_stokes), "add `polarization_convention ="));
    survey("K_RJ", 2).card("POLCCONV", "'unknown '").write(folder_ / "survey.fits");
    EXPECT_TRUE(has(message_of<InputError>(read_stokes), "add `polarization_convention ="));
    stokes.convention = PolarizationConvention::Cosmo;
    survey("K_RJ", 2).card("POLCCONV", "'IAU     '").write(folder_ / "survey.fits");
    EXPECT_TRUE(has(message_of<InputError>(read_stokes), "POLCCONV"));
}

TEST_F(MapSources, BrightnessBecomesRayleighJeansAtTheFrequency) {
    survey("uK_CMB").write(folder_ / "survey.fits");
    const double x = 6.62607015e-34 * 94e9 / (1.380649e-23 * 2.7255);
    const double factor = x * x * std::exp(x) / std::pow(std::expm1(x), 2);  // Planck 2013 IX, eq. 8
    const SkyMap map = read(source());
    EXPECT_EQ(map.unit, "K_RJ");
    EXPECT_EQ(map.frame, Frame::Galactic);
    for (std::size_t p = 0; p < 12; ++p)
        EXPECT_NEAR(map.values[p], 1e-6 * factor * static_cast<double>(p), 1e-18);
    survey("Jy/pixel").write(folder_ / "survey.fits");
    const double per_kelvin = 2 * 1.380649e-23 * std::pow(94e9 / 299792458.0, 2) * 1e26 * 4 * pi / 12;
    EXPECT_NEAR(read(source()).values[5] * per_kelvin, 5, 1e-12);
}

TEST_F(MapSources, StokesBecomeCosmoAndAreUndefinedTogether) {
    auto values = std::vector<std::vector<double>>{{0, 1, -1.6375e30, 3, 4, 5, 6, 7, 8, 9, 10, 11},
                                                   {5, 6, 7, std::nan(""), 9, 9, 9, 9, 9, 9, 9, 9}};
    MapSource map = source("polarization");
    map.columns = {1, 2};
    for (const bool iau : {false, true}) {
        fits_map(1, values, "mK_RJ")
            .card("POLCCONV", iau ? "'IAU     '" : "'COSMO   '")
            .write(folder_ / "survey.fits");
        const StokesMaps maps = read_stokes_maps(map, at_94, progress_);
        EXPECT_DOUBLE_EQ(maps.q[1], 1e-3);
        EXPECT_DOUBLE_EQ(maps.u[1], iau ? -6e-3 : 6e-3);
        for (std::size_t p = 0; p < 12; ++p) {
            EXPECT_EQ(is_defined(maps.q[p]), p != 2 && p != 3);
            EXPECT_EQ(is_defined(maps.u[p]), p != 2 && p != 3);
        }
    }
    EXPECT_TRUE(has(progress_.notices().back(), "survey.fits: 2 of 12 pixels are undefined and stay so"));
}

TEST_F(MapSources, AnglesBecomeUnitVectors) {
    MapSource map = source("polarization");
    for (const bool iau : {false, true}) {
        fits_map(1, {{0, 15, 45, 90, 135, 180, -30, std::nan(""), 0, 0, 0, 0}})
            .card("POLCCONV", iau ? "'IAU     '" : "'COSMO   '")
            .write(folder_ / "survey.fits");
        const StokesMaps maps = read_angle_map(map, progress_);
        const double sign = iau ? -1 : 1;
        EXPECT_DOUBLE_EQ(maps.q[0], 1);
        EXPECT_NEAR(maps.q[1], std::sqrt(3.0) / 2, 1e-15);
        EXPECT_NEAR(maps.u[1], sign * 0.5, 1e-15);
        EXPECT_NEAR(maps.u[2], sign, 1e-15);
        EXPECT_NEAR(maps.q[3], -1, 1e-15);
        EXPECT_NEAR(maps.u[4], -sign, 1e-15);
        EXPECT_NEAR(maps.u[6], -sign * std::sqrt(3.0) / 2, 1e-15);
        EXPECT_FALSE(is_defined(maps.q[7]) || is_defined(maps.u[7]));
    }
}

TEST_F(MapSources, PlainMapsNeedNoUnit) {
    survey("", 2).write(folder_ / "survey.fits");
    MapSource map = source("index");
    map.columns = {2};
    const SkyMap plain = read_plain_map(map, progress_);
    EXPECT_EQ(plain.values[3], 103);
    EXPECT_EQ(plain.unit, "");
    EXPECT_EQ(plain.grid.nside(), 1);
}

}  // namespace
}  // namespace foreglow
