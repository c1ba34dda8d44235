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

TEST(CollectWindows, KeepsEachWindowOnceAndTheLargestAtEachL) {
    const std::vector<BeamWindow> beams{make_gaussian_beam(Angle::from_degrees(5), 16),
                                        make_gaussian_beam(Angle::from_degrees(10), 16),
                                        make_gaussian_beam(Angle::from_degrees(5), 16)};
    const auto sets = collect_windows(beams);
    EXPECT_EQ(sets[0].all.size(), 2U);
    EXPECT_EQ(sets[0].widest, beams[0].temperature);
    EXPECT_EQ(sets[1].widest, beams[0].polarization);
    // A tabulated window may change its sign; a channel's place in the list must not matter.
    std::vector<BeamWindow> signs{make_tabulated_beam(std::vector<double>(17, -0.5)),
                                  make_tabulated_beam(std::vector<double>(17, 0.2))};
    EXPECT_EQ(collect_windows(signs)[0].widest, std::vector<double>(17, 0.5));
    std::swap(signs[0], signs[1]);
    EXPECT_EQ(collect_windows(signs)[0].widest, std::vector<double>(17, 0.5));
}

TEST(CollectWindows, ThinsALongListButKeepsItsEnds) {
    std::vector<BeamWindow> beams;
    for (int k = 0; k < 100; ++k)
        beams.push_back(make_gaussian_beam(Angle::from_degrees(1 + 0.1 * k), 16));
    const auto set = collect_windows(beams)[0];
    EXPECT_EQ(set.all.size(), 32U);
    EXPECT_EQ(set.all.back(), beams.front().temperature);
    EXPECT_EQ(set.all.front(), beams.back().temperature);
}

}  // namespace
}  // namespace foreglow
