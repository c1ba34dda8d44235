// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <memory>
#include <span>
#include <string>
#include <string_view>
#include <vector>

#include "picture/colour.h"

namespace foreglow {

class ColourTable;
class Typeface;

/// A place on a canvas in pixels: x to the right and y downwards from the upper left corner.
struct Point {
    double x = 0, y = 0;
};

struct Box {
    double x = 0, y = 0, width = 0, height = 0;
};

struct Stroke {
    Rgb colour;
    double width = 1;
    double opacity = 1;
    bool closed = false;
};

enum class Align { Left, Centre, Right };

struct Lettering {
    double size = 12;  ///< pixels per em
    Rgb colour;
    Align align = Align::Left;
    bool upwards = false;  ///< turned a quarter, read from below
    double halo = 0;       ///< width in pixels of a rim in halo_colour that keeps letters readable on a map
    Rgb halo_colour{255, 255, 255};
};

/// An opaque picture in memory, drawn with antialiased shapes; the same calls give the same PNG bytes.
class Canvas {
  public:
    /// @param letters  shared by the canvases of one page, of one thread; read from the font file where null
    /// @throws FileError where the font is missing
    Canvas(int width, int height, Rgb background, std::shared_ptr<const Typeface> letters = nullptr);
    /// Makes a canvas on which nothing is drawn yet, to be laid over others.
    [[nodiscard]] static Canvas make_layer(int width, int height, std::shared_ptr<const Typeface> letters);
    ~Canvas();
    Canvas(Canvas&&) noexcept;
    Canvas& operator=(Canvas&&) noexcept;

    [[nodiscard]] int width() const;
    [[nodiscard]] int height() const;
    [[nodiscard]] Rgb pixel(int x, int y) const;

    /// Draws a layer over this canvas, upper left corners together.
    void lay_over(const Canvas& layer);
    /// Copies colours [width * height], row by row, to the rectangle whose upper left corner is (x, y).
    void paste(int x, int y, int width, int height, std::span<const Rgb> colours);
    void fill(const Box& box, Rgb colour);
    void fill_polygon(std::span<const Point> corners, Rgb colour);
    void stroke(std::span<const Point> points, const Stroke& stroke);
    void stroke_ellipse(const Box& bounds, const Stroke& stroke);
    /// Fills what lies in `box` but outside the ellipse that `bounds` holds.
    void fill_around_ellipse(const Box& box, const Box& bounds, Rgb colour);
    /// Limits what is drawn to a rectangle until release() is called.
    void clip(const Box& box);
    void release();

    [[nodiscard]] double text_width(std::string_view text, double size) const;
    /// Draws UTF-8 text; (x, y) is the start, middle or end of its baseline.
    void text(double x, double y, std::string_view text, const Lettering& lettering);

    /// Returns the bytes of a PNG file.
    /// @throws FileError where the PNG cannot be made
    [[nodiscard]] std::string png() const;
    /// Returns the bytes of a PNG file with a table of colours, a fifth of the size and a tenth of the time:
    /// each pixel takes the colour of the table that is nearest.
    [[nodiscard]] std::string png(ColourTable& table) const;

  private:
    struct Implementation;
    explicit Canvas(std::unique_ptr<Implementation> implementation);
    std::unique_ptr<Implementation> implementation_;
};

}  // namespace foreglow
