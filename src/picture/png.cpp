// SPDX-License-Identifier: GPL-2.0-or-later
#include "picture/png.h"

#include <zlib.h>

#include <string_view>

#include "base/error.h"

namespace foreglow {
namespace {

std::string big_endian(std::uint32_t value) {
    return {static_cast<char>(value >> 24U), static_cast<char>(value >> 16U), static_cast<char>(value >> 8U),
            static_cast<char>(value)};
}

/// Length, name, content and the checksum over name and content.
void append_chunk(std::string& file, std::string_view name, std::string_view content) {
    file += big_endian(static_cast<std::uint32_t>(content.size()));
    const std::size_t from = file.size();
    file += name;
    file += content;
    const auto* const summed = reinterpret_cast<const Bytef*>(file.data() + from);
    file += big_endian(static_cast<std::uint32_t>(crc32(0, summed, static_cast<uInt>(file.size() - from))));
}

std::string compress_runs(std::string& bytes) {
    z_stream stream{};
    constexpr int largest_window = 15, largest_memory = 9;
    if (deflateInit2(&stream, 1, Z_DEFLATED, largest_window, largest_memory, Z_RLE) != Z_OK)
        throw FileError("the picture could not be turned into a PNG file: memory has run out");
    std::string out(deflateBound(&stream, static_cast<uLong>(bytes.size())), '\0');
    stream.next_in = reinterpret_cast<Bytef*>(bytes.data());
    stream.avail_in = static_cast<uInt>(bytes.size());
    stream.next_out = reinterpret_cast<Bytef*>(out.data());
    stream.avail_out = static_cast<uInt>(out.size());
    const int status = deflate(&stream, Z_FINISH);
    out.resize(stream.total_out);
    deflateEnd(&stream);
    FOREGLOW_EXPECTS(status == Z_STREAM_END);
    return out;
}

}  // namespace

std::string write_indexed_png(int width, int height, std::span<const std::uint8_t> indices,
                              std::span<const Rgb> colours) {
    FOREGLOW_EXPECTS(width > 0 && height > 0 && !colours.empty() && colours.size() <= 256);
    const auto across = static_cast<std::size_t>(width), rows = static_cast<std::size_t>(height);
    FOREGLOW_EXPECTS(indices.size() == across * rows && indices.size() < (1U << 30U));
    std::string lines;
    lines.reserve(indices.size() + rows);
    for (std::size_t j = 0; j < rows; ++j) {
        lines += '\0';  // filter: none
        lines.append(reinterpret_cast<const char*>(indices.data() + j * across), across);
    }
    std::string table;
    for (const Rgb& c : colours)
        for (const std::uint8_t part : {c.red, c.green, c.blue})
            table += static_cast<char>(part);
    std::string header =
        big_endian(static_cast<std::uint32_t>(width)) + big_endian(static_cast<std::uint32_t>(height));
    header += std::string("\x08\x03\0\0\0",
                          5);  // 8 bits, table of colours, deflate, the one filter method, no interlace
    std::string file = "\x89PNG\r\n\x1a\n";
    append_chunk(file, "IHDR", header);
    append_chunk(file, "PLTE", table);
    append_chunk(file, "IDAT", compress_runs(lines));
    append_chunk(file, "IEND", "");
    return file;
}

}  // namespace foreglow
