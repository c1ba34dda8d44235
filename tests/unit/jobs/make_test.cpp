// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/make.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/error.h"
#include "io/fits_map_read.h"
#include "support/messages.h"
#include "support/run_folder.h"
#include "support/threads.h"

namespace foreglow {
namespace {

namespace fs = std::filesystem;
using testing::has;
using testing::message_of;
using testing::RunFolder;

FitsMap read(const fs::path& path, int columns) {
    FitsMapRequest request;
    request.path = path;
    for (int c = 1; c <= columns; ++c)
        request.columns.emplace_back(c);
    return read_fits_map(request);
}

// Every file of a run but those that tell times.
std::map<std::string, std::string> bytes_of(const RunFolder& folder, const std::string& out) {
    std::map<std::string, std::string> bytes;
    for (const std::string& name : folder.files(out))
        if (name.ends_with(".fits")) bytes[name] = testing::read_whole_file(folder / out / name);
    return bytes;
}

double law(double ghz, std::size_t pixel, double index_shift = 0) {
    const Vector3 n = HealpixGrid(8).direction(static_cast<std::int64_t>(pixel));
    const double x = std::log(ghz / 0.408);
    return std::exp(x * (testing::test_index(n) + index_shift - 0.03 * x));
}

TEST(Make, LeavesMapsThatAreTheLaw) {
    const RunFolder folder;
    folder.write_study("stokes = \"IQU\"\nprecision = \"float64\"\n");
    const MakeSummary summary = folder.make();
    EXPECT_EQ(summary.out, folder / "out");
    EXPECT_TRUE(has(summary.text, "2 channels, nside 8, I Q U, K_RJ, galactic"));
    EXPECT_TRUE(has(summary.text, "run.json"));
    const FitsMap map = read(folder / "out/maps/low.fits", 3);
    EXPECT_EQ(map.columns[0].unit, "K_RJ");
    for (std::size_t p = 0; p < 768; ++p) {
        const Vector3 n = HealpixGrid(8).direction(static_cast<std::int64_t>(p));
        EXPECT_NEAR(map.columns[0].values[p] / (testing::test_brightness(n) * law(1, p)), 1,
                    1e-6);  // issue: 1e-6 of the pixel
        EXPECT_NEAR(map.columns[1].values[p], testing::test_q(n) * law(1, p), 1e-6);
        EXPECT_NEAR(map.columns[2].values[p], testing::test_u(n) * law(1, p), 1e-6);
    }
    const FitsMap amplitude = read(folder / "out/truth/amplitude.fits", 3),
                  index = read(folder / "out/truth/index.fits", 1);
    for (std::size_t p = 0; p < 768; ++p) {
        const Vector3 n = HealpixGrid(8).direction(static_cast<std::int64_t>(p));
        EXPECT_NEAR(amplitude.columns[0].values[p] / testing::test_brightness(n), 1, 1e-14);
        EXPECT_NEAR(index.columns[0].values[p] / testing::test_index(n), 1, 1e-14);
    }
}

TEST(Make, BytesNeverDependOnTheThreads) {
    const RunFolder folder;
    folder.write_study("stokes = \"IQU\"\nframe = \"icrs\"\ntruth = \"full\"\nmonopole = \"remove\"\n");
    std::map<std::string, std::string> before;
    for (const int threads : {1, 2, 4}) {
        const testing::Threads set(threads);
        folder.make("out", true);
        const auto bytes = bytes_of(folder, "out");
        EXPECT_EQ(bytes.size(), 7U);
        EXPECT_TRUE(threads == 1 || bytes == before);
        before = bytes;
    }
}

TEST(Make, RemovesTheMonopoleWhenAsked) {
    const RunFolder folder;
    folder.write_study("precision = \"float64\"\n");
    folder.make("with");
    folder.make("without", false, {"monopole=remove"});
    for (const char* name : {"maps/low.fits", "maps/high.fits"}) {
        const auto with = read(folder / "with" / name, 1).columns[0].values,
                   without = read(folder / "without" / name, 1).columns[0].values;
        double sum = 0;
        for (const double value : with)
            sum += value;
        for (std::size_t p = 0; p < 768; ++p)
            EXPECT_NEAR(without[p], with[p] - sum / 768, 1e-12 * std::abs(sum));
    }
}

TEST(Make, UndefinedPixelsAndCoverageComeThrough) {
    const RunFolder folder;
    auto t = testing::sample(HealpixGrid(8), testing::test_brightness);
    t[100] = std::nan("");
    testing::fits_map(8, {t}, "K_RJ").write(folder / "survey.fits");
    std::vector<double> wanted(768, 0.0);
    for (std::size_t p = 90; p < 110; ++p)
        wanted[p] = 1;
    testing::fits_map(8, {wanted}).write(folder / "cover.fits");
    folder.write(
        "model.toml",
        "reference_frequency = \"408 MHz\"\n[intensity]\nmap = \"survey.fits\"\n[index]\nvalue = -2.8\n");
    folder.write_study("coverage = \"cover.fits\"\n");
    folder.make();
    FitsMapRequest request;
    request.path = folder / "out/maps/low.fits";
    request.columns = {"I_STOKES"};
    const FitsMap map = read_fits_map(request);
    EXPECT_TRUE(map.partial);
    for (std::size_t p = 0; p < 768; ++p)
        EXPECT_EQ(is_defined(map.columns[0].values[p]), p >= 90 && p < 110 && p != 100);
}

TEST(Make, RealizationZeroIsTheSingleRun) {
    const RunFolder folder;
    folder.write_study();
    folder.make("single");
    folder.make("several", false, {"realizations=2"});
    EXPECT_EQ(read(folder / "single/maps/low.fits", 1).columns[0].values,
              read(folder / "several/maps/low_r0000.fits", 1).columns[0].values);
}

// Errors at several stages: at a map, at a truth map, at the report, at the manifest (whose place a folder
// takes).
TEST(Make, AnErrorInTheMiddleLeavesNothing) {
    for (const char* obstacle :
         {"maps/low.fits", "maps/high.fits", "truth/curvature.fits", "report.html", "run.json"}) {
        const RunFolder folder;
        folder.write_study("stokes = \"IQU\"\n");
        fs::create_directories(folder / "out" / obstacle / "in the way");
        EXPECT_THROW(folder.make("out", true), FileError) << obstacle;
        EXPECT_TRUE(folder.files().empty()) << obstacle << " left " << *folder.files().begin();
        EXPECT_TRUE(fs::is_directory(folder / "out" / obstacle / "in the way"));
    }
}

TEST(Make, AFileWhereTheFolderShouldBeIsRefusedAndKept) {
    const RunFolder folder;
    folder.write_study();
    folder.write("out", "precious");
    EXPECT_THROW(folder.make("out", true), InputError);
    EXPECT_EQ(testing::read_whole_file(folder / "out"), "precious");
    EXPECT_THROW(folder.make("out/below"), Error);
    EXPECT_EQ(testing::read_whole_file(folder / "out"), "precious");
}

TEST(Make, ABrokenTemplateLeavesNothing) {
    const RunFolder folder;
    folder.write_study();
    testing::fits_map(8, {std::vector<double>(768, std::nan(""))}, "K_RJ").write(folder / "survey.fits");
    EXPECT_THROW(folder.make("out", false, {"nside=16"}), DataError);
    EXPECT_FALSE(fs::exists(folder / "out"));
}

TEST(Make, ReplaceTakesTheEarlierRunAwayAndKeepsTheRest) {
    const RunFolder folder;
    folder.write_study("stokes = \"IQU\"\n");
    folder.make();
    folder.write("out/maps/mine.txt", "mine");
    EXPECT_THROW(folder.make(), InputError);
    folder.make("out", true, {"truth=false", "realizations=2"});
    EXPECT_EQ(folder.files(),
              (std::set<std::string>{"maps/low_r0000.fits", "maps/low_r0001.fits", "maps/high_r0000.fits",
                                     "maps/high_r0001.fits", "maps/mine.txt", "report.html", "run.json"}));
    EXPECT_FALSE(fs::exists(folder / "out/truth"));
}

// Replacing a run whose map is the new model's template would take the template away.
TEST(Make, ReplaceNeverRemovesItsOwnInput) {
    const RunFolder folder;
    folder.write_study();
    folder.make();
    folder.write(
        "again.toml",
        "reference_frequency = \"1 GHz\"\n[intensity]\nmap = \"out/maps/low.fits\"\n[index]\nvalue = -2.8\n");
    const std::string before = testing::read_whole_file(folder / "out/maps/low.fits");
    const std::string message = message_of<InputError>(
        [&] { return folder.make("out", true, {"model=" + (folder / "again.toml").string()}); });
    EXPECT_TRUE(has(message, "low.fits")) << message;
    EXPECT_EQ(testing::read_whole_file(folder / "out/maps/low.fits"), before);
    EXPECT_TRUE(fs::exists(folder / "out/run.json"));
}

}  // namespace
}  // namespace foreglow
