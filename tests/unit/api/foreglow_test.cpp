// SPDX-License-Identifier: GPL-2.0-or-later
#include "api/foreglow.h"

#include <gtest/gtest.h>

#include <cmath>

#include "support/messages.h"
#include "support/temporary_folder.h"
#include "support/threads.h"

namespace foreglow {
namespace {

using testing::has;
using testing::message_of;

constexpr const char* study = R"(model = "quick-sketch"
nside = 8
lmax = 24
[[channel]]
name = "low"
frequency = "70 GHz"
)";

TEST(Api, MakesTheMapsOfAStudyAndPrintsNothing) {
    const testing::Threads keep(1);
    const testing::TemporaryFolder folder;
    testing::write_whole_file(folder / "s.toml", study);
    api::RunOptions options;
    options.out = folder / "run";
    options.overrides = {"unit=uK_CMB"};
    options.threads = 2;
    ::testing::internal::CaptureStderr();
    ::testing::internal::CaptureStdout();
    const api::RunResult result = api::make_maps(folder / "s.toml", options);
    EXPECT_EQ(::testing::internal::GetCapturedStderr(), "");
    EXPECT_EQ(::testing::internal::GetCapturedStdout(), "");
    EXPECT_EQ(result.out, folder / "run");
    EXPECT_TRUE(std::filesystem::exists(folder / "run/maps/low.fits"));
    EXPECT_TRUE(has(testing::read_whole_file(folder / "run/maps/low.fits"), "uK_CMB"));
    ASSERT_FALSE(result.warnings.empty());
    EXPECT_TRUE(has(result.warnings[0], "above 2.5 nside"));
    EXPECT_THROW((void)api::make_maps(folder / "s.toml", options), InputError) << "the folder is not empty";
    options.replace = true;
    EXPECT_NO_THROW((void)api::make_maps(folder / "s.toml", options));
}

TEST(Api, PlansWithoutLeavingAnything) {
    const testing::Threads keep(1);
    const testing::TemporaryFolder folder;
    testing::write_whole_file(folder / "s.toml", study);
    api::RunOptions options;
    options.out = folder / "run";
    EXPECT_TRUE(has(api::plan_maps(folder / "s.toml", options), "maps/low.fits"));
    EXPECT_EQ(folder.names(), std::set<std::string>{"s.toml"});
}

TEST(Api, SaysWhatIsWrong) {
    const testing::Threads keep(1);
    const testing::TemporaryFolder folder;
    EXPECT_TRUE(
        has(message_of<InputError>([&] { return api::make_maps(folder / "none.toml"); }), "none.toml"));
    testing::write_whole_file(folder / "s.toml", study);
    api::RunOptions options;
    options.threads = 0;
    EXPECT_TRUE(has(message_of<InputError>([&] { return api::plan_maps(folder / "s.toml", options); }),
                    "give 1 or more"));
}

TEST(Api, BrightnessRatioIsTheCurvedPowerLaw) {
    const Frequency low = Frequency::from_hz(408e6), high = Frequency::from_ghz(23);
    EXPECT_NEAR(api::brightness_ratio(high, low, -3) / std::pow(23e9 / 408e6, -3.0), 1, 1e-14);
    const double x = std::log(23e9 / 408e6);
    EXPECT_NEAR(api::brightness_ratio(high, low, -2.7, -0.05) / std::pow(23e9 / 408e6, -2.7 - 0.05 * x), 1,
                1e-13);
    EXPECT_EQ(api::brightness_ratio(low, low, -2.7, -0.05), 1.0);
    EXPECT_EQ(testing::count_of(api::library_version(), "."), 2);
}

}  // namespace
}  // namespace foreglow
