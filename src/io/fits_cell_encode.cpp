// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/fits_cell_encode.h"

#include <bit>
#include <cmath>
#include <cstring>
#include <limits>
#include <type_traits>

#include "base/vector_width.h"
#include "io/fits_sentinel.h"

namespace foreglow {
namespace {

FOREGLOW_INLINE std::uint32_t big_endian(std::uint32_t bits) {
    return __builtin_bswap32(bits);
}
FOREGLOW_INLINE std::uint64_t big_endian(std::uint64_t bits) {
    return __builtin_bswap64(bits);
}

/// Turns values into big-endian cells of type Cell, NaN into BAD_DATA.
template <class Cell, class Value>
FOREGLOW_INLINE CellTally encode_as(std::span<const Value> values, std::byte* out) {
    using Bits = std::conditional_t<sizeof(Cell) == 4, std::uint32_t, std::uint64_t>;
    constexpr auto bad = static_cast<Cell>(fits_bad_data);
    std::uint64_t words = 0;
    unsigned infinite = 0;
    for (std::size_t i = 0; i < values.size(); ++i) {
        const auto cell = static_cast<Cell>(values[i]);
        infinite |= static_cast<unsigned>(std::fabs(cell) > std::numeric_limits<Cell>::max());
        const auto bits = std::bit_cast<Bits>(std::isnan(cell) ? bad : cell);
        if constexpr (sizeof(Cell) == 8) {
            words += (bits >> 32) + (bits & 0xffffffff);
        } else {
            words += bits;
        }
        const Bits swapped = big_endian(bits);
        std::memcpy(out + i * sizeof(Cell), &swapped, sizeof(Cell));
    }
    return {words, infinite != 0};
}

FOREGLOW_WIDE CellTally encode_double_as_double(std::span<const double> values, std::byte* out) {
    return encode_as<double>(values, out);
}
FOREGLOW_WIDE CellTally encode_double_as_float(std::span<const double> values, std::byte* out) {
    return encode_as<float>(values, out);
}
FOREGLOW_WIDE CellTally encode_float_as_double(std::span<const float> values, std::byte* out) {
    return encode_as<double>(values, out);
}
FOREGLOW_WIDE CellTally encode_float_as_float(std::span<const float> values, std::byte* out) {
    return encode_as<float>(values, out);
}

}  // namespace

CellTally encode_cells(std::span<const double> values, bool float64, std::byte* out) {
    return float64 ? encode_double_as_double(values, out) : encode_double_as_float(values, out);
}

CellTally encode_cells(std::span<const float> values, bool float64, std::byte* out) {
    return float64 ? encode_float_as_double(values, out) : encode_float_as_float(values, out);
}

}  // namespace foreglow
