// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/transform_plan.h"

#include <gtest/gtest.h>

#include "support/sky_builder.h"

namespace foreglow {
namespace {

using testing::channel_spec;
using testing::sample;
using testing::study_spec;

std::vector<Channel> three_channels() {
    return make_channels(
        study_spec(8, {channel_spec("a", 30, 0, 10), channel_spec("b", 40, 0, 5), channel_spec("c", 50)}));
}

TEST(ChannelWindow, IsBeamTimesPixelWindow) {
    const auto channels = three_channels();
    HarmonicOptions options;
    options.lmax = 16;
    EXPECT_EQ(channel_window(channels[0], options), *channels[0].beam);
    const BeamWindow none = channel_window(channels[2], options);
    EXPECT_EQ(none.temperature, std::vector<double>(17, 1.0));
    EXPECT_EQ(none.polarization[1], 0.0);
    EXPECT_EQ(none.polarization[2], 1.0);
    options.pixel_window = make_gaussian_beam(Angle::from_degrees(7), 16);
    const BeamWindow both = channel_window(channels[0], options);
    for (std::size_t l = 0; l < 17; ++l) {
        EXPECT_DOUBLE_EQ(both.temperature[l],
                         channels[0].beam->temperature[l] * options.pixel_window->temperature[l]);
        EXPECT_DOUBLE_EQ(both.polarization[l],
                         channels[0].beam->polarization[l] * options.pixel_window->polarization[l]);
    }
}

TEST(WidestWindow, IsTheLargestInSizeAtEachL) {
    auto channels = three_channels();
    HarmonicOptions options;
    options.lmax = 16;
    const std::vector<Channel> beams(channels.begin(), channels.begin() + 2);
    EXPECT_EQ(widest_window(beams, options).temperature, channels[1].beam->temperature);
    // A tabulated window may change its sign; a channel's place in the list must not matter.
    std::vector<Channel> signs(2, channels[0]);
    signs[0].beam = make_tabulated_beam(std::vector<double>(17, -0.5));
    signs[1].beam = make_tabulated_beam(std::vector<double>(17, 0.2));
    EXPECT_EQ(widest_window(signs, options).temperature, std::vector<double>(17, 0.5));
    std::swap(signs[0], signs[1]);
    EXPECT_EQ(widest_window(signs, options).temperature, std::vector<double>(17, 0.5));
}

}  // namespace
}  // namespace foreglow
