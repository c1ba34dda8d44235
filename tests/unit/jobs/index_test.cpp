// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/index.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/error.h"
#include "io/fits_map_read.h"
#include "io/json_value.h"
#include "support/messages.h"
#include "support/sky_builder.h"

namespace foreglow {
namespace {

namespace fs = std::filesystem;
using testing::fits_map;
using testing::has;
using testing::message_of;

class IndexJob : public ::testing::Test {
  protected:
    IndexJob() {
        const HealpixGrid grid(8);
        const auto survey = [&](double ratio) {
            return testing::sample(grid, [&](const Vector3& n) {
                return testing::test_brightness(n) * std::pow(ratio, testing::test_index(n));
            });
        };
        fits_map(8, {survey(1)}, "K_RJ").write(folder_ / "a.fits");
        fits_map(8, {survey(3)}, "K_RJ").write(folder_ / "b.fits");
        write(
            "reference_frequency = \"1 GHz\"\nnside = 8\nbeam_fwhm = \"8 deg\"\n"
            "[[survey]]\nmap = \"a.fits\"\nfrequency = \"1 GHz\"\nbeam_fwhm = \"8 deg\"\nnoise = \"1e-6 "
            "K_RJ\"\n"
            "[[survey]]\nmap = \"b.fits\"\nfrequency = \"3 GHz\"\nbeam_fwhm = \"8 deg\"\nnoise = \"1e-6 "
            "K_RJ\"\n");
    }
    void write(const std::string& text) const { testing::write_whole_file(folder_ / "surveys.toml", text); }
    [[nodiscard]] IndexOptions options(bool replace = false) const {
        IndexOptions out;
        out.surveys = folder_ / "surveys.toml";
        out.out = folder_ / "out";
        out.replace = replace;
        out.format = RowFormat::Csv;
        return out;
    }
    testing::TemporaryFolder folder_;
};

TEST_F(IndexJob, LeavesMapsThatHoldTheLaw) {
    Progress progress;
    const IndexSummary summary = run_index(options(), progress);
    EXPECT_EQ(summary.out, folder_ / "out");
    EXPECT_TRUE(has(summary.rows,
                    "quantity,unit,low_Hz,high_Hz,pixels,value,scatter,error\nindex,1,1e+09,"
                    "3e+09,768,"))
        << summary.rows;
    FitsMapRequest request;
    request.path = folder_ / "out/index.fits";
    request.columns = {std::string("INDEX")};
    const FitsMap map = read_fits_map(request);
    for (std::int64_t p = 0; p < map.grid.npix(); ++p)
        EXPECT_NEAR(map.columns[0].values[static_cast<std::size_t>(p)],
                    testing::test_index(map.grid.direction(p)),
                    3e-7);  // float32 of a number near 3
    EXPECT_TRUE(fs::exists(folder_ / "out/scatter.csv"));
    const JsonValue manifest = read_json(folder_ / "out/run.json");
    ASSERT_NE(manifest.find("outputs"), nullptr);
    EXPECT_EQ(manifest.find("outputs")->array()->size(), 3U);
}

TEST_F(IndexJob, RefusesAFolderInUseUnlessItMayReplace) {
    Progress progress;
    static_cast<void>(run_index(options(), progress));
    EXPECT_TRUE(has(message_of<InputError>([&] { return run_index(options(), progress); }), "--replace"));
    EXPECT_NO_THROW(static_cast<void>(run_index(options(true), progress)));
}

TEST_F(IndexJob, DoesNotReplaceWhatItReads) {
    Progress progress;
    static_cast<void>(run_index(options(), progress));
    write(
        "reference_frequency = \"1 GHz\"\nnside = 8\nbeam_fwhm = \"8 deg\"\n"
        "[[survey]]\nmap = \"out/amplitude.fits\"\nfrequency = \"1 GHz\"\nbeam_fwhm = \"8 deg\"\nnoise = \"1 "
        "K_RJ\"\n"
        "[[survey]]\nmap = \"b.fits\"\nfrequency = \"3 GHz\"\nbeam_fwhm = \"8 deg\"\nnoise = \"1 K_RJ\"\n");
    EXPECT_TRUE(
        has(message_of<InputError>([&] { return run_index(options(true), progress); }), "another folder"));
    EXPECT_TRUE(fs::exists(folder_ / "out/amplitude.fits"));
}

TEST_F(IndexJob, LeavesNothingWhereNoPixelHasAnAnswer) {
    fits_map(8, {std::vector<double>(768, -1.0)}, "K_RJ").write(folder_ / "b.fits");
    Progress progress;
    const std::string message = message_of<InputError>([&] { return run_index(options(), progress); });
    EXPECT_TRUE(has(message, "768 of 768 pixels are undefined: 768 are not positive")) << message;
    EXPECT_FALSE(fs::exists(folder_ / "out"));
}

}  // namespace
}  // namespace foreglow
