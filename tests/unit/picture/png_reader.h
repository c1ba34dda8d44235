// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cairo.h>

#include <cstdint>
#include <cstring>
#include <string>
#include <vector>

#include "picture/colour.h"

namespace foreglow::testing {

/// A PNG file as its pixels, row by row.
struct PngPixels {
    int width = 0, height = 0;
    std::vector<Rgb> pixels;

    [[nodiscard]] Rgb at(int x, int y) const {
        return pixels.at(static_cast<std::size_t>(y) * static_cast<std::size_t>(width) +
                         static_cast<std::size_t>(x));
    }
};

inline PngPixels read_png(const std::string& bytes) {
    struct Source {
        const std::string& bytes;
        std::size_t next = 0;
    } source{bytes};
    const auto take = [](void* user, unsigned char* to, unsigned int length) {
        auto& from = *static_cast<Source*>(user);
        if (from.next + length > from.bytes.size()) return CAIRO_STATUS_READ_ERROR;
        std::memcpy(to, from.bytes.data() + from.next, length);
        from.next += length;
        return CAIRO_STATUS_SUCCESS;
    };
    cairo_surface_t* const surface = cairo_image_surface_create_from_png_stream(take, &source);
    PngPixels out;
    if (cairo_surface_status(surface) == CAIRO_STATUS_SUCCESS) {
        out.width = cairo_image_surface_get_width(surface);
        out.height = cairo_image_surface_get_height(surface);
        for (int y = 0; y < out.height; ++y)
            for (int x = 0; x < out.width; ++x) {
                std::uint32_t word = 0;
                std::memcpy(&word,
                            cairo_image_surface_get_data(surface) +
                                static_cast<std::ptrdiff_t>(y) * cairo_image_surface_get_stride(surface) +
                                4L * x,
                            4);
                out.pixels.push_back({static_cast<std::uint8_t>(word >> 16U),
                                      static_cast<std::uint8_t>(word >> 8U),
                                      static_cast<std::uint8_t>(word)});
            }
    }
    cairo_surface_destroy(surface);
    return out;
}

}  // namespace foreglow::testing
