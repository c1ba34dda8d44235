// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/draw.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/error.h"
#include "io/fits_map_write.h"
#include "sphere/sky_map.h"
#include "support/temporary_folder.h"

namespace foreglow {
namespace {

/// Writes a map of I and Q, nside 8, whose first pixel is undefined.
std::filesystem::path write_map(const testing::TemporaryFolder& folder, const std::string& unit = "K_RJ") {
    const HealpixGrid grid(8);
    std::vector<double> i, q;
    for (std::int64_t p = 0; p < grid.npix(); ++p) {
        const Vector3 v = grid.direction(p);
        i.push_back(1 / (std::abs(v[2]) + 0.01));
        q.push_back(v[0] * v[1]);
    }
    i[0] = undefined_pixel;
    FitsMapLayout layout;
    layout.nside = 8;
    layout.convention = PolarizationConvention::Cosmo;
    layout.columns = {{"I_STOKES", unit}, {"Q_STOKES", unit}};
    const std::vector<std::span<const double>> columns{i, q};
    write_fits_map(folder / "low.fits", layout, columns);
    return folder / "low.fits";
}

DrawOptions make_options(const testing::TemporaryFolder& folder) {
    DrawOptions options;
    options.map = write_map(folder);
    options.output = folder / "low.png";
    options.width = 300;
    return options;
}

std::string message_of(const DrawOptions& options) {
    try {
        (void)run_draw(options);
    } catch (const InputError& error) {
        return error.what();
    }
    return "no error";
}

bool mentions(const std::string& text, const std::string& part) {
    return text.find(part) != std::string::npos;
}

TEST(Draw, WritesAPngOfTheWholeSkyAndOfACloseUp) {
    const testing::TemporaryFolder folder;
    DrawOptions options = make_options(folder);
    const DrawResult result = run_draw(options);
    EXPECT_EQ(result.picture, folder / "low.png");
    EXPECT_EQ(result.width, 300);
    EXPECT_TRUE(testing::read_whole_file(result.picture).starts_with("\x89PNG\r\n"));
    options.output = folder / "close.png";
    options.center = {{10.0, -5.0}};
    options.size = Angle::from_degrees(20);
    EXPECT_GT(run_draw(options).height, 300);
    EXPECT_EQ(folder.names(), (std::set<std::string>{"low.fits", "low.png", "close.png"}));
}

TEST(Draw, TakesColumnsByNumberAndByName) {
    const testing::TemporaryFolder folder;
    DrawOptions options = make_options(folder);
    options.title = "same";
    options.column = "2";
    (void)run_draw(options);
    options.output = folder / "named.png";
    options.column = "q_stokes";
    (void)run_draw(options);
    EXPECT_EQ(testing::read_whole_file(folder / "low.png"), testing::read_whole_file(folder / "named.png"));
    options.output = folder / "first.png";
    options.column.reset();
    (void)run_draw(options);
    EXPECT_NE(testing::read_whole_file(folder / "low.png"), testing::read_whole_file(folder / "first.png"));
}

TEST(Draw, KeepsAnExistingPictureUnlessToldOtherwise) {
    const testing::TemporaryFolder folder;
    DrawOptions options = make_options(folder);
    testing::write_whole_file(folder / "low.png", "mine");
    EXPECT_TRUE(mentions(message_of(options), "exists already"));
    EXPECT_EQ(testing::read_whole_file(folder / "low.png"), "mine");
    options.replace = true;
    (void)run_draw(options);
    EXPECT_NE(testing::read_whole_file(folder / "low.png"), "mine");
}

TEST(Draw, RescalesUnitsOfOneKindAndRefusesOthers) {
    const testing::TemporaryFolder folder;
    DrawOptions options = make_options(folder);
    options.unit = "uK_RJ";
    options.low = 1e6;
    options.high = 1e8;
    options.title = "same";
    options.scale = "log";
    EXPECT_TRUE(run_draw(options).notices.empty());
    options.output = folder / "wrong.png";
    options.unit = "uK_CMB";
    EXPECT_TRUE(mentions(message_of(options), "K_RJ, which a picture cannot turn into uK_CMB"));
    EXPECT_FALSE(std::filesystem::exists(folder / "wrong.png"));
}

TEST(Draw, SaysThatTheFileLeavesItsUnitOpen) {
    const testing::TemporaryFolder folder;
    DrawOptions options = make_options(folder);
    write_map(folder, "");
    const DrawResult result = run_draw(options);
    ASSERT_EQ(result.notices.size(), 1U);
    EXPECT_TRUE(mentions(result.notices[0], "no unit for column I_STOKES"));
    options.unit = "K_RJ";
    options.replace = true;
    EXPECT_TRUE(run_draw(options).notices.empty());
}

TEST(Draw, SaysWhatALogScaleCannotShow) {
    const testing::TemporaryFolder folder;
    DrawOptions options = make_options(folder);
    options.column = "Q_STOKES";
    options.scale = "log";
    const DrawResult result = run_draw(options);
    ASSERT_EQ(result.notices.size(), 1U);
    EXPECT_TRUE(mentions(result.notices[0], "zero or negative"));
}

TEST(Draw, RefusesWrongRequestsAndLeavesNothingBehind) {
    const testing::TemporaryFolder folder;
    const DrawOptions good = make_options(folder);
    const auto with = [&](auto change) {
        DrawOptions options = good;
        change(options);
        return message_of(options);
    };
    EXPECT_TRUE(mentions(with([&](DrawOptions& o) { o.output = folder / "low.pdf"; }), "ends in .png"));
    EXPECT_TRUE(mentions(with([&](DrawOptions& o) { o.output = folder / "no/low.png"; }), "does not exist"));
    EXPECT_TRUE(mentions(with([](DrawOptions& o) { o.center = {{1.0, 2.0}}; }), "needs its size"));
    EXPECT_TRUE(mentions(with([](DrawOptions& o) { o.size = Angle::from_degrees(3); }), "needs its centre"));
    EXPECT_TRUE(mentions(with([](DrawOptions& o) { o.scale = "cubic"; }), "linear, log or signed"));
    EXPECT_TRUE(mentions(with([](DrawOptions& o) { o.low = 3, o.high = 2; }), "empty"));
    EXPECT_TRUE(mentions(with([](DrawOptions& o) { o.low = std::nan(""); }), "finite"));
    EXPECT_TRUE(mentions(with([](DrawOptions& o) { o.width = 10; }), "300 to 8000"));
    EXPECT_TRUE(mentions(with([](DrawOptions& o) { o.column = "V_STOKES"; }), "V_STOKES"));
    EXPECT_TRUE(mentions(with([&](DrawOptions& o) { o.map = folder / "absent.fits"; }), "absent.fits"));
    EXPECT_EQ(folder.names(), (std::set<std::string>{"low.fits"}));
}

TEST(Draw, NamesThePictureAfterTheMap) {
    const testing::TemporaryFolder folder;
    DrawOptions options = make_options(folder);
    options.output.reset();
    const auto before = std::filesystem::current_path();
    std::filesystem::current_path(folder.path());
    const auto plain = run_draw(options).picture;
    options.column = "Q_STOKES";
    const auto with_column = run_draw(options).picture;
    std::filesystem::current_path(before);
    EXPECT_EQ(plain, "low.png");
    EXPECT_EQ(with_column, "low-Q_STOKES.png");
}

}  // namespace
}  // namespace foreglow
