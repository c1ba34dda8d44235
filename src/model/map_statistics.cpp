// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/map_statistics.h"

#include <algorithm>
#include <array>
#include <cmath>

#include "base/vector_width.h"

namespace foreglow {
namespace {

constexpr std::size_t lanes =
    8;  // sums run in this many lanes whatever the processor, so that they are the same everywhere

struct Lanes {
    std::array<double, lanes> defined{}, negative{}, sum{}, sum_of_squares{}, lowest, highest;
};

FOREGLOW_WIDE
void add_to_lanes(const double* values, std::size_t count, Lanes& l) {
    for (std::size_t first = 0; first + lanes <= count; first += lanes)
        for (std::size_t i = 0; i < lanes; ++i) {
            const double v = values[first + i];
            const bool is_number = v == v;
            const double value = is_number ? v : 0.0;
            l.defined[i] += is_number ? 1.0 : 0.0;
            l.negative[i] += value < 0 ? 1.0 : 0.0;
            l.sum[i] += value;
            l.sum_of_squares[i] += value * value;
            // Comparisons with NaN are false, so that it never gets in.
            l.lowest[i] = v < l.lowest[i] ? v : l.lowest[i];
            l.highest[i] = v > l.highest[i] ? v : l.highest[i];
        }
}

}  // namespace

void MapStatistics::add(std::span<const double> values) {
    Lanes l;
    l.lowest.fill(std::numeric_limits<double>::infinity());
    l.highest.fill(-std::numeric_limits<double>::infinity());
    const std::size_t whole = values.size() / lanes * lanes;
    add_to_lanes(values.data(), whole, l);
    std::array<double, lanes> rest;
    rest.fill(std::numeric_limits<double>::quiet_NaN());
    std::copy(values.begin() + static_cast<std::ptrdiff_t>(whole), values.end(), rest.begin());
    add_to_lanes(rest.data(), lanes, l);
    MapStatistics added;
    for (std::size_t i = 0; i < lanes; ++i) {
        added.defined += static_cast<std::int64_t>(l.defined[i]);
        added.negative += static_cast<std::int64_t>(l.negative[i]);
        added.sum += l.sum[i];
        added.sum_of_squares += l.sum_of_squares[i];
        added.lowest = std::min(added.lowest, l.lowest[i]);
        added.highest = std::max(added.highest, l.highest[i]);
    }
    added.undefined = static_cast<std::int64_t>(values.size()) - added.defined;
    merge(added);
}

void MapStatistics::merge(const MapStatistics& other) {
    defined += other.defined;
    undefined += other.undefined;
    negative += other.negative;
    sum += other.sum;
    sum_of_squares += other.sum_of_squares;
    lowest = std::min(lowest, other.lowest);
    highest = std::max(highest, other.highest);
}

double MapStatistics::rms() const {
    return defined > 0 ? std::sqrt(sum_of_squares / static_cast<double>(defined)) : 0.0;
}

}  // namespace foreglow
