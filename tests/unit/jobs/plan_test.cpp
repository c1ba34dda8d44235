// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/plan.h"

#include <gtest/gtest.h>

#include "base/error.h"
#include "support/messages.h"
#include "support/run_folder.h"

namespace foreglow {
namespace {

using testing::has;
using testing::message_of;
using testing::RunFolder;

std::set<std::string> planned(const Plan& plan) {
    std::set<std::string> names;
    for (const PlannedFile& file : plan.files)
        names.insert(file.name);
    return names;
}

TEST(Plan, SaysWhatWillBeMadeAndLeavesNothing) {
    const RunFolder folder;
    folder.write_study("stokes = \"IQU\"\n");
    const Plan plan = make_plan(folder.request());
    EXPECT_EQ(plan.channels.size(), 2U);
    EXPECT_EQ(plan.per_pixel, (std::vector<bool>{true, false}));
    EXPECT_EQ(plan.realizations, std::vector<int>{0});
    EXPECT_EQ(plan.model_maps.frame, Frame::Galactic);
    EXPECT_FALSE(std::filesystem::exists(folder / "out"));
    const std::string text = describe_plan(plan);
    for (const char* part :
         {"Test", "Invented test sky", "nside 8, galactic, RING, full sky", "I, Q, U (COSMO)",
          "K_RJ, float32", "2: 1 by the law in each pixel, 1 through a_lm up to l = 16", "maps/low.fits",
          "maps/high.fits", "truth/index.fits", "report.html", "run.json", "0.0001 asked for"})
        EXPECT_TRUE(has(text, part)) << part << "\n" << text;
}

// The promise of `plan`: just these files.
TEST(Plan, FilesAndSizesAreThoseThatMakeLeaves) {
    const RunFolder folder;
    folder.write_study("stokes = \"IQU\"\ntruth = \"full\"\n");
    for (const auto& overrides : {std::vector<std::string>{},
                                  {"stokes=I", "truth=false"},
                                  {"precision=float64", "realizations=2", "ordering=nested"}}) {
        const Plan plan = make_plan(folder.request("out", true, overrides));
        folder.make("out", true, overrides);
        EXPECT_EQ(planned(plan), folder.files());
        std::int64_t bytes = 0;
        for (const PlannedFile& file : plan.files) {
            if (file.bytes == 0) continue;
            // The cards of the sky are not known before it is loaded: they may fill two more blocks of 2880
            // bytes.
            const auto size =
                static_cast<std::int64_t>(std::filesystem::file_size(folder / "out" / file.name));
            EXPECT_GE(size, file.bytes) << file.name;
            EXPECT_LE(size, file.bytes + 5760) << file.name;
            bytes += file.bytes;
        }
        EXPECT_EQ(plan.disk_bytes, bytes);
    }
}

TEST(Plan, NamesRealizationsAndPicksOne) {
    const RunFolder folder;
    folder.write_study("realizations = 3\n");
    PlanRequest request = folder.request();
    const Plan all = make_plan(request);
    EXPECT_EQ(all.realizations, (std::vector<int>{0, 1, 2}));
    EXPECT_EQ(map_stem(all, "low", 2), "low_r0002");
    EXPECT_TRUE(planned(all).contains("maps/low_r0000.fits"));
    request.realization = 1;
    EXPECT_EQ(make_plan(request).realizations, std::vector<int>{1});
    for (const int wrong : {-1, 3}) {
        request.realization = wrong;
        EXPECT_TRUE(has(message_of<InputError>([&] { return make_plan(request); }),
                        "the study has realizations 0 to 2"));
    }
    folder.write_study();
    EXPECT_EQ(map_stem(make_plan(folder.request()), "low", 0), "low");
}

TEST(Plan, PassesEveryWarningOn) {
    const RunFolder folder;
    folder.write("flux.toml",
                 "reference_frequency = \"408 MHz\"\n[intensity]\nmap = \"survey.fits\"\nbeam_fwhm = \"20 "
                 "deg\"\n[index]\nvalue = -0.8\n");
    folder.write_study();
    const Plan plan =
        make_plan(folder.request("out", false, {"lmax=24", "model=" + (folder / "flux.toml").string()}));
    const auto warned = [&](const char* part) {
        return std::any_of(plan.warnings.begin(), plan.warnings.end(),
                           [&](const std::string& w) { return has(w, part); });
    };
    EXPECT_TRUE(warned("above 2.5 nside"));
    EXPECT_TRUE(warned("if it is a flux index, write index = -2.8"));
    EXPECT_TRUE(warned("channel high: its beam of 15 deg is narrower than 2.5 pixels"));
    EXPECT_TRUE(warned("channel high: its beam of 15 deg is finer than the template's 20 deg"));
    EXPECT_TRUE(has(describe_plan(plan), "warning    "));
    folder.write_study();
    EXPECT_EQ(make_plan(folder.request("out", false, {"nside=16"})).warnings.size(), 0U);
}

TEST(Plan, RefusesPolarizationFromAModelWithout) {
    const RunFolder folder;
    folder.write(
        "plain.toml",
        "reference_frequency = \"408 MHz\"\n[intensity]\nmap = \"survey.fits\"\n[index]\nvalue = -2.8\n");
    folder.write_study("stokes = \"IQU\"\n");
    const std::string message = message_of<InputError>([&] {
        return make_plan(folder.request("out", false, {"model=" + (folder / "plain.toml").string()}));
    });
    EXPECT_TRUE(
        has(message, "the model plain has no [polarization]: add one to the model, or set `stokes = \"I\"`"))
        << message;
}

TEST(Plan, AsksWhatTheHeadersLeaveOpen) {
    const RunFolder folder;
    folder.write_study();
    testing::fits_map(8, {std::vector<double>(768, 1)}).write(folder / "survey.fits");
    const std::string message = message_of<InputError>([&] { return make_plan(folder.request()); });
    EXPECT_TRUE(has(message, "model.toml:4:7: the map survey.fits does not say its unit")) << message;
}

TEST(Plan, RefusesWhatCannotFit) {
    const RunFolder folder;
    folder.write_study();
    const std::string message = message_of<InputError>([&] {
        return make_plan(folder.request("out", false, {"nside=8192", "lmax=16384", "stokes=IQU"}));
    });
    EXPECT_TRUE(has(message, " are free") && has(message, "GiB")) << message;
    const Plan plan = make_plan(folder.request());
    EXPECT_GT(plan.memory_bytes, 0);
    EXPECT_GT(plan.seconds, 0);
}

TEST(Plan, ReadsTheCoverage) {
    const RunFolder folder;
    std::vector<double> wanted(768, 0.0);
    wanted[5] = wanted[700] = 1;
    testing::fits_map(8, {wanted}).write(folder / "cover.fits");
    folder.write_study("coverage = \"cover.fits\"\n");
    const Plan plan = make_plan(folder.request());
    EXPECT_EQ(plan.coverage->ring_pixels, (std::vector<std::int64_t>{5, 700}));
    EXPECT_TRUE(has(describe_plan(plan), "partial sky: 2 pixels"));
    EXPECT_THROW((void)make_plan(folder.request("out", false, {"nside=16"})), InputError);
}

}  // namespace
}  // namespace foreglow
