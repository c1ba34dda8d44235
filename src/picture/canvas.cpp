// SPDX-License-Identifier: GPL-2.0-or-later
#include "picture/canvas.h"

#include <cairo.h>

#include <cstdint>
#include <cstring>
#include <numbers>
#include <utility>
#include <vector>

#include "base/error.h"
#include "picture/colour_table.h"
#include "picture/png.h"
#include "picture/typeface.h"

namespace foreglow {
namespace {

cairo_status_t append(void* user, const unsigned char* data, unsigned int length) {
    auto& bytes = *static_cast<std::string*>(user);
    bytes.insert(bytes.end(), data, data + length);
    return CAIRO_STATUS_SUCCESS;
}

std::uint32_t packed(Rgb c) {
    return 0xFF000000U | (static_cast<std::uint32_t>(c.red) << 16U) |
           (static_cast<std::uint32_t>(c.green) << 8U) | c.blue;
}

void set_colour(cairo_t* context, Rgb c, double opacity = 1) {
    cairo_set_source_rgba(context, c.red / 255.0, c.green / 255.0, c.blue / 255.0, opacity);
}

void add_ellipse(cairo_t* context, const Box& bounds) {
    cairo_save(context);
    cairo_translate(context, bounds.x + bounds.width / 2, bounds.y + bounds.height / 2);
    cairo_scale(context, bounds.width / 2, bounds.height / 2);
    cairo_new_sub_path(context);
    cairo_arc(context, 0, 0, 1, 0, 2 * std::numbers::pi);
    cairo_close_path(context);
    cairo_restore(context);
}

void add_points(cairo_t* context, std::span<const Point> points) {
    cairo_new_path(context);
    for (const Point& p : points)
        cairo_line_to(context, p.x, p.y);
}

void apply(cairo_t* context, const Stroke& stroke) {
    set_colour(context, stroke.colour, stroke.opacity);
    cairo_set_line_width(context, stroke.width);
    cairo_set_line_join(context, CAIRO_LINE_JOIN_ROUND);
    cairo_set_line_cap(context, CAIRO_LINE_CAP_BUTT);
    cairo_stroke(context);
}

}  // namespace

struct Canvas::Implementation {
    std::shared_ptr<const Typeface> typeface;
    cairo_surface_t* surface = nullptr;
    cairo_t* context = nullptr;

    Implementation(cairo_format_t format, int width, int height, std::shared_ptr<const Typeface> letters)
        : typeface(letters ? std::move(letters) : std::make_shared<const Typeface>()),
          surface(cairo_image_surface_create(format, width, height)),
          context(cairo_create(surface)) {
        if (cairo_status(context) == CAIRO_STATUS_SUCCESS) return;
        cairo_destroy(context);
        cairo_surface_destroy(surface);
        throw InputError("a picture of " + std::to_string(width) + " x " + std::to_string(height) +
                         " pixels cannot be made here: ask for a smaller width");
    }
    ~Implementation() {
        cairo_destroy(context);
        cairo_surface_destroy(surface);
    }
    Implementation(const Implementation&) = delete;
    Implementation& operator=(const Implementation&) = delete;

    [[nodiscard]] unsigned char* row(int y) const {
        return cairo_image_surface_get_data(surface) +
               static_cast<std::ptrdiff_t>(y) * cairo_image_surface_get_stride(surface);
    }
};

Canvas::Canvas(std::unique_ptr<Implementation> implementation) : implementation_(std::move(implementation)) {}

Canvas::Canvas(int width, int height, Rgb background, std::shared_ptr<const Typeface> letters)
    : Canvas(std::make_unique<Implementation>(CAIRO_FORMAT_RGB24, width, height, std::move(letters))) {
    FOREGLOW_EXPECTS(width > 0 && height > 0);
    set_colour(implementation_->context, background);
    cairo_paint(implementation_->context);
}

Canvas Canvas::make_layer(int width, int height, std::shared_ptr<const Typeface> letters) {
    FOREGLOW_EXPECTS(width > 0 && height > 0);
    return Canvas(std::make_unique<Implementation>(CAIRO_FORMAT_ARGB32, width, height, std::move(letters)));
}

Canvas::~Canvas() = default;
Canvas::Canvas(Canvas&&) noexcept = default;
Canvas& Canvas::operator=(Canvas&&) noexcept = default;

int Canvas::width() const {
    return cairo_image_surface_get_width(implementation_->surface);
}
int Canvas::height() const {
    return cairo_image_surface_get_height(implementation_->surface);
}

Rgb Canvas::pixel(int x, int y) const {
    FOREGLOW_EXPECTS(x >= 0 && x < width() && y >= 0 && y < height());
    cairo_surface_flush(implementation_->surface);
    std::uint32_t word = 0;
    std::memcpy(&word, implementation_->row(y) + 4 * static_cast<std::ptrdiff_t>(x), 4);
    return {static_cast<std::uint8_t>(word >> 16U), static_cast<std::uint8_t>(word >> 8U),
            static_cast<std::uint8_t>(word)};
}

void Canvas::lay_over(const Canvas& layer) {
    cairo_t* const context = implementation_->context;
    cairo_set_source_surface(context, layer.implementation_->surface, 0, 0);
    cairo_rectangle(context, 0, 0, layer.width(), layer.height());
    cairo_fill(context);
}

void Canvas::paste(int x, int y, int width, int height, std::span<const Rgb> colours) {
    FOREGLOW_EXPECTS(x >= 0 && y >= 0 && x + width <= this->width() && y + height <= this->height());
    FOREGLOW_EXPECTS(colours.size() == static_cast<std::size_t>(width) * static_cast<std::size_t>(height));
    cairo_surface_flush(implementation_->surface);
    std::size_t next = 0;
    for (int j = 0; j < height; ++j) {
        unsigned char* to = implementation_->row(y + j) + 4 * static_cast<std::ptrdiff_t>(x);
        for (int i = 0; i < width; ++i, to += 4) {
            const std::uint32_t word = packed(colours[next++]);
            std::memcpy(to, &word, 4);
        }
    }
    cairo_surface_mark_dirty(implementation_->surface);
}

void Canvas::fill(const Box& box, Rgb colour) {
    cairo_t* const context = implementation_->context;
    set_colour(context, colour);
    cairo_rectangle(context, box.x, box.y, box.width, box.height);
    cairo_fill(context);
}

void Canvas::fill_polygon(std::span<const Point> corners, Rgb colour) {
    add_points(implementation_->context, corners);
    set_colour(implementation_->context, colour);
    cairo_fill(implementation_->context);
}

void Canvas::stroke(std::span<const Point> points, const Stroke& stroke) {
    add_points(implementation_->context, points);
    if (stroke.closed) cairo_close_path(implementation_->context);
    apply(implementation_->context, stroke);
}

void Canvas::stroke_ellipse(const Box& bounds, const Stroke& stroke) {
    cairo_new_path(implementation_->context);
    add_ellipse(implementation_->context, bounds);
    apply(implementation_->context, stroke);
}

void Canvas::fill_around_ellipse(const Box& box, const Box& bounds, Rgb colour) {
    cairo_t* const context = implementation_->context;
    cairo_new_path(context);
    cairo_rectangle(context, box.x, box.y, box.width, box.height);
    add_ellipse(context, bounds);
    set_colour(context, colour);
    cairo_set_fill_rule(context, CAIRO_FILL_RULE_EVEN_ODD);
    cairo_fill(context);
    cairo_set_fill_rule(context, CAIRO_FILL_RULE_WINDING);
}

void Canvas::clip(const Box& box) {
    cairo_save(implementation_->context);
    cairo_rectangle(implementation_->context, box.x, box.y, box.width, box.height);
    cairo_clip(implementation_->context);
}

void Canvas::release() {
    cairo_restore(implementation_->context);
}

double Canvas::text_width(std::string_view text, double size) const {
    return implementation_->typeface->width(text, size);
}

void Canvas::text(double x, double y, std::string_view text, const Lettering& lettering) {
    cairo_t* const context = implementation_->context;
    const double width = text_width(text, lettering.size);
    const double start = lettering.align == Align::Left     ? 0
                         : lettering.align == Align::Centre ? -width / 2
                                                            : -width;
    cairo_save(context);
    cairo_translate(context, x, y);
    if (lettering.upwards) cairo_rotate(context, -std::numbers::pi / 2);
    cairo_translate(context, start, 0);
    cairo_new_path(context);
    const OutlineSink sink{[context](double px, double py) { cairo_move_to(context, px, py); },
                           [context](double px, double py) { cairo_line_to(context, px, py); },
                           [context](double ax, double ay, double bx, double by, double px, double py) {
                               cairo_curve_to(context, ax, ay, bx, by, px, py);
                           }};
    implementation_->typeface->trace(text, lettering.size, sink);
    if (lettering.halo > 0) {
        set_colour(context, lettering.halo_colour);
        cairo_set_line_width(context, 2 * lettering.halo);
        cairo_set_line_join(context, CAIRO_LINE_JOIN_ROUND);
        cairo_stroke_preserve(context);
    }
    set_colour(context, lettering.colour);
    cairo_fill(context);
    cairo_restore(context);
}

std::string Canvas::png() const {
    std::string bytes;
    if (cairo_surface_write_to_png_stream(implementation_->surface, append, &bytes) != CAIRO_STATUS_SUCCESS)
        throw FileError("the picture could not be turned into a PNG file: memory may have run out");
    return bytes;
}

std::string Canvas::png(ColourTable& table) const {
    cairo_surface_flush(implementation_->surface);
    const auto across = static_cast<std::size_t>(width()), rows = static_cast<std::size_t>(height());
    std::vector<std::uint8_t> indices(across * rows);
    std::uint8_t* to = indices.data();
    std::uint32_t last = 0;
    std::uint8_t index = table.nearest({0, 0, 0});
    for (int y = 0; y < height(); ++y) {
        const unsigned char* from = implementation_->row(y);
        for (std::size_t x = 0; x < across; ++x, from += 4) {
            std::uint32_t word = 0;
            std::memcpy(&word, from, 4);
            word &= 0xFFFFFFU;
            if (word != last)
                index =
                    table.nearest({static_cast<std::uint8_t>(word >> 16U),
                                   static_cast<std::uint8_t>(word >> 8U), static_cast<std::uint8_t>(word)});
            last = word;
            *to++ = index;
        }
    }
    return write_indexed_png(width(), height(), indices, table.colours());
}

}  // namespace foreglow
