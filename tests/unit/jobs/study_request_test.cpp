// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/study_request.h"

#include <gtest/gtest.h>

#include "base/error.h"
#include "support/messages.h"
#include "support/run_folder.h"

namespace foreglow {
namespace {

using testing::has;
using testing::message_of;

TEST(StudyRequest, ReadsAFileWithItsOverrides) {
    const testing::RunFolder folder;
    folder.write_study();
    StudyRequest request;
    request.study = folder / "study.toml";
    request.options.overrides = {"nside=16", "unit=MJy/sr"};
    request.out = folder / "x";
    request.realization = 0;
    request.replace = true;
    const PlanRequest plan = make_plan_request(request);
    EXPECT_EQ(plan.study.nside, 16);
    EXPECT_EQ(to_text(plan.study.unit), "MJy/sr");
    EXPECT_EQ(plan.study.channels.size(), 2U);
    EXPECT_EQ(plan.out, folder / "x");
    EXPECT_EQ(plan.realization, 0);
    EXPECT_TRUE(plan.replace);
}

TEST(StudyRequest, MakesAStudyFromOptions) {
    StudyRequest request;
    request.options.model = "disc-and-loops";
    request.options.frequencies = {"70 GHz", "100 GHz"};
    request.options.nside = 16;
    const PlanRequest plan = make_plan_request(request);
    EXPECT_EQ(plan.study.channels.size(), 2U);
    EXPECT_FALSE(plan.out || plan.realization || plan.replace);
}

TEST(StudyRequest, NeedsOneOfTheTwo) {
    EXPECT_TRUE(has(message_of<InputError>([] { return make_plan_request({}); }),
                    "name a study file, or say what to make"));
    const testing::RunFolder folder;
    folder.write_study();
    // Every option that stands for a key contradicts a file; a file's keys are changed with --set.
    const std::vector<std::function<void(StudyOptions&)>> all{
        [](StudyOptions& o) { o.model = "x"; },
        [](StudyOptions& o) { o.frequencies = {"1 GHz"}; },
        [](StudyOptions& o) { o.title = "x"; },
        [](StudyOptions& o) { o.nside = 4; },
        [](StudyOptions& o) { o.stokes = "I"; },
        [](StudyOptions& o) { o.unit = "K_RJ"; },
        [](StudyOptions& o) { o.precision = "float32"; },
        [](StudyOptions& o) { o.frame = "icrs"; },
        [](StudyOptions& o) { o.ordering = "ring"; },
        [](StudyOptions& o) { o.polarization_convention = "IAU"; },
        [](StudyOptions& o) { o.monopole = "keep"; },
        [](StudyOptions& o) { o.coverage = "x"; },
        [](StudyOptions& o) { o.bandwidth = "1 GHz"; },
        [](StudyOptions& o) { o.beam_fwhm = "1 deg"; },
        [](StudyOptions& o) { o.lmax = 4; },
        [](StudyOptions& o) { o.seed = 1; },
        [](StudyOptions& o) { o.realizations = 2; },
        [](StudyOptions& o) { o.accuracy = 1e-4; },
        [](StudyOptions& o) { o.truth = "full"; }};
    for (const auto& set : all) {
        StudyRequest request;
        request.study = folder / "study.toml";
        set(request.options);
        EXPECT_TRUE(has(message_of<InputError>([&] { return make_plan_request(request); }),
                        "contradict each other: change the file's keys with --set"));
    }
}

}  // namespace
}  // namespace foreglow
