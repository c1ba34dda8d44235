// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/fits_pixel_reader.h"

#include <algorithm>
#include <bit>
#include <cmath>
#include <cstring>
#include <mutex>

#include "base/error.h"
#include "base/parallel.h"
#include "io/fits_cell_decode.h"
#include "io/fits_map_header.h"
#include "io/fits_table_file.h"

namespace foreglow {
namespace {

constexpr std::int64_t block = 4096;          // pixels of one task
constexpr std::size_t few_pixels = 64;        // read one by one; more are worth mapping the file
constexpr std::int64_t not_listed = -1;       // of a pixel that is not in a partial map
constexpr std::int64_t listing_step = 65536;  // pixel numbers looked at at a time

/// A pixel number and its place in a partial map whose numbers do not ascend.
struct ListedPixel {
    std::int64_t pixel = 0, entry = 0;
    bool operator<(const ListedPixel& other) const { return pixel < other.pixel; }
};

/// Where the cells of a column stand in a table.
class CellPlaces {
  public:
    CellPlaces(const FitsTableColumn& column, std::int64_t row_bytes)
        : repeat_(column.repeat), offset_(column.offset), width_(column.width), row_bytes_(row_bytes) {
        if (std::has_single_bit(static_cast<std::uint64_t>(repeat_)))
            shift_ = std::countr_zero(static_cast<std::uint64_t>(repeat_));
    }
    /// Returns the first byte of an entry; of none it is that of the first.
    [[nodiscard]] std::int64_t of(std::int64_t entry) const {
        const std::int64_t cell = std::max<std::int64_t>(entry, 0);
        // A division takes as long as all the rest, and rows usually hold 1 or 1024 cells.
        const std::int64_t row = shift_ >= 0 ? cell >> shift_ : cell / repeat_;
        return row * row_bytes_ + offset_ + (cell - row * repeat_) * width_;
    }

  private:
    std::int64_t repeat_, offset_, width_, row_bytes_;
    int shift_ = -1;
};

// A width known at compile time makes each copy one load and one store.
template <std::size_t width>
void gather(const CellPlaces& places, std::span<const std::int64_t> entries,
            std::span<const std::byte> mapped, std::span<std::byte> out) {
    for (std::size_t i = 0; i < entries.size(); ++i)
        std::memcpy(out.data() + i * width, mapped.data() + places.of(entries[i]), width);
}

}  // namespace

struct FitsPixelReader::Impl {
    explicit Impl(const FitsMapRequest& request_in)
        : request(request_in),
          file(request),
          header(make_fits_map_header(file.table(), request)),
          ordering(required_ordering(header, request)),
          bad_data(header.number("BAD_DATA")) {
        for (const int number : header.requested)
            columns.push_back(&file.table().columns[static_cast<std::size_t>(number - 1)]);
        for (std::size_t i = 0; i < header.columns.size(); ++i)
            if (header.columns[i].holds_pixel_numbers) numbers = &file.table().columns[i];
    }

    void read_cells(const FitsTableColumn& column, std::span<const std::int64_t> entries,
                    std::span<const std::byte> mapped, std::vector<std::byte>& bytes,
                    std::span<double> out) const;
    void read_block(std::span<const std::int64_t> pixels, std::span<const std::byte> mapped,
                    std::span<const std::span<double>> out, std::size_t first) const;
    [[nodiscard]] std::int64_t number_at(std::int64_t entry) const;
    [[nodiscard]] std::int64_t find_entry(std::int64_t file_pixel) const;
    void look_at_all_numbers() const;
    [[noreturn]] void fail_number(std::int64_t entry, const std::string& what) const;

    FitsMapRequest request;
    FitsTableFile file;
    FitsMapHeader header;
    Ordering ordering;
    std::optional<double> bad_data;
    std::vector<const FitsTableColumn*> columns;
    const FitsTableColumn* numbers = nullptr;  // of a partial map
    mutable std::once_flag looked_at_all;
    mutable std::vector<ListedPixel> sorted;  // filled where the numbers do not ascend
};

// Gathers the cells' bytes, then turns them into numbers as the reader of whole maps does.
void FitsPixelReader::Impl::read_cells(const FitsTableColumn& column, std::span<const std::int64_t> entries,
                                       std::span<const std::byte> mapped, std::vector<std::byte>& bytes,
                                       std::span<double> out) const {
    const auto width = static_cast<std::size_t>(column.width);
    bytes.resize(entries.size() * width);
    const CellPlaces places(column, file.table().row_bytes);
    if (mapped.empty()) {
        for (std::size_t i = 0; i < entries.size(); ++i)
            file.read_bytes(places.of(entries[i]), std::span(bytes).subspan(i * width, width));
    } else if (width == 4) {
        gather<4>(places, entries, mapped, bytes);
    } else if (width == 8) {
        gather<8>(places, entries, mapped, bytes);
    } else if (width == 2) {
        gather<2>(places, entries, mapped, bytes);
    } else {
        gather<1>(places, entries, mapped, bytes);
    }
    decode_cells(column, bad_data, bytes.data(), column.width, 1, out);
    if (!header.partial) return;
    for (std::size_t i = 0; i < entries.size(); ++i)
        if (entries[i] == not_listed) out[i] = std::numeric_limits<double>::quiet_NaN();
}

void FitsPixelReader::Impl::read_block(std::span<const std::int64_t> pixels,
                                       std::span<const std::byte> mapped,
                                       std::span<const std::span<double>> out, std::size_t first) const {
    std::vector<std::int64_t> entries(pixels.begin(), pixels.end());
    for (std::int64_t& entry : entries) {
        FOREGLOW_EXPECTS(entry >= 0 && entry < header.grid.npix());
        if (ordering == Ordering::Nested) entry = header.grid.ring_to_nested(entry);
        if (header.partial) entry = find_entry(entry);
    }
    std::vector<std::byte> bytes;
    for (std::size_t c = 0; c < columns.size(); ++c)
        read_cells(*columns[c], entries, mapped, bytes, out[c].subspan(first, pixels.size()));
}

void FitsPixelReader::Impl::fail_number(std::int64_t entry, const std::string& what) const {
    throw DataError(message_table(request, header.hdu) + "row " +
                    std::to_string(entry / numbers->repeat + 1) + ", column '" + numbers->name +
                    "': " + what + "; the file is damaged");
}

std::int64_t FitsPixelReader::Impl::number_at(std::int64_t entry) const {
    std::vector<std::byte> bytes;
    double number = 0;
    read_cells(*numbers, {&entry, 1}, {}, bytes, {&number, 1});
    if (!(std::floor(number) == number) || std::abs(number) > 9e15)
        fail_number(entry, "the pixel number is no whole number");
    return static_cast<std::int64_t>(number);
}

std::int64_t FitsPixelReader::Impl::find_entry(std::int64_t file_pixel) const {
    std::int64_t low = 0, high = header.listed;
    while (low < high) {
        const std::int64_t middle = low + (high - low) / 2;
        const std::int64_t number = number_at(middle);
        if (number == file_pixel) return middle;
        (number < file_pixel ? low : high) = number < file_pixel ? middle + 1 : middle;
    }
    std::call_once(looked_at_all, [this] { look_at_all_numbers(); });
    const auto found = std::lower_bound(sorted.begin(), sorted.end(), ListedPixel{file_pixel, 0});
    return found != sorted.end() && found->pixel == file_pixel ? found->entry : not_listed;
}

void FitsPixelReader::Impl::look_at_all_numbers() const {
    std::vector<ListedPixel> all(static_cast<std::size_t>(header.listed));
    std::vector<std::int64_t> entries;
    std::vector<std::byte> bytes;
    std::vector<double> values;
    for (std::int64_t first = 0; first < header.listed; first += listing_step) {
        entries.resize(static_cast<std::size_t>(std::min(listing_step, header.listed - first)));
        values.resize(entries.size());
        for (std::size_t i = 0; i < entries.size(); ++i)
            entries[i] = first + static_cast<std::int64_t>(i);
        read_cells(*numbers, entries, file.view(), bytes, values);
        for (std::size_t i = 0; i < entries.size(); ++i) {
            if (!(std::floor(values[i]) == values[i] && values[i] >= 0 &&
                  values[i] < static_cast<double>(header.grid.npix())))
                fail_number(entries[i],
                            "the pixel number is not one of NSIDE = " + std::to_string(header.grid.nside()));
            all[static_cast<std::size_t>(entries[i])] = {static_cast<std::int64_t>(values[i]), entries[i]};
        }
    }
    const bool ascends = std::is_sorted(all.begin(), all.end());
    if (!ascends) std::sort(all.begin(), all.end());
    for (std::size_t i = 1; i < all.size(); ++i)
        if (all[i].pixel == all[i - 1].pixel)
            fail_number(all[i].entry, "pixel " + std::to_string(all[i].pixel) + " comes a second time");
    if (!ascends) sorted = std::move(all);
}

FitsPixelReader::FitsPixelReader(const FitsMapRequest& request) : impl_(std::make_unique<Impl>(request)) {}
FitsPixelReader::~FitsPixelReader() = default;
FitsPixelReader::FitsPixelReader(FitsPixelReader&&) noexcept = default;
FitsPixelReader& FitsPixelReader::operator=(FitsPixelReader&&) noexcept = default;

const FitsMapHeader& FitsPixelReader::header() const {
    return impl_->header;
}

void FitsPixelReader::read(std::span<const std::int64_t> pixels,
                           std::span<const std::span<double>> out) const {
    FOREGLOW_EXPECTS(out.size() == impl_->columns.size());
    if (pixels.size() <= few_pixels) return impl_->read_block(pixels, {}, out, 0);
    const std::span<const std::byte> mapped = impl_->file.view();
    parallel_for_blocks(static_cast<std::int64_t>(pixels.size()), block,
                        [&](std::int64_t begin, std::int64_t end) {
                            const auto first = static_cast<std::size_t>(begin);
                            impl_->read_block(pixels.subspan(first, static_cast<std::size_t>(end - begin)),
                                              mapped, out, first);
                        });
}

}  // namespace foreglow
