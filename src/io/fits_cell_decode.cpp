// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/fits_cell_decode.h"

#include <bit>
#include <cmath>
#include <cstring>
#include <limits>

#include "base/error.h"
#include "io/fits_sentinel.h"

namespace foreglow {
namespace {

constexpr double undefined = std::numeric_limits<double>::quiet_NaN();

template <class Bits>
Bits load_big_endian(const std::byte* at) {
    Bits bits = 0;
    std::memcpy(&bits, at, sizeof bits);
    if constexpr (sizeof bits == 2) return __builtin_bswap16(bits);
    if constexpr (sizeof bits == 4) return __builtin_bswap32(bits);
    if constexpr (sizeof bits == 8) return __builtin_bswap64(bits);
    return bits;
}

/// Calls take(cell bytes, index) for each cell, row by row.
template <class Take>
void for_each_cell(const std::byte* cells, std::int64_t stride, std::int64_t per_row, std::int64_t width,
                   std::size_t count, const Take& take) {
    const auto rows = static_cast<std::int64_t>(count) / per_row;
    if (per_row == 1) {
        for (std::int64_t row = 0; row < rows; ++row)
            take(cells + row * stride, row);
        return;
    }
    for (std::int64_t row = 0; row < rows; ++row) {
        const std::byte* const first = cells + row * stride;
        for (std::int64_t i = 0; i < per_row; ++i)
            take(first + i * width, row * per_row + i);
    }
}

template <class Real, class Bits>
void decode_real(const std::byte* cells, std::int64_t stride, std::int64_t per_row, double* out,
                 std::size_t count) {
    for_each_cell(cells, stride, per_row, sizeof(Real), count, [out](const std::byte* at, std::int64_t i) {
        out[i] = static_cast<double>(std::bit_cast<Real>(load_big_endian<Bits>(at)));
    });
}

template <class Whole, class Bits>
void decode_whole(const FitsTableColumn& column, const std::byte* cells, std::int64_t stride,
                  std::int64_t per_row, double* out, std::size_t count) {
    const bool has_null = column.null_value.has_value();
    const std::int64_t null = column.null_value.value_or(0);
    for_each_cell(cells, stride, per_row, sizeof(Whole), count, [=](const std::byte* at, std::int64_t i) {
        const auto whole = static_cast<std::int64_t>(static_cast<Whole>(load_big_endian<Bits>(at)));
        out[i] = has_null && whole == null ? undefined : static_cast<double>(whole);
    });
}

/// The band of values around a sentinel that count as it.
struct Sentinel {
    explicit Sentinel(double value) {
        const double width = std::fabs(value) * fits_bad_data_tolerance;
        low = value - width;
        high = value + width;
    }
    double low, high;
};

void mark_undefined(std::optional<double> bad_data, std::span<double> values) {
    const Sentinel unseen(fits_bad_data);
    const Sentinel bad(bad_data.value_or(fits_bad_data));
    constexpr double largest = std::numeric_limits<double>::max();
    for (double& value : values) {
        const bool is_bad = (value >= unseen.low) & (value <= unseen.high);
        const bool is_other = (value >= bad.low) & (value <= bad.high);
        const bool is_infinite = std::fabs(value) > largest;
        value = (is_bad | is_other | is_infinite) ? undefined : value;
    }
}

}  // namespace

void decode_cells(const FitsTableColumn& column, std::optional<double> bad_data, const std::byte* cells,
                  std::int64_t stride, std::int64_t per_row, std::span<double> out) {
    FOREGLOW_EXPECTS(per_row >= 1 && static_cast<std::int64_t>(out.size()) % per_row == 0);
    double* const to = out.data();
    switch (column.type) {
        case 'E':
            decode_real<float, std::uint32_t>(cells, stride, per_row, to, out.size());
            break;
        case 'D':
            decode_real<double, std::uint64_t>(cells, stride, per_row, to, out.size());
            break;
        case 'B':
            decode_whole<std::uint8_t, std::uint8_t>(column, cells, stride, per_row, to, out.size());
            break;
        case 'I':
            decode_whole<std::int16_t, std::uint16_t>(column, cells, stride, per_row, to, out.size());
            break;
        case 'J':
            decode_whole<std::int32_t, std::uint32_t>(column, cells, stride, per_row, to, out.size());
            break;
        case 'K':
            decode_whole<std::int64_t, std::uint64_t>(column, cells, stride, per_row, to, out.size());
            break;
        case 'L':
            for_each_cell(cells, stride, per_row, 1, out.size(), [to](const std::byte* at, std::int64_t i) {
                const auto letter = static_cast<char>(*at);
                to[i] = letter == 'T' ? 1.0 : letter == 'F' ? 0.0 : undefined;
            });
            return;
        default:
            FOREGLOW_EXPECTS(false && "a column of numbers");
    }
    if (column.scale != 1.0 || column.zero != 0.0) {
        // FITS scales what the bytes say, so a sentinel written by value is looked for afterwards.
        for (double& value : out)
            value = column.zero + column.scale * value;
    }
    mark_undefined(bad_data, out);
}

}  // namespace foreglow
