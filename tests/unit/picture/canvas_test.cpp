// SPDX-License-Identifier: GPL-2.0-or-later
#include "picture/canvas.h"

#include <gtest/gtest.h>

#include "picture/typeface.h"
#include "unit/picture/png_reader.h"

namespace foreglow {
namespace {

constexpr Rgb white{255, 255, 255}, black{0, 0, 0}, red{200, 30, 10};

std::string outline_of(const std::string& text) {
    std::string moves;
    const auto add = [&](double x, double y) { moves += std::to_string(x) + "," + std::to_string(y) + ";"; };
    Typeface().trace(text, 100,
                     {add, add, [&](double, double, double, double, double x, double y) { add(x, y); }});
    return moves;
}

TEST(Typeface, HasTheLettersThatPicturesNeed) {
    const std::string missing = outline_of("\ue000");  // private use: no font of the trade draws it
    for (const char* letter : {"\u03b2", "\u03bd", "\u03b1", "\u221d", "\u00b0", "\u2212", "\u00d7", "\u2075",
                               "\u207b", "\u03bc", "\u2026"})
        EXPECT_NE(outline_of(letter), missing) << letter;
}

TEST(Typeface, WidthsGrowWithSizeAndText) {
    const Typeface face;
    EXPECT_DOUBLE_EQ(face.width("nside 512", 24), 2 * face.width("nside 512", 12));
    EXPECT_DOUBLE_EQ(face.width("0", 10), face.width("8", 10));  // figures of one width: columns line up
    EXPECT_EQ(face.width("", 10), 0);
    // From outside: the advance of DejaVu Sans's figures is 1303 of 2048 units (its hmtx table; from
    // memory).
    EXPECT_NEAR(face.width("0", 2048), 1303, 1e-9);
}

TEST(Typeface, TakesBrokenUtf8) {
    EXPECT_GT(Typeface().width("\xff\xc3", 10), 0);
    EXPECT_EQ(outline_of("\xe2\x88"), outline_of("\ufffd\ufffd"));
}

TEST(Canvas, KeepsPastedPixelsAndGivesThemToThePng) {
    Canvas canvas(4, 3, white);
    const std::vector<Rgb> two{red, black};
    canvas.paste(1, 2, 2, 1, two);
    EXPECT_EQ(canvas.pixel(1, 2), red);
    const auto png = testing::read_png(canvas.png());
    ASSERT_EQ(png.width, 4);
    ASSERT_EQ(png.height, 3);
    EXPECT_EQ(png.at(0, 2), white);
    EXPECT_EQ(png.at(1, 2), red);
    EXPECT_EQ(png.at(2, 2), black);
}

TEST(Canvas, DrawsShapesWhereTheyBelong) {
    Canvas canvas(60, 40, white);
    canvas.fill({10, 10, 5, 5}, red);
    EXPECT_EQ(canvas.pixel(12, 12), red);
    EXPECT_EQ(canvas.pixel(16, 12), white);
    canvas.fill_around_ellipse({20, 0, 40, 40}, {20, 10, 40, 20}, black);
    EXPECT_EQ(canvas.pixel(40, 20), white);  // the ellipse's middle
    EXPECT_EQ(canvas.pixel(22, 12), black);  // its corner
    canvas.clip({0, 30, 5, 10});
    canvas.fill({0, 0, 60, 40}, red);
    canvas.release();
    EXPECT_EQ(canvas.pixel(2, 35), red);
    EXPECT_EQ(canvas.pixel(8, 35), white);
}

TEST(Canvas, AlignsTextAtItsAnchor) {
    for (const Align align : {Align::Left, Align::Centre, Align::Right}) {
        Canvas canvas(300, 40, white);
        canvas.text(150, 30, "HHHH", {.size = 20, .colour = black, .align = align});
        double sum = 0, count = 0;
        for (int x = 0; x < 300; ++x)
            for (int y = 0; y < 40; ++y)
                if (canvas.pixel(x, y).red < 128) {
                    sum += x + 0.5;
                    ++count;
                }
        ASSERT_GT(count, 100);
        const double half = canvas.text_width("HHHH", 20) / 2;
        const double expected = align == Align::Left ? 150 + half : align == Align::Right ? 150 - half : 150;
        EXPECT_NEAR(sum / count, expected, 1);  // a pixel: strokes are antialiased and cut at half
    }
}

TEST(Canvas, GivesTheSameBytesForTheSameCalls) {
    const auto make = [] {
        Canvas canvas(200, 100, white);
        canvas.stroke_ellipse({10, 10, 180, 80}, {red, 2});
        canvas.text(100, 50, "T \u221d \u03bd^\u03b2",
                    {.size = 20, .colour = black, .align = Align::Centre, .halo = 2});
        return canvas.png();
    };
    EXPECT_EQ(make(), make());
}

}  // namespace
}  // namespace foreglow
