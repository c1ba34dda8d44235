// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <limits>
#include <span>

namespace foreglow {

/// Counts and moments of a map's defined pixels; merging in a fixed order gives the same numbers for any
/// number of threads.
struct MapStatistics {
    std::int64_t defined = 0, undefined = 0, negative = 0;
    double sum = 0, sum_of_squares = 0;
    double lowest = std::numeric_limits<double>::infinity();
    double highest = -std::numeric_limits<double>::infinity();

    void add(std::span<const double> values);
    void merge(const MapStatistics& other);
    [[nodiscard]] double mean() const { return defined > 0 ? sum / static_cast<double>(defined) : 0.0; }
    [[nodiscard]] double rms() const;  ///< about zero
};

}  // namespace foreglow
