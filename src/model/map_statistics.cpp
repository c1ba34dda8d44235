// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/map_statistics.h"

#include <algorithm>
#include <cmath>

namespace foreglow {

void MapStatistics::add(std::span<const double> values) {
    for (const double value : values) {
        if (std::isnan(value)) {
            ++undefined;
            continue;
        }
        ++defined;
        negative += value < 0 ? 1 : 0;
        sum += value;
        sum_of_squares += value * value;
        lowest = std::min(lowest, value);
        highest = std::max(highest, value);
    }
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
