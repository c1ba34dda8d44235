// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/fits_map_write.h"

#include <sys/mman.h>

#include <algorithm>
#include <atomic>
#include <cerrno>
#include <cstring>
#include <mutex>

#include "base/error.h"
#include "base/parallel.h"
#include "io/atomic_file.h"
#include "io/fits_cell_encode.h"
#include "io/fits_header_text.h"

namespace foreglow {
namespace {

constexpr std::int64_t rows_buffer_bytes = std::int64_t{1} << 18;  // fits the second-level cache

}  // namespace

struct FitsMapWriter::Impl {
    Impl(const std::filesystem::path& path, const FitsMapLayout& layout_in);
    ~Impl() {
        if (mapped != nullptr) ::munmap(mapped, static_cast<std::size_t>(file_bytes));
    }
    Impl(const Impl&) = delete;
    Impl& operator=(const Impl&) = delete;

    template <class Value>
    void write_range(std::int64_t first, std::span<const std::span<const Value>> columns);
    template <class Value>
    void write_rows(std::int64_t first_row, std::int64_t rows, std::size_t skip,
                    std::span<const std::span<const Value>> columns);
    template <class Value>
    void write_piece(std::int64_t row, std::int64_t cell, std::int64_t count, std::size_t skip,
                     std::span<const std::span<const Value>> columns);
    template <class Value>
    void write_listed(std::int64_t first, std::span<const std::span<const Value>> columns);
    template <class Value>
    void write_scattered(std::span<const std::int64_t> file_pixels,
                         std::span<const std::span<const Value>> columns);

    [[nodiscard]] std::int64_t offset_of(std::int64_t row, std::int64_t column, std::int64_t cell) const {
        return data_offset + row * shape.row_bytes() + shape.index_bytes +
               (column * shape.row_pixels + cell) * shape.cell_bytes;
    }
    void note(const CellTally& tally) {
        if (tally.infinite) {
            throw NumericError("a value for " + file.path().string() + " is infinite or too large for " +
                               (layout.float64 ? "float64" : "float32; ask for precision = \"float64\""));
        }
        data_sum.fetch_add(fold_checksum(tally.words), std::memory_order_relaxed);
    }
    void add_index(std::int64_t row, std::byte* out);
    std::byte* map_file();

    FitsMapLayout layout;
    FitsTableShape shape;
    std::int64_t data_offset = 0, file_bytes = 0;
    AtomicFile file;
    std::atomic<std::uint64_t> data_sum{0};  // of folded sums: 2^32 pieces fit
    std::atomic<std::int64_t> written{0};
    std::mutex mapping;
    std::byte* mapped = nullptr;
};

FitsMapWriter::Impl::Impl(const std::filesystem::path& path, const FitsMapLayout& layout_in)
    : layout(layout_in), shape(make_table_shape(layout)), file(path) {
    if (layout.pixels) {
        const auto& pixels = *layout.pixels;
        FOREGLOW_EXPECTS(!pixels.empty() && pixels.front() >= 0 &&
                         pixels.back() < 12LL * layout.nside * layout.nside);
        FOREGLOW_EXPECTS(std::adjacent_find(pixels.begin(), pixels.end(), std::greater_equal<>()) ==
                         pixels.end());
    }
    const std::string header = make_map_headers(layout, 0);
    data_offset = static_cast<std::int64_t>(header.size());
    file_bytes = data_offset + round_up_to_fits_block(shape.data_bytes());
    file.set_length(file_bytes);
    file.write_at(0, std::as_bytes(std::span(header)));
}

/// Puts a row's pixel number before its cells.
void FitsMapWriter::Impl::add_index(std::int64_t row, std::byte* out) {
    const auto pixel = static_cast<std::uint32_t>((*layout.pixels)[static_cast<std::size_t>(row)]);
    const std::uint32_t swapped = __builtin_bswap32(pixel);
    std::memcpy(out, &swapped, sizeof swapped);
    data_sum.fetch_add(pixel, std::memory_order_relaxed);
}

/// Maps the file's pages once; its space is taken first, so that a full disk is an error and no signal.
std::byte* FitsMapWriter::Impl::map_file() {
    const std::lock_guard lock(mapping);
    if (mapped != nullptr) return mapped;
    file.reserve(file_bytes);
    void* address = ::mmap(nullptr, static_cast<std::size_t>(file_bytes), PROT_READ | PROT_WRITE, MAP_SHARED,
                           file.descriptor(), 0);
    if (address == MAP_FAILED) file.fail("write", errno);
    mapped = static_cast<std::byte*>(address);
    return mapped;
}

/// Writes whole rows, interleaved in a buffer; `skip` values of each column come before them.
template <class Value>
void FitsMapWriter::Impl::write_rows(std::int64_t first_row, std::int64_t rows, std::size_t skip,
                                     std::span<const std::span<const Value>> columns) {
    const std::int64_t row_bytes = shape.row_bytes();
    const std::int64_t rows_at_once =
        std::clamp<std::int64_t>(rows_buffer_bytes / row_bytes, 1, std::max<std::int64_t>(rows, 1));
    const auto buffer =
        std::make_unique_for_overwrite<std::byte[]>(static_cast<std::size_t>(rows_at_once * row_bytes));
    const auto cells = static_cast<std::size_t>(shape.row_pixels);
    for (std::int64_t done = 0; done < rows;) {
        const std::int64_t now = std::min(rows_at_once, rows - done);
        CellTally tally;
        std::byte* out = buffer.get();
        for (std::int64_t row = 0; row < now; ++row) {
            if (layout.pixels) add_index(first_row + done + row, out);
            out += shape.index_bytes;
            for (const auto column : columns) {
                const auto piece = encode_cells(column.subspan(skip, cells), layout.float64, out);
                tally.words += fold_checksum(piece.words);
                tally.infinite |= piece.infinite;
                out += shape.row_pixels * shape.cell_bytes;
            }
            skip += cells;
        }
        note(tally);
        file.write_at(offset_of(first_row + done, 0, 0) - shape.index_bytes,
                      std::span<const std::byte>(buffer.get(), static_cast<std::size_t>(now * row_bytes)));
        done += now;
    }
}

/// Writes some cells of one row, column by column.
template <class Value>
void FitsMapWriter::Impl::write_piece(std::int64_t row, std::int64_t cell, std::int64_t count,
                                      std::size_t skip, std::span<const std::span<const Value>> columns) {
    std::vector<std::byte> buffer(static_cast<std::size_t>(count * shape.cell_bytes));
    for (std::size_t c = 0; c < columns.size(); ++c) {
        note(encode_cells(columns[c].subspan(skip, static_cast<std::size_t>(count)), layout.float64,
                          buffer.data()));
        file.write_at(offset_of(row, static_cast<std::int64_t>(c), cell), buffer);
    }
}

/// Writes those pixels of a range that a partial-sky file lists: gathered first, then as rows.
template <class Value>
void FitsMapWriter::Impl::write_listed(std::int64_t first, std::span<const std::span<const Value>> columns) {
    const auto& pixels = *layout.pixels;
    const std::int64_t end = first + static_cast<std::int64_t>(columns[0].size());
    const auto from = std::lower_bound(pixels.begin(), pixels.end(), first);
    const auto to = std::lower_bound(from, pixels.end(), end);
    const auto count = static_cast<std::size_t>(to - from);
    std::vector<std::vector<Value>> gathered(columns.size(), std::vector<Value>(count));
    std::vector<std::span<const Value>> views;
    for (std::size_t c = 0; c < columns.size(); ++c) {
        for (std::size_t i = 0; i < count; ++i) {
            gathered[c][i] =
                columns[c][static_cast<std::size_t>(from[static_cast<std::ptrdiff_t>(i)] - first)];
        }
        views.emplace_back(gathered[c]);
    }
    write_rows<Value>(from - pixels.begin(), static_cast<std::int64_t>(count), 0, views);
    written += static_cast<std::int64_t>(count);
}

template <class Value>
void FitsMapWriter::Impl::write_range(std::int64_t first, std::span<const std::span<const Value>> columns) {
    FOREGLOW_EXPECTS(columns.size() == layout.columns.size());
    const auto count = static_cast<std::int64_t>(columns[0].size());
    for (const auto column : columns)
        FOREGLOW_EXPECTS(static_cast<std::int64_t>(column.size()) == count);
    FOREGLOW_EXPECTS(first >= 0 && first + count <= 12LL * layout.nside * layout.nside);
    if (layout.pixels) return write_listed<Value>(first, columns);
    std::int64_t pixel = first;
    const std::int64_t end = first + count;
    while (pixel < end) {
        const std::int64_t row = pixel / shape.row_pixels, cell = pixel % shape.row_pixels;
        const auto skip = static_cast<std::size_t>(pixel - first);
        if (cell == 0 && end - pixel >= shape.row_pixels) {
            const std::int64_t rows = (end - pixel) / shape.row_pixels;
            write_rows<Value>(row, rows, skip, columns);
            pixel += rows * shape.row_pixels;
        } else {
            const std::int64_t piece = std::min(shape.row_pixels - cell, end - pixel);
            write_piece<Value>(row, cell, piece, skip, columns);
            pixel += piece;
        }
    }
    written += count;
}

template <class Value>
void FitsMapWriter::Impl::write_scattered(std::span<const std::int64_t> file_pixels,
                                          std::span<const std::span<const Value>> columns) {
    FOREGLOW_EXPECTS(columns.size() == layout.columns.size());
    for (const auto column : columns)
        FOREGLOW_EXPECTS(column.size() == file_pixels.size());
    const std::int64_t npix = 12LL * layout.nside * layout.nside;
    std::byte* const bytes = map_file();
    CellTally tally;
    std::int64_t count = 0;
    for (std::size_t i = 0; i < file_pixels.size(); ++i) {
        std::int64_t position = file_pixels[i];
        FOREGLOW_EXPECTS(position >= 0 && position < npix);
        if (layout.pixels) {
            const auto& pixels = *layout.pixels;
            const auto at = std::lower_bound(pixels.begin(), pixels.end(), position);
            if (at == pixels.end() || *at != position) continue;
            position = at - pixels.begin();
            add_index(position, bytes + offset_of(position, 0, 0) - shape.index_bytes);
        }
        const std::int64_t row = position / shape.row_pixels, cell = position % shape.row_pixels;
        for (std::size_t c = 0; c < columns.size(); ++c) {
            std::byte* const out = bytes + offset_of(row, static_cast<std::int64_t>(c), cell);
            const auto piece = encode_cells(columns[c].subspan(i, 1), layout.float64, out);
            tally.words += fold_checksum(piece.words);
            tally.infinite |= piece.infinite;
        }
        ++count;
    }
    note(tally);
    written += count;
}

FitsMapWriter::FitsMapWriter(const std::filesystem::path& path, const FitsMapLayout& layout)
    : impl_(std::make_unique<Impl>(path, layout)) {}
FitsMapWriter::~FitsMapWriter() = default;
FitsMapWriter::FitsMapWriter(FitsMapWriter&&) noexcept = default;
FitsMapWriter& FitsMapWriter::operator=(FitsMapWriter&&) noexcept = default;

void FitsMapWriter::write_pixels(std::int64_t first, Columns columns) {
    impl_->write_range<double>(first, columns);
}
void FitsMapWriter::write_pixels(std::int64_t first, FloatColumns columns) {
    impl_->write_range<float>(first, columns);
}
void FitsMapWriter::write_pixels_scattered(std::span<const std::int64_t> file_pixels, Columns columns) {
    impl_->write_scattered<double>(file_pixels, columns);
}
void FitsMapWriter::write_pixels_scattered(std::span<const std::int64_t> file_pixels, FloatColumns columns) {
    impl_->write_scattered<float>(file_pixels, columns);
}

void FitsMapWriter::finish() {
    FOREGLOW_EXPECTS(impl_->written == impl_->shape.rows * impl_->shape.row_pixels);
    const std::string header = make_map_headers(impl_->layout, fold_checksum(impl_->data_sum));
    impl_->file.write_at(0, std::as_bytes(std::span(header)));
    impl_->file.commit();
}

std::int64_t fits_map_file_bytes(const FitsMapLayout& layout) {
    return static_cast<std::int64_t>(make_map_headers(layout, 0).size()) +
           round_up_to_fits_block(make_table_shape(layout).data_bytes());
}

void write_fits_map(const std::filesystem::path& path, const FitsMapLayout& layout,
                    FitsMapWriter::Columns columns) {
    const HealpixGrid grid(layout.nside);
    for (const auto column : columns)
        FOREGLOW_EXPECTS(static_cast<std::int64_t>(column.size()) == grid.npix());
    FitsMapWriter writer(path, layout);
    constexpr std::int64_t block = std::int64_t{1} << 16;  // whole rows, a few hundred kilobytes
    parallel_for_blocks(grid.npix(), block, [&](std::int64_t begin, std::int64_t end) {
        const auto count = static_cast<std::size_t>(end - begin);
        std::vector<std::span<const double>> views;
        if (layout.ordering == Ordering::Ring) {
            for (const auto column : columns)
                views.push_back(column.subspan(static_cast<std::size_t>(begin), count));
            writer.write_pixels(begin, views);
            return;
        }
        std::vector<std::int64_t> ring(count);
        grid.ring_numbers(begin, ring);
        std::vector<double> gathered(count * columns.size());
        for (std::size_t c = 0; c < columns.size(); ++c) {
            double* const out = gathered.data() + c * count;
            for (std::size_t i = 0; i < count; ++i)
                out[i] = columns[c][static_cast<std::size_t>(ring[i])];
            views.emplace_back(out, count);
        }
        writer.write_pixels(begin, views);
    });
    writer.finish();
}

}  // namespace foreglow
