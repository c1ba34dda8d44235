// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/fits_cell_decode.h"

#include <bit>
#include <cmath>
#include <cstring>
#include <limits>

#include "base/error.h"
#include "base/vector_width.h"
#include "io/fits_sentinel.h"

namespace foreglow {
namespace {

constexpr double undefined = std::numeric_limits<double>::quiet_NaN();

template <class Bits>
FOREGLOW_INLINE Bits load_big_endian(const std::byte* at) {
    Bits bits = 0;
    std::memcpy(&bits, at, sizeof bits);
    if constexpr (sizeof bits == 2) return __builtin_bswap16(bits);
    if constexpr (sizeof bits == 4) return __builtin_bswap32(bits);
    if constexpr (sizeof bits == 8) return __builtin_bswap64(bits);
    return bits;
}

/// Calls take(cell bytes, index) for each cell, row by row.
template <class Take>
FOREGLOW_INLINE void for_each_cell(const std::byte* cells, std::int64_t stride, std::int64_t per_row,
                                   std::int64_t width, std::size_t count, const Take& take) {
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

/// The two sentinels of a column; the second is the first where there is no BAD_DATA card.
struct Sentinels {
    Sentinel unseen{fits_bad_data}, bad{fits_bad_data};
};

/// Sentinels that no value meets.
Sentinels no_sentinels() {
    const Sentinel none(undefined);
    return {none, none};
}

FOREGLOW_INLINE double defined_or_nan(const Sentinels& sentinels, double value) {
    constexpr double largest = std::numeric_limits<double>::max();
    const bool is_bad = (value >= sentinels.unseen.low) & (value <= sentinels.unseen.high);
    const bool is_other = (value >= sentinels.bad.low) & (value <= sentinels.bad.high);
    const bool is_infinite = std::fabs(value) > largest;
    return (is_bad | is_other | is_infinite) ? undefined : value;
}

FOREGLOW_WIDE void scale_and_mark(double scale, double zero, Sentinels sentinels, std::span<double> values) {
    // FITS scales what the bytes say, so a sentinel written by value is looked for afterwards.
    for (double& value : values)
        value = defined_or_nan(sentinels, zero + scale * value);
}

/// Reals are the common case: one pass over them.
template <class Real, class Bits>
FOREGLOW_INLINE void decode_real(Sentinels sentinels, const std::byte* cells, std::int64_t stride,
                                 std::int64_t per_row, std::span<double> out) {
    double* const to = out.data();
    for_each_cell(
        cells, stride, per_row, sizeof(Real), out.size(),
        [ to, sentinels ](const std::byte* at, std::int64_t i) __attribute__((always_inline)) {
            to[i] = defined_or_nan(sentinels,
                                   static_cast<double>(std::bit_cast<Real>(load_big_endian<Bits>(at))));
        });
}
FOREGLOW_WIDE void decode_float(Sentinels sentinels, const std::byte* cells, std::int64_t stride,
                                std::int64_t per_row, std::span<double> out) {
    decode_real<float, std::uint32_t>(sentinels, cells, stride, per_row, out);
}
FOREGLOW_WIDE void decode_double(Sentinels sentinels, const std::byte* cells, std::int64_t stride,
                                 std::int64_t per_row, std::span<double> out) {
    decode_real<double, std::uint64_t>(sentinels, cells, stride, per_row, out);
}

}  // namespace

void decode_cells(const FitsTableColumn& column, std::optional<double> bad_data, const std::byte* cells,
                  std::int64_t stride, std::int64_t per_row, std::span<double> out) {
    FOREGLOW_EXPECTS(per_row >= 1 && static_cast<std::int64_t>(out.size()) % per_row == 0);
    const Sentinels sentinels{Sentinel(fits_bad_data), Sentinel(bad_data.value_or(fits_bad_data))};
    double* const to = out.data();
    const bool scaled = column.scale != 1.0 || column.zero != 0.0;
    switch (column.type) {
        // A sentinel in a scaled column shows only after the scaling, so none is looked for before.
        case 'E':
            decode_float(scaled ? no_sentinels() : sentinels, cells, stride, per_row, out);
            break;
        case 'D':
            decode_double(scaled ? no_sentinels() : sentinels, cells, stride, per_row, out);
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
    const bool whole = column.type != 'E' && column.type != 'D';
    if (scaled || whole) scale_and_mark(column.scale, column.zero, sentinels, out);
}

}  // namespace foreglow
