// SPDX-License-Identifier: GPL-2.0-or-later
#include "picture/sky_picture.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/error.h"
#include "base/parallel.h"
#include "picture/colour_bar.h"
#include "sphere/projection.h"
#include "unit/picture/png_reader.h"

namespace foreglow {
namespace {

SkyMap make_sky(int nside = 32) {
    SkyMap map{HealpixGrid(nside), Frame::Galactic, "K_RJ", {}};
    for (std::int64_t p = 0; p < map.grid.npix(); ++p)
        map.values.push_back(2 + 6 / (std::abs(map.grid.direction(p)[2]) + 0.03));
    return map;
}

struct Found {
    double x = 0, y = 0;
    int count = 0;
};

/// Finds the middle of all pixels of one colour above a row.
Found find_colour(const testing::PngPixels& png, Rgb colour, int rows) {
    Found found;
    for (int y = 0; y < rows; ++y)
        for (int x = 0; x < png.width; ++x)
            if (png.at(x, y) == colour) {
                found.x += x;
                found.y += y;
                ++found.count;
            }
    found.x /= std::max(found.count, 1);
    found.y /= std::max(found.count, 1);
    return found;
}

Found find_beacon(double longitude, double latitude) {
    SkyMap map{HealpixGrid(16), Frame::Galactic, "K_RJ", std::vector<double>(3072, 0.0)};
    const Vector3 at = direction_of(Angle::from_degrees(longitude), Angle::from_degrees(latitude));
    map.values[static_cast<std::size_t>(map.grid.pixel_at(at))] = 1;
    PictureOptions options;
    options.width = 600;
    options.scale = {ScaleKind::Linear, 0, 1, 0, 100};
    const auto png = testing::read_png(draw_all_sky(map, options).png);
    return find_colour(png, Palette(PaletteKind::Sequential).at(1),
                       300);  // the colour bar lies below row 300
}

TEST(AllSkyPicture, ShowsPositiveLongitudeLeftOfCentreAndNorthAbove) {
    const Found centre = find_beacon(3, 3), left = find_beacon(90, 10), right = find_beacon(-90, 10);
    ASSERT_GT(centre.count, 20);
    ASSERT_GT(left.count, 20);
    ASSERT_GT(right.count, 20);
    // 90 deg at latitude 10 are half the half-width, 555/2 * 0.5 * 0.99, less what the pixel's own place
    // adds.
    EXPECT_NEAR(centre.x - left.x, 139, 8);
    EXPECT_NEAR(right.x - centre.x, 139, 8);
    EXPECT_LT(find_beacon(45, 70).y, centre.y - 90);
    EXPECT_GT(find_beacon(45, -70).y, centre.y + 90);
}

TEST(AllSkyPicture, ShowsUndefinedPixelsInTheFlatGreyAndNamesThem) {
    SkyMap map = make_sky();
    PictureOptions options;
    const auto full = testing::read_png(draw_all_sky(map, options).png);
    EXPECT_EQ(find_colour(full, undefined_colour, full.height).count, 0);
    for (std::int64_t p = 0; p < map.grid.npix(); ++p)
        if (map.grid.direction(p)[2] > 0.5) map.values[static_cast<std::size_t>(p)] = undefined_pixel;
    const auto holed = testing::read_png(draw_all_sky(map, options).png);
    EXPECT_GT(holed.height, full.height);  // the legend
    const double ellipse = 3.14159 / 4 * 1124 * 562;
    // A quarter of the sky; the graticule's lines, 3 pixels wide with their rims, cover about a tenth of it.
    EXPECT_NEAR(find_colour(holed, undefined_colour, 620).count / ellipse, 0.25, 0.03);
}

TEST(AllSkyPicture, DrawsWhateverTheMapHolds) {
    for (const double value : {0.0, -2.7, undefined_pixel, 1e-30, 1e30})
        for (const auto kind : {ScaleKind::Linear, ScaleKind::Log, ScaleKind::Signed}) {
            SkyMap map = make_sky(4);
            map.values.assign(map.values.size(), value);
            PictureOptions options;
            options.width = 300;
            options.scale.kind = kind;
            const Picture picture = draw_all_sky(map, options);
            EXPECT_FALSE(picture.notices.empty()) << value;
            EXPECT_EQ(testing::read_png(picture.png).width, 300);
        }
}

TEST(AllSkyPicture, MarksNegativesOnALogScale) {
    SkyMap map = make_sky();
    for (std::int64_t p = 0; p < map.grid.npix(); ++p)
        if (map.grid.direction(p)[1] > 0) map.values[static_cast<std::size_t>(p)] *= -1;
    PictureOptions options;
    options.scale.kind = ScaleKind::Log;
    const Picture picture = draw_all_sky(map, options);
    ASSERT_EQ(picture.notices.size(), 1U);
    const auto png = testing::read_png(picture.png);
    const Found marked = find_colour(png, not_positive_colour, 620);
    EXPECT_GT(marked.count, 200000);
    EXPECT_LT(marked.x, 614);  // positive y is positive longitude, left of the ellipse's middle
}

TEST(AllSkyPicture, GivesTheSameBytesForAnyNumberOfThreads) {
    const SkyMap map = make_sky();
    PictureOptions options;
    options.title = "Same & same";
    const int before = thread_count();
    set_thread_count(1);
    const std::string one = draw_all_sky(map, options).png;
    set_thread_count(4);
    const std::string four = draw_all_sky(map, options).png;
    set_thread_count(before);
    EXPECT_EQ(one, four);
}

TEST(AllSkyPainter, DrawsEachPictureAsAFreshOneDoes) {
    AllSkyPainter painter;
    PictureOptions options;
    options.few_colours = true;
    const int before = thread_count();
    for (const int width : {640, 500})
        for (const int nside : {32, 16, 256})
            for (const ScaleKind kind : {ScaleKind::Log, ScaleKind::Signed}) {
                options.width = width;
                options.scale.kind = kind;
                options.title = nside == 16 ? "" : "Title";
                set_thread_count(1);
                const std::string fresh = AllSkyPainter().draw(make_sky(nside), options).png;
                set_thread_count(3);
                EXPECT_EQ(painter.draw(make_sky(nside), options).png, fresh) << width << ' ' << nside;
                EXPECT_EQ(painter.draw(make_sky(nside), options).png, fresh) << width << ' ' << nside;
            }
    set_thread_count(before);
}

TEST(AllSkyPainter, LooksLikeTheSinglePicture) {
    PictureOptions options;
    options.title = "Title";
    options.width = 640;
    const auto single = testing::read_png(draw_all_sky(make_sky(), options).png);
    const auto far = [&](const testing::PngPixels& other) {
        int most = 0;
        for (std::size_t i = 0; i < single.pixels.size(); ++i) {
            const Rgb a = single.pixels[i], b = other.pixels.at(i);
            most = std::max(
                {most, std::abs(a.red - b.red), std::abs(a.green - b.green), std::abs(a.blue - b.blue)});
        }
        return most;
    };
    // Axes drawn on a layer first are rounded once more for each of up to four strokes.
    EXPECT_LE(far(testing::read_png(AllSkyPainter().draw(make_sky(), options).png)), 4);
    // Blends of letters with the sky have the coarsest colours in the table: a quarter of the way from paper
    // to ink.
    options.few_colours = true;
    const std::string few = AllSkyPainter().draw(make_sky(), options).png;
    EXPECT_LE(far(testing::read_png(few)), 64);
    EXPECT_LT(few.size(), 150000u);
}

TEST(AllSkyPicture, CutsTitlesThatAreTooLong) {
    PictureOptions options;
    options.width = 400;
    options.title = std::string(500, 'W') + "\u03b2";
    const auto png = testing::read_png(draw_all_sky(make_sky(4), options).png);
    for (int y = 0; y < 30; ++y)
        for (const int x : {0, 1, 398, 399})
            EXPECT_EQ(png.at(x, y), (Rgb{255, 255, 255}));
}

TEST(AllSkyPicture, RefusesWidthsItCannotLetter) {
    PictureOptions options;
    options.width = 299;
    EXPECT_THROW((void)draw_all_sky(make_sky(4), options), InputError);
    options.width = 8001;
    EXPECT_THROW((void)draw_all_sky(make_sky(4), options), InputError);
}

TEST(ColourBar, RunsFromTheLowToTheHighColourWithTicksBelow) {
    PictureOptions options;
    options.scale = {ScaleKind::Linear, 0, 10, 0, 100};
    const SkyMap map = make_sky();
    const auto png = testing::read_png(draw_all_sky(map, options).png);
    const Palette palette(PaletteKind::Sequential);
    // The bar is 744 of 1200 pixels wide, in the middle; find its row as the one that holds both ends.
    int row = 0;
    for (int y = png.height - 1; y > 600 && row == 0; --y)
        if (png.at(230, y) == palette.at(2.5 / 744) && png.at(970, y) == palette.at(742.5 / 744)) row = y;
    ASSERT_GT(row, 0);
    for (int x = 231; x < 970; ++x)
        EXPECT_EQ(png.at(x, row - 3), palette.at((x - 228 + 0.5) / 744)) << x;
    int marks = 0, previous = 0;
    for (int x = 220; x < 980; ++x) {
        const bool dark = png.at(x, row + 6).red < 160;
        if (dark && !previous) ++marks;
        previous = dark;
    }
    EXPECT_EQ(marks, 11);  // 0, 1, ... 10
}

TEST(ColourBar, WritesSharesThatDoNotMislead) {
    EXPECT_EQ(format_share(0, 100), "0 %");
    EXPECT_EQ(format_share(1, 100000), "less than 0.1 %");
    EXPECT_EQ(format_share(99999, 100000), "more than 99.9 %");
    EXPECT_EQ(format_share(424, 10000), "4.2 %");
    EXPECT_EQ(format_share(100, 100), "100 %");
}

TEST(CloseUpPicture, WorksAnywhereOnTheSky) {
    const SkyMap map = make_sky();
    PictureOptions options;
    options.width = 300;
    for (const double latitude : {-90.0, -60.0, 0.0, 45.0, 89.0, 90.0})
        for (const double size : {0.01, 3.0, 40.0, 120.0}) {
            const CloseUpField field{Angle::from_degrees(359.5), Angle::from_degrees(latitude),
                                     Angle::from_degrees(size)};
            EXPECT_GT(draw_close_up(map, field, options).png.size(), 1000U) << latitude << " " << size;
        }
    EXPECT_THROW((void)draw_close_up(map, {{}, {}, Angle::from_degrees(121)}, options), InputError);
    EXPECT_THROW((void)draw_close_up(map, {{}, {}, Angle::from_degrees(0)}, options), InputError);
    EXPECT_THROW((void)draw_close_up(map, {{}, Angle::from_degrees(91), Angle::from_degrees(5)}, options),
                 InputError);
}

}  // namespace
}  // namespace foreglow
