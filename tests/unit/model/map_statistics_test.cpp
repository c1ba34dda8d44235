// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/map_statistics.h"

#include <gtest/gtest.h>

#include <cmath>
#include <vector>

namespace foreglow {
namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();

TEST(MapStatistics, CountsAndMeasuresTheDefinedPixels) {
    MapStatistics s;
    s.add(std::vector<double>{1, nan, -2, 4, nan, 0});
    EXPECT_EQ(s.defined, 4);
    EXPECT_EQ(s.undefined, 2);
    EXPECT_EQ(s.negative, 1);
    EXPECT_EQ(s.lowest, -2);
    EXPECT_EQ(s.highest, 4);
    EXPECT_DOUBLE_EQ(s.mean(), 0.75);
    EXPECT_DOUBLE_EQ(s.rms(), std::sqrt(21.0 / 4));
}

TEST(MapStatistics, OfNothingAreZeroAndMergeChangesNothing) {
    MapStatistics none;
    none.add(std::vector<double>{nan, nan});
    EXPECT_EQ(none.mean(), 0);
    EXPECT_EQ(none.rms(), 0);
    EXPECT_TRUE(std::isinf(none.lowest) && std::isinf(none.highest));
    MapStatistics some;
    some.add(std::vector<double>{3});
    some.merge(none);
    EXPECT_EQ(some.defined, 1);
    EXPECT_EQ(some.undefined, 2);
    EXPECT_EQ(some.lowest, 3);
    EXPECT_EQ(some.highest, 3);
}

TEST(MapStatistics, MergedPartsAreTheWhole) {
    std::vector<double> values;
    for (int i = 0; i < 1000; ++i)
        values.push_back(i % 7 == 3 ? nan : std::sin(i) * i);
    MapStatistics whole, merged;
    whole.add(values);
    for (std::size_t first = 0; first < 1000; first += 130) {
        MapStatistics part;
        part.add(std::span<const double>(values).subspan(first, std::min<std::size_t>(130, 1000 - first)));
        merged.merge(part);
    }
    EXPECT_EQ(merged.defined, whole.defined);
    EXPECT_EQ(merged.undefined, whole.undefined);
    EXPECT_EQ(merged.negative, whole.negative);
    EXPECT_EQ(merged.lowest, whole.lowest);
    EXPECT_EQ(merged.highest, whole.highest);
    EXPECT_NEAR(merged.sum, whole.sum, 1e-10);  // rounding of sums near 1e4
    EXPECT_NEAR(merged.rms() / whole.rms(), 1, 1e-14);
}

}  // namespace
}  // namespace foreglow
