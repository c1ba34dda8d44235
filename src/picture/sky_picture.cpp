// SPDX-License-Identifier: GPL-2.0-or-later
#include "picture/sky_picture.h"

#include <algorithm>
#include <cmath>
#include <map>
#include <memory>
#include <optional>

#include "base/error.h"
#include "base/parallel.h"
#include "base/text.h"
#include "picture/canvas.h"
#include "picture/colour_bar.h"
#include "picture/colour_table.h"
#include "picture/ink.h"
#include "picture/sky_axes.h"
#include "picture/sky_lattice.h"
#include "picture/sky_raster.h"
#include "picture/ticks.h"
#include "picture/typeface.h"

namespace foreglow {
namespace {

double font_size_for(int width) {
    return std::max(11.0, width / 60.0);
}

std::vector<Rgb> make_colours(const SkyRaster& raster, const ValueScale& scale, const Palette& palette) {
    std::vector<Rgb> colours(raster.values.size(), paper);
    parallel_for_blocks(raster.height, 16, [&](std::int64_t begin, std::int64_t end) {
        const auto width = static_cast<std::size_t>(raster.width);
        std::vector<double> positions(width);
        for (auto j = static_cast<std::size_t>(begin); j < static_cast<std::size_t>(end); ++j) {
            scale.positions(std::span(raster.values).subspan(j * width, width), positions);
            for (std::size_t i = 0; i < width; ++i) {
                const std::size_t at = j * width + i;
                const double position = positions[i];
                const float share = raster.undefined_shares[at];
                if (is_defined(position)) {
                    const bool none = std::isinf(position) && position < 0;
                    const Rgb colour = none ? not_positive_colour : palette.at(position);
                    colours[at] =
                        share > 0 ? mix(colour, undefined_colour, static_cast<double>(share)) : colour;
                } else if (share > 0) {
                    colours[at] = undefined_colour;
                }
            }
        }
    });
    return colours;
}

std::string bar_label(const SkyMap& map, const PictureOptions& options, const ValueScale& scale) {
    const std::string unit = options.unit.empty() ? map.unit : options.unit;
    std::string label = options.quantity;
    if (!unit.empty()) label += label.empty() ? unit : " [" + unit + "]";
    const std::string kind = scale.kind() == ScaleKind::Log ? "log scale"
                             : scale.kind() == ScaleKind::Signed
                                 ? "linear below " + format_label(scale.knee(), 2) + ", log beyond"
                                 : "";
    if (kind.empty()) return label;
    return label.empty() ? kind : label + ", " + kind;
}

/// Draws a line of text centred at x, in smaller letters where it would be too wide and cut with an ellipsis
/// at 60 %.
void draw_fitted(Canvas& canvas, double x, double baseline, std::string text, Lettering lettering,
                 double room) {
    const double natural = canvas.text_width(text, lettering.size);
    lettering.size *= std::clamp(room / std::max(natural, 1.0), 0.6, 1.0);
    if (canvas.text_width(text, lettering.size) > room * 1.001) {
        while (!text.empty() && canvas.text_width(text + "\u2026", lettering.size) > room) {
            while (!text.empty() && (static_cast<unsigned char>(text.back()) & 0xC0U) == 0x80U)
                text.pop_back();
            if (!text.empty()) text.pop_back();
        }
        text += "\u2026";
    }
    lettering.align = Align::Centre;
    canvas.text(x, baseline, text, lettering);
}

void check_width(int width) {
    if (width < PictureOptions::least_width || width > PictureOptions::largest_width)
        throw InputError("a picture can be " + std::to_string(PictureOptions::least_width) + " to " +
                         std::to_string(PictureOptions::largest_width) + " pixels wide, and " +
                         std::to_string(width) + " was asked for");
}

/// A palette and, once it is asked for, its table of 256 colours.
struct Colours {
    explicit Colours(PaletteKind kind) : palette(kind) {}
    [[nodiscard]] ColourTable& table() {
        if (!table_) table_.emplace(palette);
        return *table_;
    }

    Palette palette;

  private:
    std::optional<ColourTable> table_;
};

/// Where the parts of a picture stand, in pixels, for a map of a size.
struct Layout {
    double font = 12;
    double title_baseline = 0, caption_baseline = 0;
    Box map;
    ColourBar bar;
    int height = 0;
};

/// What the axes of a map need around it.
struct Surroundings {
    double above = 0, below = 0;
    std::string whole;  ///< "sky" or "field"
};

Layout make_layout(const PictureOptions& options, const Box& map, const Surroundings& around,
                   const ScaleChoice& choice) {
    Layout layout;
    const double f = layout.font = font_size_for(options.width);
    double y = std::round(0.8 * f + around.above);
    if (!options.title.empty()) {
        layout.title_baseline = std::round(2.1 * f);
        y = std::round(y + 2.2 * f);
    }
    layout.map = {map.x, y, map.width, map.height};
    y += map.height + around.below;
    layout.caption_baseline = std::round(y + 1.5 * f);
    y = std::round(y + 2.6 * f);
    const double bar_width = std::round(0.62 * options.width);
    layout.bar.bar = {std::round((options.width - bar_width) / 2), y, bar_width, std::round(1.1 * f)};
    layout.bar.font_size = f;
    layout.bar.whole = around.whole;
    layout.height = static_cast<int>(std::ceil(y + colour_bar_height(layout.bar, choice) + 0.4 * f));
    return layout;
}

void draw_caption(Canvas& canvas, const Layout& layout, const std::string& caption) {
    const double f = layout.font;
    draw_fitted(canvas, canvas.width() / 2.0, layout.caption_baseline, caption,
                {.size = 0.85 * f, .colour = faint_ink}, canvas.width() - 2 * f);
}

/// The common end of both kinds of picture: title, colour bar, bytes.
Picture finish(Canvas& canvas, Layout layout, const SkyMap& map, const PictureOptions& options,
               ScaleChoice choice, Colours& colours) {
    const double f = layout.font, middle = canvas.width() / 2.0, room = canvas.width() - 2 * f;
    if (!options.title.empty())
        draw_fitted(canvas, middle, layout.title_baseline, options.title, {.size = 1.3 * f, .colour = ink},
                    room);
    layout.bar.label = bar_label(map, options, choice.scale);
    draw_colour_bar(canvas, layout.bar, choice, colours.palette);
    return {options.few_colours ? canvas.png(colours.table()) : canvas.png(), canvas.width(), canvas.height(),
            std::move(choice.notices)};
}

PaletteKind palette_for(const PictureOptions& options, const ValueScale& scale) {
    const bool is_signed = scale.kind() == ScaleKind::Signed;
    return options.palette.value_or(is_signed ? PaletteKind::Diverging : PaletteKind::Sequential);
}

void draw_ellipse_axes(Canvas& canvas, const Layout& layout, const std::string& caption) {
    const Box& map = layout.map;
    canvas.fill_around_ellipse({map.x - 1, map.y - 1, map.width + 2, map.height + 2}, map, paper);
    draw_ellipse_graticule(canvas, map, layout.font);
    canvas.stroke_ellipse(map, {ink, hairline(layout.font)});
    draw_caption(canvas, layout, caption);
}

}  // namespace

struct AllSkyPainter::Implementation {
    std::shared_ptr<const Typeface> letters = std::make_shared<const Typeface>();
    std::map<PaletteKind, Colours> colours;
    bool draws_many = true;
    std::optional<SkyLattice> lattice;
    std::optional<Canvas> axes;  ///< what surrounds and crosses the map, for the following
    Layout axes_layout;
    std::string axes_caption;

    void draw_axes(Canvas& canvas, const Layout& layout, const std::string& caption) {
        if (!draws_many) return draw_ellipse_axes(canvas, layout, caption);
        const Box &a = axes_layout.map, &b = layout.map;
        const bool fits = axes && axes->width() == canvas.width() && axes_layout.font == layout.font &&
                          a.x == b.x && a.y == b.y && a.width == b.width && a.height == b.height &&
                          axes_caption == caption;
        if (!fits) {
            const int height = std::min(canvas.height(), static_cast<int>(layout.bar.bar.y));
            axes.emplace(Canvas::make_layer(canvas.width(), height, letters));
            axes_layout = layout;
            axes_caption = caption;
            draw_ellipse_axes(*axes, layout, caption);
        }
        canvas.lay_over(*axes);
    }

    SkyRaster make_raster(const SkyMap& map, int width, int height) {
        if (!draws_many || is_finer_than_picture(map.grid, width, height))
            return make_all_sky_raster(map, width, height);
        if (!lattice || !lattice->fits(map.grid, width, height)) lattice.emplace(map.grid, width, height);
        return lattice->sample(map);
    }
};

AllSkyPainter::AllSkyPainter() : implementation_(std::make_unique<Implementation>()) {}
AllSkyPainter::~AllSkyPainter() = default;
AllSkyPainter::AllSkyPainter(AllSkyPainter&&) noexcept = default;
AllSkyPainter& AllSkyPainter::operator=(AllSkyPainter&&) noexcept = default;

Picture AllSkyPainter::draw(const SkyMap& map, const PictureOptions& options) {
    check_width(options.width);
    ScaleChoice choice = choose_scale(map.values, options.scale);
    const PaletteKind kind = palette_for(options, choice.scale);
    Colours& colours = implementation_->colours.try_emplace(kind, kind).first->second;
    const double f = font_size_for(options.width);
    const double left = std::round(2.6 * f);
    const int map_height = static_cast<int>((options.width - left - std::round(1.2 * f)) / 2);
    const int map_width = 2 * map_height;
    const Layout layout =
        make_layout(options, {left, 0, 1.0 * map_width, 1.0 * map_height}, {0, 0, "sky"}, choice);
    Canvas canvas(options.width, layout.height, paper, implementation_->letters);
    const SkyRaster raster = implementation_->make_raster(map, map_width, map_height);
    canvas.paste(static_cast<int>(left), static_cast<int>(layout.map.y), map_width, map_height,
                 make_colours(raster, choice.scale, colours.palette));
    const CoordinateNames names = coordinate_names(map.frame);
    const std::string caption = names.longitude + " (grows to the left, 0\u00b0 in the middle) and " +
                                to_lower(names.latitude) + ", Mollweide projection, nside " +
                                std::to_string(map.grid.nside());
    implementation_->draw_axes(canvas, layout, caption);
    return finish(canvas, layout, map, options, std::move(choice), colours);
}

Picture draw_all_sky(const SkyMap& map, const PictureOptions& options) {
    AllSkyPainter painter;
    painter.implementation_->draws_many = false;
    return painter.draw(map, options);
}

Picture draw_close_up(const SkyMap& map, const CloseUpField& field, const PictureOptions& options) {
    check_width(options.width);
    const double size = field.size.degrees(), latitude = field.latitude.degrees();
    if (!(size > 0 && size <= CloseUpField::largest_size_deg))
        throw InputError("a close-up can be up to 120 deg wide, and " + format_number(size, 6) +
                         " deg was asked for");
    if (!(std::abs(latitude) <= 90))
        throw InputError("the latitude of a close-up's centre lies between -90 and 90 deg, and " +
                         format_number(latitude, 6) + " was asked for");
    const double f = font_size_for(options.width);
    const double left = std::round(6.5 * f);
    const int side = static_cast<int>(options.width - 2 * left);
    const SkyRaster raster = make_close_up_raster(map, field.longitude, field.latitude, field.size, side);
    ScaleChoice choice = choose_scale(raster.values, options.scale);
    Colours colours(palette_for(options, choice.scale));
    const Surroundings around{has_pole(field) ? std::round(1.4 * f) : 0, std::round(3.2 * f), "field"};
    const Layout layout = make_layout(options, {left, 0, 1.0 * side, 1.0 * side}, around, choice);
    Canvas canvas(options.width, layout.height, paper);
    canvas.paste(static_cast<int>(left), static_cast<int>(layout.map.y), side, side,
                 make_colours(raster, choice.scale, colours.palette));
    draw_field_graticule(canvas, layout.map, field, f);
    const Box& box = layout.map;
    canvas.stroke(std::vector<Point>{{box.x, box.y},
                                     {box.x + box.width, box.y},
                                     {box.x + box.width, box.y + box.height},
                                     {box.x, box.y + box.height}},
                  {ink, hairline(f), 1, true});
    const CoordinateNames names = coordinate_names(map.frame);
    const bool pole = has_pole(field);
    const std::string below =
        pole ? names.longitude + " along the rim, " + to_lower(names.latitude) + " on the rings"
             : names.longitude;
    canvas.text(box.x + box.width / 2, std::round(box.y + box.height + 2.9 * f), below,
                {.size = f, .colour = ink, .align = Align::Centre});
    if (!pole)
        canvas.text(std::round(1.6 * f), box.y + box.height / 2, names.latitude,
                    {.size = f, .colour = ink, .align = Align::Centre, .upwards = true});
    const std::string caption =
        format_number(size, 6) +
        "\u00b0 across, gnomonic projection, north up, longitude grows to the left, nside " +
        std::to_string(map.grid.nside());
    draw_caption(canvas, layout, caption);
    return finish(canvas, layout, map, options, std::move(choice), colours);
}

}  // namespace foreglow
