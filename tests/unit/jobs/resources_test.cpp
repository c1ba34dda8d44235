// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/resources.h"

#include <gtest/gtest.h>

#include "jobs/plan.h"
#include "support/run_folder.h"

namespace foreglow {
namespace {

TEST(Resources, AreWhatTheMachineHas) {
    const testing::TemporaryFolder folder;
    const Resources here = available_resources(folder.path());
    EXPECT_GT(here.memory_bytes, std::int64_t{10} << 20U);
    EXPECT_LT(here.memory_bytes, std::int64_t{1} << 50U);
    EXPECT_GT(here.disk_bytes, 0);
    // A folder that is not there yet is judged by the one that will hold it; other processes write meanwhile.
    const Resources later = available_resources(folder / "a" / "b");
    EXPECT_NEAR(static_cast<double>(later.disk_bytes), static_cast<double>(here.disk_bytes),
                0.2 * static_cast<double>(here.disk_bytes) + 1e9);
    EXPECT_GT(available_resources("relative/none").disk_bytes, 0);
}

Plan plan_for(int nside, bool beams, bool polarized = false) {
    Plan plan;
    plan.study = testing::study_spec(nside, {testing::channel_spec("a", 30, 0, beams ? 5 : 0)}, polarized);
    plan.channels = make_channels(plan.study);
    plan.per_pixel = {!beams};
    plan.model_maps.held_values = 3 * HealpixGrid(nside).npix();
    estimate_costs(plan);
    return plan;
}

TEST(Costs, GrowWithTheWork) {
    EXPECT_GT(plan_for(256, false).memory_bytes, 3 * 8 * HealpixGrid(256).npix());
    EXPECT_GT(plan_for(512, false).memory_bytes, plan_for(256, false).memory_bytes);
    EXPECT_GT(plan_for(256, true).memory_bytes, plan_for(256, false).memory_bytes);
    EXPECT_GT(plan_for(256, true, true).memory_bytes, plan_for(256, true).memory_bytes);
    EXPECT_GT(plan_for(256, true).seconds, plan_for(256, false).seconds);
    EXPECT_GT(plan_for(512, true).seconds,
              4 * plan_for(256, true).seconds);  // transforms grow as nside^3, less the fixed part
}

}  // namespace
}  // namespace foreglow
