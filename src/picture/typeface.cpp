// SPDX-License-Identifier: GPL-2.0-or-later
#include "picture/typeface.h"

#include <ft2build.h>
#include FT_FREETYPE_H
#include FT_OUTLINE_H

#include <cmath>
#include <cstdint>
#include <fstream>
#include <string>
#include <vector>

#include "base/error.h"

namespace foreglow {
namespace {

constexpr const char* font_path = "/usr/share/fonts/truetype/dejavu/DejaVuSans.ttf";

std::vector<FT_Byte> read_font() {
    std::ifstream file(font_path, std::ios::binary | std::ios::ate);
    std::vector<FT_Byte> bytes(file ? static_cast<std::size_t>(file.tellg()) : 0);
    file.seekg(0);
    file.read(reinterpret_cast<char*>(bytes.data()), static_cast<std::streamsize>(bytes.size()));
    if (!file || bytes.empty())
        throw FileError(std::string("the font ") + font_path +
                        ", which pictures are lettered with, cannot be read: install the package "
                        "fonts-dejavu-core");
    return bytes;
}

/// Takes the next character off UTF-8 text; a broken sequence gives U+FFFD for its first byte.
std::uint32_t take_character(std::string_view& text) {
    constexpr std::uint32_t broken = 0xFFFD;
    const auto first = static_cast<unsigned char>(text.front());
    text.remove_prefix(1);
    if (first < 0x80) return first;
    const int following = first >= 0xF0 && first < 0xF8 ? 3 : first >= 0xE0 ? 2 : first >= 0xC0 ? 1 : 0;
    if (following == 0 || first >= 0xF8 || text.size() < static_cast<std::size_t>(following)) return broken;
    std::uint32_t code = first & (0x3FU >> following);
    for (int i = 0; i < following; ++i) {
        const auto next = static_cast<unsigned char>(text[static_cast<std::size_t>(i)]);
        if ((next & 0xC0U) != 0x80U) return broken;
        code = (code << 6U) | (next & 0x3FU);
    }
    text.remove_prefix(static_cast<std::size_t>(following));
    return code;
}

struct Pen {
    const OutlineSink* sink;
    double origin;
    double scale;
    double last_x = 0, last_y = 0;
    double x(const FT_Vector* v) const { return origin + static_cast<double>(v->x) * scale; }
    double y(const FT_Vector* v) const { return -static_cast<double>(v->y) * scale; }
};

int on_move(const FT_Vector* to, void* user) {
    auto& pen = *static_cast<Pen*>(user);
    pen.sink->move_to(pen.last_x = pen.x(to), pen.last_y = pen.y(to));
    return 0;
}

int on_line(const FT_Vector* to, void* user) {
    auto& pen = *static_cast<Pen*>(user);
    pen.sink->line_to(pen.last_x = pen.x(to), pen.last_y = pen.y(to));
    return 0;
}

int on_quadratic(const FT_Vector* control, const FT_Vector* to, void* user) {
    auto& pen = *static_cast<Pen*>(user);
    const double cx = pen.x(control), cy = pen.y(control), x = pen.x(to), y = pen.y(to);
    pen.sink->curve_to(pen.last_x + 2.0 / 3.0 * (cx - pen.last_x), pen.last_y + 2.0 / 3.0 * (cy - pen.last_y),
                       x + 2.0 / 3.0 * (cx - x), y + 2.0 / 3.0 * (cy - y), x, y);
    pen.last_x = x;
    pen.last_y = y;
    return 0;
}

int on_cubic(const FT_Vector* first, const FT_Vector* second, const FT_Vector* to, void* user) {
    auto& pen = *static_cast<Pen*>(user);
    pen.sink->curve_to(pen.x(first), pen.y(first), pen.x(second), pen.y(second), pen.x(to), pen.y(to));
    pen.last_x = pen.x(to);
    pen.last_y = pen.y(to);
    return 0;
}

}  // namespace

struct Typeface::Implementation {
    std::vector<FT_Byte> bytes = read_font();
    FT_Library library = nullptr;
    FT_Face face = nullptr;

    Implementation() {
        const bool ready =
            FT_Init_FreeType(&library) == 0 &&
            FT_New_Memory_Face(library, bytes.data(), static_cast<FT_Long>(bytes.size()), 0, &face) == 0;
        if (!ready) {
            if (library != nullptr) FT_Done_FreeType(library);
            throw FileError(std::string("the font ") + font_path +
                            " is not a usable TrueType file: reinstall the package fonts-dejavu-core");
        }
    }
    ~Implementation() {
        FT_Done_Face(face);
        FT_Done_FreeType(library);
    }
    Implementation(const Implementation&) = delete;
    Implementation& operator=(const Implementation&) = delete;

    /// Loads each letter in turn, unhinted in font units, and returns the whole advance in font units.
    double walk(std::string_view text, const std::function<void(FT_Outline&, double)>& visit) const {
        double advance = 0;
        FT_UInt previous = 0;
        while (!text.empty()) {
            const FT_UInt glyph = FT_Get_Char_Index(face, take_character(text));
            FT_Vector kerning{0, 0};
            if (previous != 0 && glyph != 0)
                FT_Get_Kerning(face, previous, glyph, FT_KERNING_UNSCALED, &kerning);
            advance += static_cast<double>(kerning.x);
            if (FT_Load_Glyph(face, glyph, FT_LOAD_NO_SCALE) != 0) continue;
            if (visit) visit(face->glyph->outline, advance);
            advance += static_cast<double>(face->glyph->advance.x);
            previous = glyph;
        }
        return advance;
    }
};

Typeface::Typeface() : implementation_(std::make_unique<Implementation>()) {}
Typeface::~Typeface() = default;
Typeface::Typeface(Typeface&&) noexcept = default;
Typeface& Typeface::operator=(Typeface&&) noexcept = default;

double Typeface::width(std::string_view text, double size) const {
    return implementation_->walk(text, nullptr) * size / implementation_->face->units_per_EM;
}

void Typeface::trace(std::string_view text, double size, const OutlineSink& sink) const {
    const double scale = size / implementation_->face->units_per_EM;
    FT_Outline_Funcs calls{};
    calls.move_to = on_move;
    calls.line_to = on_line;
    calls.conic_to = on_quadratic;
    calls.cubic_to = on_cubic;
    implementation_->walk(text, [&](FT_Outline& outline, double advance) {
        Pen pen{&sink, advance * scale, scale};
        FT_Outline_Decompose(&outline, &calls, &pen);
    });
}

void check_typeface() {
    const Typeface typeface;
}

}  // namespace foreglow
