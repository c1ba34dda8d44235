// SPDX-License-Identifier: GPL-2.0-or-later
#include "picture/colour_bar.h"

#include <array>
#include <cmath>
#include <vector>

#include "base/text.h"
#include "picture/ink.h"
#include "picture/ticks.h"

namespace foreglow {
namespace {

void draw_colours(Canvas& canvas, const Box& bar, const Palette& palette) {
    const int width = static_cast<int>(bar.width), height = static_cast<int>(bar.height);
    std::vector<Rgb> colours;
    colours.reserve(static_cast<std::size_t>(width) * static_cast<std::size_t>(height));
    for (int j = 0; j < height; ++j)
        for (int i = 0; i < width; ++i)
            colours.push_back(palette.at((i + 0.5) / width));
    canvas.paste(static_cast<int>(bar.x), static_cast<int>(bar.y), width, height, colours);
}

/// Draws the outline around the colours, with a point at each end beyond which there are values.
void draw_outline(Canvas& canvas, const ColourBar& bar, const ScaleChoice& choice, const Palette& palette) {
    const Box& b = bar.bar;
    const double middle = b.y + b.height / 2, right = b.x + b.width, point = 0.8 * b.height;
    std::vector<Point> outline{{b.x, b.y}, {right, b.y}};
    if (choice.above > 0) {
        const Point tip{right + point, middle};
        canvas.fill_polygon(std::array<Point, 3>{{{right, b.y}, tip, {right, b.y + b.height}}},
                            palette.at(1));
        outline.push_back(tip);
    }
    outline.push_back({right, b.y + b.height});
    outline.push_back({b.x, b.y + b.height});
    if (choice.below > 0) {
        const Point tip{b.x - point, middle};
        canvas.fill_polygon(std::array<Point, 3>{{{b.x, b.y}, tip, {b.x, b.y + b.height}}}, palette.at(0));
        outline.push_back(tip);
    }
    canvas.stroke(outline, {ink, hairline(bar.font_size), 1, true});
}

void draw_ticks(Canvas& canvas, const ColourBar& bar, const ValueScale& scale) {
    const Box& b = bar.bar;
    const double bottom = b.y + b.height, length = 0.35 * bar.font_size;
    const auto ticks = make_ticks(scale, [&](const std::string& label) {
        return (canvas.text_width(label, bar.font_size) + 1.2 * bar.font_size) / b.width;
    });
    for (const Tick& tick : ticks) {
        const double x = b.x + tick.position * b.width;
        canvas.stroke(std::array<Point, 2>{{{x, bottom}, {x, bottom + length}}},
                      {ink, hairline(bar.font_size)});
        canvas.text(x, std::round(bottom + length + bar.font_size), tick.label,
                    {.size = bar.font_size, .colour = ink, .align = Align::Centre});
    }
}

bool has_colours(const ScaleChoice& choice) {
    return choice.undefined < choice.pixels;
}

struct LegendEntry {
    Rgb colour;
    std::string text;
};

std::vector<LegendEntry> make_legend(const ColourBar& bar, const ScaleChoice& choice) {
    std::vector<LegendEntry> entries;
    const auto add = [&](Rgb colour, const std::string& name, std::int64_t count) {
        const std::string share =
            format_share(static_cast<double>(count), static_cast<double>(choice.pixels));
        if (count > 0) entries.push_back({colour, name + " (" + share + " of the " + bar.whole + ")"});
    };
    add(undefined_colour, "undefined", choice.undefined);
    add(not_positive_colour, "zero or negative", choice.not_positive);
    return entries;
}

void draw_legend(Canvas& canvas, const ColourBar& bar, const ScaleChoice& choice, double baseline) {
    const double f = bar.font_size, swatch = 1.4 * f, gap = 0.5 * f, between = 2 * f;
    const auto entries = make_legend(bar, choice);
    double total = -between;
    for (const LegendEntry& e : entries)
        total += swatch + gap + canvas.text_width(e.text, f) + between;
    double x = std::round(bar.bar.x + bar.bar.width / 2 - total / 2);
    for (const LegendEntry& e : entries) {
        canvas.fill({x, std::round(baseline - 0.8 * f), std::round(swatch), std::round(0.9 * f)}, e.colour);
        canvas.text(x + swatch + gap, baseline, e.text, {.size = f, .colour = ink});
        x += swatch + gap + canvas.text_width(e.text, f) + between;
    }
}

}  // namespace

std::string format_share(double part, double whole) {
    const double percent = whole > 0 ? 100 * part / whole : 0;
    if (part > 0 && percent < 0.1) return "less than 0.1 %";
    if (part < whole && percent > 99.9) return "more than 99.9 %";
    return format_number(percent, percent < 10 ? 2 : 3) + " %";
}

double colour_bar_height(const ColourBar& bar, const ScaleChoice& choice) {
    const double legend = make_legend(bar, choice).empty() ? 0 : 1.8 * bar.font_size;
    return (has_colours(choice) ? bar.bar.height + 3.5 * bar.font_size : 0) + legend;
}

void draw_colour_bar(Canvas& canvas, const ColourBar& bar, const ScaleChoice& choice,
                     const Palette& palette) {
    const double f = bar.font_size, bottom = bar.bar.y + bar.bar.height;
    if (has_colours(choice)) {
        draw_colours(canvas, bar.bar, palette);
        draw_outline(canvas, bar, choice, palette);
        draw_ticks(canvas, bar, choice.scale);
        canvas.text(bar.bar.x + bar.bar.width / 2, std::round(bottom + 2.9 * f), bar.label,
                    {.size = f, .colour = ink, .align = Align::Centre});
    }
    draw_legend(canvas, bar, choice, std::round(bar.bar.y + colour_bar_height(bar, choice) - 0.7 * f));
}

}  // namespace foreglow
