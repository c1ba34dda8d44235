// SPDX-License-Identifier: GPL-2.0-or-later
#include <gtest/gtest.h>

#include <cmath>
#include <string>

#include "base/error.h"
#include "model/study_channels.h"
#include "model/study_file.h"

namespace foreglow {
namespace {

constexpr const char* head = "model = \"disc-and-loops\"\nnside = 64\n[channel_grid]\n";

std::vector<ChannelSpec> make(const std::string& lines) {
    return make_study(parse_toml(head + lines, "s.toml"), "s.toml").channels;
}
std::string message_of(const std::string& lines) {
    try {
        (void)make(lines);
    } catch (const InputError& error) {
        return error.what();
    }
    return "";
}
bool has(const std::string& message, const std::string& part) {
    return message.find(part) != std::string::npos;
}

TEST(ChannelGrid, IsLinearWithExactEnds) {
    const auto channels =
        make("first = \"50 MHz\"\nlast = \"200 MHz\"\ncount = 4\nbandwidth = \"0.5 MHz\"\n");
    ASSERT_EQ(channels.size(), 4U);
    EXPECT_EQ(channels[0].name, "grid_0000");
    EXPECT_EQ(channels[3].name, "grid_0003");
    EXPECT_EQ(channels[0].frequency->hz(), 50e6);
    EXPECT_DOUBLE_EQ(channels[1].frequency->hz(), 100e6);
    EXPECT_EQ(channels[3].frequency->hz(), 200e6);
    EXPECT_EQ(channels[2].bandwidth->hz(), 0.5e6);
    EXPECT_FALSE(channels[2].band_low.has_value());
}

TEST(ChannelGrid, ContiguousLinearBandsTouchHalfway) {
    const auto channels =
        make("first = \"100 MHz\"\nlast = \"300 MHz\"\ncount = 3\nbandwidth = \"contiguous\"\n");
    // By hand: neighbours at 100, 200, 300 MHz, so edges at 50, 150, 250, 350 MHz, the end ones mirrored.
    const double edges[] = {50e6, 150e6, 250e6, 350e6};
    for (std::size_t i = 0; i < 3; ++i) {
        EXPECT_DOUBLE_EQ(channels[i].band_low->hz(), edges[i]);
        EXPECT_DOUBLE_EQ(channels[i].band_high->hz(), edges[i + 1]);
        EXPECT_DOUBLE_EQ(channels[i].bandwidth->hz(), 100e6);
        if (i > 0) {  // no gap, to the last bit
            EXPECT_EQ(*channels[i].band_low, *channels[i - 1].band_high);
        }
    }
}

TEST(ChannelGrid, ContiguousLogBandsTouchAtGeometricMeans) {
    const auto channels = make(
        "first = \"1 GHz\"\nlast = \"100 GHz\"\ncount = 3\nspacing = \"log\"\nbandwidth = \"contiguous\"\n");
    // By hand: 1, 10, 100 GHz; edges at 10^-0.5, 10^0.5, 10^1.5, 10^2.5 GHz. Relative 1e-14: a few roundings
    // of pow.
    EXPECT_NEAR(channels[1].frequency->ghz(), 10, 10 * 1e-14);
    for (std::size_t i = 0; i < 3; ++i) {
        const double low = std::pow(10.0, static_cast<double>(i) - 0.5);
        EXPECT_NEAR(channels[i].band_low->ghz(), low, low * 1e-14);
        EXPECT_NEAR(channels[i].band_high->ghz(), 10 * low, 10 * low * 1e-14);
        if (i > 0) {
            EXPECT_EQ(*channels[i].band_low, *channels[i - 1].band_high);
        }
    }
}

TEST(ChannelGrid, ScalesTheBeamByDiffraction) {
    const std::string grid = "first = \"50 MHz\"\nlast = \"200 MHz\"\ncount = 2\nbeam_fwhm = \"2 deg\"\n";
    const auto scaled = make(grid + "beam_at = \"100 MHz\"\nbeam_scaling = \"diffraction\"\n");
    EXPECT_DOUBLE_EQ(scaled[0].beam_fwhm->degrees(), 4);
    EXPECT_DOUBLE_EQ(scaled[1].beam_fwhm->degrees(), 1);
    EXPECT_DOUBLE_EQ(make(grid)[0].beam_fwhm->degrees(), 2);
    EXPECT_DOUBLE_EQ(make(grid + "beam_at = \"100 MHz\"\n")[0].beam_fwhm->degrees(), 4);
    EXPECT_DOUBLE_EQ(make(grid + "beam_at = \"100 MHz\"\nbeam_scaling = \"fixed\"\n")[0].beam_fwhm->degrees(),
                     2);
}

TEST(ChannelGrid, AllowsOneChannelWhereFirstIsLast) {
    const auto channels = make("name = \"one\"\nfirst = \"50 MHz\"\nlast = \"50 MHz\"\ncount = 1\n");
    ASSERT_EQ(channels.size(), 1U);
    EXPECT_EQ(channels[0].name, "one_0000");
    EXPECT_EQ(channels[0].frequency->hz(), 50e6);
}

TEST(ChannelGrid, StandsBesideChannelsButNotUnderTheirNames) {
    const std::string grid = "first = \"50 MHz\"\nlast = \"60 MHz\"\ncount = 2\n";
    EXPECT_EQ(make(grid + "[[channel]]\nname = \"low\"\nfrequency = \"30 GHz\"\n").size(), 3U);
    EXPECT_TRUE(has(message_of(grid + "[[channel]]\nname = \"Grid_0001\"\nfrequency = \"30 GHz\"\n"),
                    "already that of"));
}

TEST(ChannelGrid, NumbersMoreThanTenThousandWithMoreDigits) {
    const auto channels = make("first = \"50 MHz\"\nlast = \"60 MHz\"\ncount = 10001\n");
    EXPECT_EQ(channels.front().name, "grid_00000");
    EXPECT_EQ(channels.back().name, "grid_10000");
}

TEST(ChannelGrid, RefusesWhatCannotBe) {
    const std::string ends = "first = \"50 MHz\"\nlast = \"200 MHz\"\n";
    EXPECT_TRUE(has(message_of(ends + "count = 0\n"), "s.toml:6:9: 'count' in [channel_grid]"));
    EXPECT_TRUE(has(message_of(ends + "count = 1\n"), "needs 'first' and 'last' to be the same"));
    EXPECT_TRUE(has(message_of("first = \"50 MHz\"\nlast = \"50 MHz\"\ncount = 2\n"), "above 'first'"));
    EXPECT_TRUE(has(message_of("first = \"60 MHz\"\nlast = \"50 MHz\"\ncount = 2\n"), "above 'first'"));
    EXPECT_TRUE(has(message_of(ends), "'count' is missing"));
    EXPECT_TRUE(has(message_of("last = \"200 MHz\"\ncount = 2\n"), "'first' is missing"));
    EXPECT_TRUE(has(message_of("first = \"200 MHz\"\ncount = 2\n"), "'last' is missing"));
    EXPECT_TRUE(has(message_of(ends + "count = 2\nspacing = \"octave\"\n"), "\"linear\", \"log\""));
    EXPECT_TRUE(has(message_of(ends + "count = 2\nbandwidth = \"100 MHz\"\n"), "zero frequency"));
    EXPECT_TRUE(has(message_of(ends + "count = 2\nbandwidth = \"contigous\"\n"), "or \"contiguous\""));
    EXPECT_TRUE(has(message_of(ends + "count = 2\nbandwidth = \"contiguous\"\n"), "below zero frequency"));
    EXPECT_TRUE(
        has(message_of("first = \"50 MHz\"\nlast = \"50 MHz\"\ncount = 1\nbandwidth = \"contiguous\"\n"),
            "cannot be \"contiguous\""));
    EXPECT_TRUE(has(message_of(ends + "count = 2\nbeam_scaling = \"diffraction\"\n"), "needs a beam"));
    EXPECT_TRUE(has(message_of(ends + "count = 2\nbeam_fwhm = \"2 deg\"\nbeam_scaling = \"diffraction\"\n"),
                    "'beam_at' is missing"));
    EXPECT_TRUE(has(message_of(ends + "count = 2\nbeam_fwhm = \"100 deg\"\nbeam_at = \"100 MHz\"\n"),
                    "above 180 deg"));
    EXPECT_TRUE(has(message_of(ends + "count = 2\nbeam = \"2 deg\"\n"), "no key 'beam'"));
}

TEST(Noise, IsANumberABrightnessAndAnAngle) {
    EXPECT_NO_THROW(check_noise("5 uK_CMB arcmin"));
    EXPECT_NO_THROW(check_noise("0.1 MJy/sr deg"));
    EXPECT_NO_THROW(check_noise("5uK_RJ  arcsec"));
    for (const char* text : {"", "5", "uK_CMB arcmin", "5 uK_CMB", "5 arcmin", "5 uK arcmin",
                             "5 Jy/pixel arcmin", "0 uK_CMB arcmin", "5 uK_CMB rad"})
        EXPECT_THROW(check_noise(text), InputError) << text;
}

}  // namespace
}  // namespace foreglow
