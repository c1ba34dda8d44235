// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/fits_map_read.h"

#include <sys/mman.h>

#include <algorithm>
#include <atomic>
#include <cmath>
#include <limits>
#include <numeric>
#include <span>

#include "base/error.h"
#include "base/parallel.h"
#include "io/fits_cell_decode.h"
#include "io/fits_map_header.h"
#include "io/fits_table_file.h"

namespace foreglow {
namespace {

constexpr std::int64_t block_bytes = std::int64_t{1}
                                     << 19;  // read at a time; stays in the second-level cache
constexpr double undefined = std::numeric_limits<double>::quiet_NaN();

/// Makes npix values in large pages where the system has them: a third of the time goes into page faults
/// otherwise.
std::vector<double> make_values(std::size_t npix, double value) {
    constexpr std::uintptr_t page = 4096;
    std::vector<double> values;
    values.reserve(npix);
    const auto begin = (reinterpret_cast<std::uintptr_t>(values.data()) + page - 1) / page * page;
    const auto end = reinterpret_cast<std::uintptr_t>(values.data() + npix) / page * page;
    // Advice only: nothing depends on its being taken.
    if (end > begin) {
        // NOLINTNEXTLINE(performance-no-int-to-ptr): an address is rounded to a page
        ::madvise(reinterpret_cast<void*>(begin), end - begin, MADV_HUGEPAGE);
    }
    values.resize(npix, value);
    return values;
}

/// A part of the table: whole rows, or some cells of one long row.
struct TablePart {
    std::int64_t row = 0, rows = 0;
    std::int64_t cell = 0, cells = 0;  ///< of each of the rows
};

/// Cuts the table into parts of about block_bytes; rows that are longer than that are cut, too.
class TableParts {
  public:
    TableParts(const FitsTable& table, std::int64_t repeat)
        : rows_(table.rows),
          repeat_(repeat),
          rows_each_(std::max<std::int64_t>(1, block_bytes / table.row_bytes)) {
        const std::int64_t pieces = std::min(repeat, (table.row_bytes + block_bytes - 1) / block_bytes);
        cells_each_ = rows_each_ > 1 ? repeat : (repeat + pieces - 1) / pieces;
        pieces_ = (repeat + cells_each_ - 1) / cells_each_;
    }
    [[nodiscard]] std::int64_t count() const { return (rows_ + rows_each_ - 1) / rows_each_ * pieces_; }
    [[nodiscard]] TablePart operator[](std::int64_t i) const {
        const std::int64_t row = i / pieces_ * rows_each_, cell = i % pieces_ * cells_each_;
        return {row, std::min(rows_each_, rows_ - row), cell, std::min(cells_each_, repeat_ - cell)};
    }

  private:
    std::int64_t rows_, repeat_, rows_each_, cells_each_ = 1, pieces_ = 1;
};

/// Reads parts of a table's columns as numbers.
class PartReader {
  public:
    PartReader(const FitsTableFile& file, std::optional<double> bad_data)
        : file_(file), bad_data_(bad_data) {}

    /// Fetches the bytes of a part; columns are then decoded from them.
    void fetch(const TablePart& part) {
        part_ = part;
        if (part.rows == 1 && file_.table().row_bytes > block_bytes) return;  // decode reads its own cells
        bytes_.resize(static_cast<std::size_t>(part.rows * file_.table().row_bytes));
        file_.read_bytes(part.row * file_.table().row_bytes, bytes_);
    }
    /// @param out  [rows * cells] of the part
    void decode(const FitsTableColumn& column, std::span<double> out) {
        const FitsTable& table = file_.table();
        if (part_.rows == 1 && table.row_bytes > block_bytes) {
            bytes_.resize(static_cast<std::size_t>(part_.cells * column.width));
            file_.read_bytes(part_.row * table.row_bytes + column.offset + part_.cell * column.width, bytes_);
            decode_cells(column, bad_data_, bytes_.data(), 0, part_.cells, out);
            return;
        }
        decode_cells(column, bad_data_, bytes_.data() + column.offset, table.row_bytes, part_.cells, out);
    }

  private:
    const FitsTableFile& file_;
    std::optional<double> bad_data_;
    TablePart part_;
    std::vector<std::byte> bytes_;
};

std::vector<const FitsTableColumn*> requested_columns(const FitsTable& table, const FitsMapHeader& header) {
    std::vector<const FitsTableColumn*> columns;
    for (const int number : header.requested)
        columns.push_back(&table.columns[static_cast<std::size_t>(number - 1)]);
    return columns;
}

/// Reads the pixel numbers of a partial map, in RING order, each checked [listed].
std::vector<std::int64_t> read_pixel_numbers(const FitsTableFile& file, const FitsMapHeader& header,
                                             Ordering ordering, const FitsMapRequest& request) {
    const auto index = std::find_if(header.columns.begin(), header.columns.end(),
                                    [](const auto& c) { return c.holds_pixel_numbers; });
    const FitsTableColumn& column = file.table().columns[static_cast<std::size_t>(index->number - 1)];
    const TableParts parts(file.table(), column.repeat);
    PartReader reader(file, std::nullopt);
    std::vector<std::int64_t> pixels(static_cast<std::size_t>(header.listed));
    std::vector<bool> seen(static_cast<std::size_t>(header.grid.npix()));
    std::vector<double> numbers;
    for (std::int64_t p = 0; p < parts.count(); ++p) {
        const TablePart part = parts[p];
        numbers.resize(static_cast<std::size_t>(part.rows * part.cells));
        reader.fetch(part);
        reader.decode(column, numbers);
        const std::int64_t first = part.row * column.repeat + part.cell;
        for (std::size_t i = 0; i < numbers.size(); ++i) {
            const std::int64_t entry = first + static_cast<std::int64_t>(i);
            const double number = numbers[i];
            const auto fail = [&](const std::string& what) {
                throw DataError(message_table(request, header.hdu) + "row " +
                                std::to_string(entry / column.repeat + 1) + ", column '" + column.name +
                                "': " + what + "; the file is damaged");
            };
            if (!(std::floor(number) == number)) fail("the pixel number is no whole number");
            if (number < 0 || number >= static_cast<double>(header.grid.npix())) {
                fail("there is no pixel " +
                     std::to_string(static_cast<std::int64_t>(std::clamp(number, -9e18, 9e18))) +
                     " at NSIDE = " + std::to_string(header.grid.nside()) + " (0 to " +
                     std::to_string(header.grid.npix() - 1) + ")");
            }
            const auto pixel = static_cast<std::int64_t>(number);
            if (seen[static_cast<std::size_t>(pixel)])
                fail("pixel " + std::to_string(pixel) + " comes a second time");
            seen[static_cast<std::size_t>(pixel)] = true;
            pixels[static_cast<std::size_t>(entry)] =
                ordering == Ordering::Ring ? pixel : header.grid.nested_to_ring(pixel);
        }
    }
    return pixels;
}

/// Reads the columns of a map, part by part, and puts them in RING order.
void read_columns(const FitsTableFile& file, const FitsMapHeader& header,
                  const std::vector<std::int64_t>& listed, FitsMap& map) {
    const auto columns = requested_columns(file.table(), header);
    const std::int64_t repeat = columns.front()->repeat;
    const TableParts parts(file.table(), repeat);
    const std::optional<double> bad_data = header.number("BAD_DATA");
    std::atomic<std::int64_t> defined{0};
    parallel_for_blocks(parts.count(), 1, [&](std::int64_t p, std::int64_t) {
        const TablePart part = parts[p];
        const std::int64_t first = part.row * repeat + part.cell;
        const auto count = static_cast<std::size_t>(part.rows * part.cells);
        const bool in_place = listed.empty() && map.file_ordering == Ordering::Ring;
        PartReader reader(file, bad_data);
        reader.fetch(part);
        std::vector<std::int64_t> ring;
        if (!in_place && listed.empty()) {
            ring.resize(count);
            header.grid.ring_numbers(first, ring);
        }
        const std::span<const std::int64_t> pixels =
            listed.empty() ? std::span<const std::int64_t>(ring)
                           : std::span(listed).subspan(static_cast<std::size_t>(first), count);
        std::vector<double> scratch(in_place ? 0 : count);
        std::vector<unsigned char> whole(count, 1);
        for (std::size_t c = 0; c < columns.size(); ++c) {
            auto& values = map.columns[c].values;
            const std::span<double> decoded =
                in_place ? std::span(values).subspan(static_cast<std::size_t>(first), count)
                         : std::span(scratch);
            reader.decode(*columns[c], decoded);
            for (std::size_t i = 0; i < count; ++i)
                whole[i] &= static_cast<unsigned char>(decoded[i] == decoded[i]);
            if (in_place) continue;
            for (std::size_t i = 0; i < count; ++i)
                values[static_cast<std::size_t>(pixels[i])] = decoded[i];
        }
        defined += std::accumulate(whole.begin(), whole.end(), std::int64_t{0});
    });
    map.undefined = header.grid.npix() - defined;
}

}  // namespace

FitsMapHeader read_fits_map_header(const FitsMapRequest& request) {
    const FitsTableFile file(request);
    return make_fits_map_header(file.table(), request);
}

FitsMap read_fits_map(const FitsMapRequest& request) {
    const FitsTableFile file(request);
    const FitsMapHeader header = make_fits_map_header(file.table(), request);
    if (header.requested.empty()) {
        throw DataError(message_table(request, header.hdu) +
                        "there is no column but the pixel numbers: no map is in it");
    }
    FitsMap map;
    map.grid = header.grid;
    map.file_ordering = required_ordering(header, request);
    map.frame = header.frame;
    map.convention = header.convention;
    map.partial = header.partial;
    map.notices = header.notices;
    if (map.file_ordering == Ordering::Nested) {
        map.notices.push_back(message_table(request, header.hdu) + "NESTED order is converted to RING");
    }
    std::vector<std::int64_t> listed;
    if (header.partial) listed = read_pixel_numbers(file, header, map.file_ordering, request);
    const auto npix = static_cast<std::size_t>(header.grid.npix());
    for (const int number : header.requested) {
        const auto& info = header.columns[static_cast<std::size_t>(number - 1)];
        map.columns.push_back({info.name, info.unit, make_values(npix, header.partial ? undefined : 0.0)});
    }
    read_columns(file, header, listed, map);
    return map;
}

CoverageMap read_coverage(const FitsMapRequest& request) {
    CoverageMap coverage;
    const FitsTableFile file(request);
    const FitsMapHeader header = make_fits_map_header(file.table(), request);
    if (header.requested.empty()) {
        coverage.pixels = read_pixel_numbers(file, header, required_ordering(header, request), request);
        std::sort(coverage.pixels.begin(), coverage.pixels.end());
        coverage.grid = header.grid;
        coverage.frame = header.frame;
        coverage.notices = header.notices;
        return coverage;
    }
    const FitsMap map = read_fits_map(request);
    const auto& values = map.columns.front().values;
    for (std::int64_t pixel = 0; pixel < map.grid.npix(); ++pixel) {
        const double value = values[static_cast<std::size_t>(pixel)];
        if (value == value && value != 0) coverage.pixels.push_back(pixel);
    }
    coverage.grid = map.grid;
    coverage.frame = map.frame;
    coverage.notices = map.notices;
    return coverage;
}

}  // namespace foreglow
