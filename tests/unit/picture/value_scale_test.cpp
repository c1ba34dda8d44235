// SPDX-License-Identifier: GPL-2.0-or-later
#include "picture/value_scale.h"

#include <gtest/gtest.h>

#include <cmath>
#include <limits>
#include <vector>

#include "base/error.h"

namespace foreglow {
namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();

std::vector<double> ramp(double first, double last, int count = 1001) {
    std::vector<double> values;
    for (int i = 0; i < count; ++i)
        values.push_back(first + (last - first) * i / (count - 1));
    return values;
}

TEST(ValueScale, PutsEndsAndMiddleWhereTheLawSays) {
    EXPECT_DOUBLE_EQ(ValueScale(ScaleKind::Linear, -1, 3).position(1), 0.5);
    EXPECT_DOUBLE_EQ(ValueScale(ScaleKind::Log, 1, 10000).position(100), 0.5);
    EXPECT_EQ(ValueScale(ScaleKind::Log, 1, 10000).position(0), -std::numeric_limits<double>::infinity());
    const ValueScale both(ScaleKind::Signed, -100, 100, 1);
    EXPECT_DOUBLE_EQ(both.position(0), 0.5);
    EXPECT_NEAR(both.position(10), 0.5 + 0.5 * std::asinh(10.0) / std::asinh(100.0), 1e-15);
    EXPECT_THROW(ValueScale(ScaleKind::Log, 0, 1), ContractError);
}

TEST(ValueScale, GivesManyPositionsAsOne) {
    const std::vector<double> values{-1e30, -3, -1e-9, 0, 1e-12, 0.4, 1, 7, 1e5, 1e30, 1.4142, 1.4143, nan};
    std::vector<double> found(values.size());
    for (const ScaleKind kind : {ScaleKind::Linear, ScaleKind::Log, ScaleKind::Signed}) {
        const ValueScale scale(kind, kind == ScaleKind::Log ? 0.1 : -1e4, 1e4, 2.0);
        scale.positions(values, found);
        for (std::size_t i = 0; i < values.size(); ++i) {
            const double one = scale.position(values[i]);
            if (std::isnan(values[i]))
                EXPECT_TRUE(std::isnan(found[i]));
            else if (std::isfinite(one))
                EXPECT_NEAR(found[i], one,
                            1e-9);  // of a logarithm; the scales span five decades or more
            else
                EXPECT_EQ(found[i], one);
        }
    }
}

TEST(ChooseScale, TakesPercentilesOfTheValues) {
    const auto choice = choose_scale(ramp(-500, -400), {});
    EXPECT_EQ(choice.scale.kind(), ScaleKind::Linear);
    EXPECT_NEAR(choice.scale.low(), -499.5, 1e-9);  // the 5th of 0..1000, exactly half a percent
    EXPECT_NEAR(choice.scale.high(), -400.5, 1e-9);
    EXPECT_EQ(choice.below, 5);
    EXPECT_EQ(choice.above, 5);
    EXPECT_TRUE(choice.notices.empty());
}

TEST(ChooseScale, FindsTheKindThatSuits) {
    EXPECT_EQ(choose_scale(ramp(1, 1000), {}).scale.kind(), ScaleKind::Log);
    EXPECT_EQ(choose_scale(ramp(100, 200), {}).scale.kind(), ScaleKind::Linear);
    EXPECT_EQ(choose_scale(ramp(-3.1, -2.5), {}).scale.kind(), ScaleKind::Linear);
    const auto choice = choose_scale(ramp(-2, 1), {});
    EXPECT_EQ(choice.scale.kind(), ScaleKind::Signed);
    EXPECT_EQ(choice.scale.low(), -choice.scale.high());
}

TEST(ChooseScale, CountsUndefinedAndNotPositiveAndSaysSo) {
    std::vector<double> values = ramp(1, 100, 100);
    values.insert(values.end(), {nan, nan, nan, -1, 0});
    ScaleRequest request;
    request.kind = ScaleKind::Log;
    const auto choice = choose_scale(values, request);
    EXPECT_EQ(choice.undefined, 3);
    EXPECT_EQ(choice.not_positive, 2);
    EXPECT_GT(choice.scale.low(), 0);
    ASSERT_EQ(choice.notices.size(), 1U);
    EXPECT_NE(choice.notices[0].find("2 pixels are zero or negative"), std::string::npos);
}

TEST(ChooseScale, HandlesConstantUndefinedAndNegativeMaps) {
    const auto constant = choose_scale(std::vector<double>(50, -2.7), {});
    EXPECT_LT(constant.scale.low(), -2.7);
    EXPECT_GT(constant.scale.high(), -2.7);
    EXPECT_EQ(constant.notices.size(), 1U);
    const auto zero = choose_scale(std::vector<double>(50, 0.0), {});
    EXPECT_LT(zero.scale.low(), zero.scale.high());
    const auto none = choose_scale(std::vector<double>(50, nan), {});
    EXPECT_EQ(none.undefined, 50);
    EXPECT_EQ(none.notices.size(), 1U);
    ScaleRequest log;
    log.kind = ScaleKind::Log;
    const auto negative = choose_scale(ramp(-5, -1), log);
    EXPECT_EQ(negative.scale.kind(), ScaleKind::Linear);
    ASSERT_EQ(negative.notices.size(), 1U);
    EXPECT_NE(negative.notices[0].find("linear instead of log"), std::string::npos);
}

TEST(ChooseScale, ConstantMapsWorkOnEveryScale) {
    for (const ScaleKind kind : {ScaleKind::Linear, ScaleKind::Log, ScaleKind::Signed})
        for (const double value : {-3.0, 0.0, 4e-9}) {
            ScaleRequest request;
            request.kind = kind;
            const auto choice = choose_scale(std::vector<double>(12, value), request);
            EXPECT_LT(choice.scale.low(), choice.scale.high());
        }
}

TEST(ChooseScale, RefusesRangesThatCannotBe) {
    const auto values = ramp(1, 2);
    const auto refuses = [&](std::optional<ScaleKind> kind, std::optional<double> low,
                             std::optional<double> high) {
        ScaleRequest request;
        request.kind = kind;
        request.low = low;
        request.high = high;
        EXPECT_THROW((void)choose_scale(values, request), InputError);
    };
    refuses({}, 3, 3);
    refuses({}, 4, 3);
    refuses(ScaleKind::Log, -1, 3);
    refuses({}, 5, {});  // above every value, the high end left open
    refuses({}, {}, 0.5);
    EXPECT_THROW((void)parse_scale("cubic"), InputError);
}

}  // namespace
}  // namespace foreglow
