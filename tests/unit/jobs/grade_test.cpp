// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/grade.h"

#include <gtest/gtest.h>

#include "base/error.h"
#include "jobs/temporary_run.h"
#include "support/messages.h"
#include "support/run_folder.h"

namespace foreglow {
namespace {

namespace fs = std::filesystem;
using testing::has;
using testing::message_of;

class GradeJob : public ::testing::Test {
  protected:
    [[nodiscard]] GradeOptions options(const std::string& source) const {
        GradeOptions out;
        out.source = run_ / source;
        out.format = RowFormat::Csv;
        return out;
    }
    testing::RunFolder run_;
};

TEST_F(GradeJob, GradesARunAndKeepsItInTheRun) {
    run_.write_study();
    run_.make();
    Progress progress;
    const std::string rows = run_grade(options("out"), progress).rows;
    EXPECT_EQ(rows.rfind("channel,frequency_Hz,terms,rms,mean,p95,unit,pixels,rms_K_RJ\nlow,1e+09,1,", 0), 0U)
        << rows;
    EXPECT_EQ(run_.files("out/grade"),
              (std::set<std::string>{"high.fits", "low.fits", "rows.csv", "run.json", "spectra.csv"}));
    EXPECT_TRUE(
        has(message_of<InputError>([&] { return run_grade(options("out"), progress); }), "--replace"));
}

TEST_F(GradeJob, GradesAStudyAndLeavesNothing) {
    run_.write_study();
    const auto before = run_.files("");
    Progress progress;
    EXPECT_TRUE(has(run_grade(options("study.toml"), progress).rows, "\nhigh,3e+10,1,"));
    EXPECT_EQ(run_.files(""), before);
}

TEST_F(GradeJob, OfARunAgainstItselfLeavesZero) {
    run_.write_study();
    run_.make();
    GradeOptions request = options("out");
    request.recovered = {run_ / "out/maps/low.fits"};
    request.cuts = {0};
    Progress progress;
    const std::string rows = run_grade(request, progress).rows;
    EXPECT_TRUE(has(rows, "\nlow,I_STOKES,1e+09,0,,,768,0,0,0,0,0,")) << rows;
}

TEST_F(GradeJob, RefusesWhatIsNoRun) {
    run_.write_study();
    run_.make();
    run_.write("run.json", "{\"program\": \"Foreglow\", \"command\": \"index\"}");
    Progress progress;
    EXPECT_TRUE(
        has(message_of<InputError>([&] { return run_grade(options("."), progress); }), "holds no study"));
    GradeOptions request = options("out");
    request.terms = "2";
    EXPECT_TRUE(has(message_of<InputError>([&] { return run_grade(request, progress); }), "at most 1"));
    EXPECT_FALSE(fs::exists(run_ / "out/grade"));
}

TEST(TemporaryRun, IsGoneAfterwards) {
    fs::path path;
    {
        const TemporaryRun run;
        path = run.path();
        fs::create_directories(path / "run/maps");
        EXPECT_TRUE(fs::exists(path));
    }
    EXPECT_FALSE(fs::exists(path));
}

}  // namespace
}  // namespace foreglow
