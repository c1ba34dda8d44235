// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/channel.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/error.h"
#include "support/messages.h"
#include "support/sky_builder.h"

namespace foreglow {
namespace {

using testing::channel_spec;
using testing::has;
using testing::message_of;
using testing::study_spec;
using testing::TemporaryFolder;
using testing::write_whole_file;

Channel only(const StudySpec& study) {
    const auto channels = make_channels(study);
    EXPECT_EQ(channels.size(), 1U);
    return channels.front();
}

// M of T = nu^p [GHz] by the trapezium rule, with w = tau nu^k and t_cal = 1: the definition of K_RJ.
double numerical(double low, double high, double p, double k) {
    double above = 0, below = 0;
    constexpr int n = 200000;
    for (int i = 0; i <= n; ++i) {
        const double nu = low + (high - low) * i / n, weight = i == 0 || i == n ? 0.5 : 1.0;
        above += weight * std::pow(nu, p + k);
        below += weight * std::pow(nu, k);
    }
    return above / below;
}

double band_value(const Channel& channel, double p) {
    double sum = 0;
    for (std::size_t i = 0; i < channel.band.hz.size(); ++i)
        sum += channel.band.weights[i] * std::pow(channel.band.hz[i] * 1e-9, p);
    return sum;
}

TEST(Channels, ADeltaHasOneFrequencyAndNoBandwidth) {
    StudySpec study = study_spec(8, {channel_spec("a", 30)});
    study.unit = *find_brightness_unit("K_RJ");
    const Channel channel = only(study);
    EXPECT_EQ(channel.name, "a");
    EXPECT_EQ(channel.reference.hz(), 30e9);
    EXPECT_FALSE(channel.bandwidth || channel.beam || channel.beam_fwhm);
    ASSERT_EQ(channel.band.hz.size(), 1U);
    EXPECT_EQ(channel.band.hz[0], 30e9);
    EXPECT_EQ(channel.band.weights[0], 1.0);
}

TEST(Channels, UnitsAreThoseOfTheChannelsFrequency) {
    StudySpec study = study_spec(8, {channel_spec("a", 143)});
    const auto weight = [&](const char* unit) {
        study.unit = *find_brightness_unit(unit);
        return only(study).band.weights.at(0);
    };
    const double x = 6.62607015e-34 * 143e9 / (1.380649e-23 * 2.7255);
    const double per_cmb = x * x * std::exp(x) / std::pow(std::expm1(x), 2);  // Planck 2013 IX, eq. 8
    EXPECT_NEAR(weight("uK_CMB") * per_cmb / 1e6, 1, 1e-12);
    const double jansky = 2 * 1.380649e-23 * std::pow(143e9 / 299792458.0, 2) * 1e26;  // per sr, of 1 K_RJ
    EXPECT_NEAR(weight("MJy/sr") / (jansky * 1e-6), 1, 1e-12);
    EXPECT_NEAR(weight("Jy/pixel") / (jansky * 4 * 3.14159265358979323846 / 768), 1, 1e-12);
}

TEST(Channels, AFlatBandIsItsIntegralForEachWeighting) {
    for (const auto& [weights, k] : {std::pair{ResponseWeights::Temperature, 0.0},
                                     {ResponseWeights::Photon, 1.0},
                                     {ResponseWeights::Radiance, 2.0}}) {
        StudySpec study = study_spec(8, {channel_spec("a", 30, 6)});
        study.unit = *find_brightness_unit("K_RJ");
        study.channels[0].response_weights = weights;
        const Channel channel = only(study);
        EXPECT_EQ(channel.bandwidth->hz(), 6e9);
        EXPECT_EQ(channel.reference.hz(), 30e9);
        for (const double p : {-3.1, -2.0, 0.0})
            EXPECT_NEAR(band_value(channel, p) / numerical(27, 33, p, k), 1, 1e-9);  // the rule's error
    }
}

TEST(Channels, ExactEdgesOfAGridReplaceTheBandwidth) {
    StudySpec study = study_spec(8, {channel_spec("a", 30, 6)});
    study.unit = *find_brightness_unit("K_RJ");
    study.channels[0].band_low = Frequency::from_ghz(29);
    study.channels[0].band_high = Frequency::from_ghz(34);
    const Channel channel = only(study);
    EXPECT_EQ(channel.bandwidth->hz(), 5e9);
    EXPECT_NEAR(band_value(channel, -3) / numerical(29, 34, -3, 0), 1, 1e-9);
}

class ChannelFiles : public ::testing::Test {
  protected:
    StudySpec with_response(const std::string& text) {
        write_whole_file(folder_ / "r.csv", text);
        StudySpec study = study_spec(8, {channel_spec("a", 30)});
        study.unit = *find_brightness_unit("K_RJ");
        study.channels[0].response = folder_ / "r.csv";
        return study;
    }
    StudySpec with_window(const std::string& text) {
        write_whole_file(folder_ / "bl.csv", text);
        StudySpec study = study_spec(2, {channel_spec("a", 30)});
        study.channels[0].beam_window = folder_ / "bl.csv";
        return study;
    }
    TemporaryFolder folder_;
};

TEST_F(ChannelFiles, ATableIsLinearBetweenItsRows) {
    StudySpec study = with_response("frequency_GHz,transmission\n20,0\n30,1\n40,0\n");
    const Channel channel = only(study);
    EXPECT_NEAR(channel.bandwidth->hz(), 20e9, 1e-3);
    double above = 0, below = 0;
    for (int i = 0; i <= 200000; ++i) {  // trapezium rule with the kink on a node
        const double nu = 20 + 20.0 * i / 200000, tau = 1 - std::abs(nu - 30) / 10;
        above += tau * std::pow(nu, -3);
        below += tau;
    }
    EXPECT_NEAR(band_value(channel, -3) / (above / below), 1, 1e-8);
    study.channels[0].frequency.reset();
    EXPECT_NEAR(only(study).reference.ghz(), 30, 1e-9);  // the mean frequency of a symmetric response
}

TEST_F(ChannelFiles, AWindowIsUsedUpToLmax) {
    const Channel channel = only(with_window("l,B_l\n0,1\n1,0.9\n2,0.8\n3,0.7\n4,0.6\n5,0.5\n6,0.4\n"));
    ASSERT_TRUE(channel.beam);
    EXPECT_EQ(channel.beam->temperature, (std::vector<double>{1, 0.9, 0.8, 0.7, 0.6}));
    EXPECT_EQ(channel.beam->polarization, (std::vector<double>{0, 0, 0.8, 0.7, 0.6}));
    EXPECT_FALSE(channel.beam_fwhm);
}

TEST_F(ChannelFiles, AShortWindowIsAQuestionOfLmax) {
    const StudySpec study = with_window("l,B_l\n0,1\n1,0.9\n2,0.8\n");
    const std::string message = message_of<InputError>([&] { return make_channels(study); });
    EXPECT_TRUE(has(message, "study.toml:1:1: ")) << message;
    EXPECT_TRUE(has(message, "ends at l = 2 but the study's lmax is 4"));
    EXPECT_TRUE(has(message, "`lmax = 2`"));
}

TEST(Channels, AGaussianBeamHasItsFwhm) {
    const Channel channel = only(study_spec(8, {channel_spec("a", 30, 0, 5)}));
    EXPECT_DOUBLE_EQ(channel.beam_fwhm->degrees(), 5);
    const double sigma = 5 * 3.14159265358979323846 / 180 / std::sqrt(8 * std::log(2.0));
    ASSERT_EQ(channel.beam->lmax(), 16);
    EXPECT_NEAR(channel.beam->temperature[10], std::exp(-0.5 * 110 * sigma * sigma), 1e-14);
}

TEST(Channels, AreMadePerPixelWithoutBeamWindowAndTurn) {
    StudySpec study = study_spec(8, {channel_spec("a", 30), channel_spec("b", 30, 0, 5)});
    const auto channels = make_channels(study);
    EXPECT_TRUE(is_made_per_pixel(channels[0], study, Frame::Galactic));
    EXPECT_FALSE(is_made_per_pixel(channels[1], study, Frame::Galactic));
    EXPECT_FALSE(is_made_per_pixel(channels[0], study, Frame::Icrs));
    study.pixel_window = true;
    EXPECT_FALSE(is_made_per_pixel(channels[0], study, Frame::Galactic));
}

}  // namespace
}  // namespace foreglow
