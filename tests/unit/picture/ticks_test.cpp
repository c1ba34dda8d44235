// SPDX-License-Identifier: GPL-2.0-or-later
#include "picture/ticks.h"

#include <gtest/gtest.h>

#include <cmath>

namespace foreglow {
namespace {

std::vector<std::string> labels(const ValueScale& scale, double share_of_a_letter = 0.012) {
    std::vector<std::string> out;
    for (const Tick& tick : make_ticks(scale, [&](const std::string& label) {
             return share_of_a_letter * static_cast<double>(label.size() + 2);
         }))
        out.push_back(tick.label);
    return out;
}

TEST(Ticks, AreRoundValues) {
    using Labels = std::vector<std::string>;
    EXPECT_EQ(labels({ScaleKind::Linear, 0, 10}, 0.04), (Labels{"0", "2", "4", "6", "8", "10"}));
    EXPECT_EQ(labels({ScaleKind::Linear, -0.3, 0.3}, 0.03), (Labels{"\u22120.2", "0", "0.2"}));
    EXPECT_EQ(labels({ScaleKind::Log, 1, 1000}),
              (Labels{"1", "2", "5", "10", "20", "50", "100", "200", "500", "1000"}));
    EXPECT_EQ(labels({ScaleKind::Log, 1e-12, 1e12}, 0.02),
              (Labels{"10\u207b\u00b9\u00b2", "10\u207b\u2076", "1", "10\u2076", "10\u00b9\u00b2"}));
}

TEST(Ticks, OfASignedScaleAreSymmetricAndHaveZero) {
    const auto ticks = make_ticks({ScaleKind::Signed, -300, 300, 1}, [](const std::string&) { return 0.08; });
    ASSERT_GE(ticks.size(), 5U);
    ASSERT_EQ(ticks.size() % 2, 1U);
    for (std::size_t i = 0; i < ticks.size(); ++i)
        EXPECT_EQ(ticks[i].value, -ticks[ticks.size() - 1 - i].value);
}

TEST(Ticks, NeverOverlapAndStayOnTheAxis) {
    for (const double low : {1e-9, 0.013, 0.9, 41.0, 7e8})
        for (const double factor : {1.001, 1.4, 3.0, 9.0, 120.0, 1e7})
            for (const ScaleKind kind : {ScaleKind::Linear, ScaleKind::Log}) {
                const auto share = [](const std::string& label) {
                    return 0.011 * static_cast<double>(label.size());
                };
                const auto ticks = make_ticks({kind, low, low * factor}, share);
                EXPECT_GE(ticks.size(), 2U) << low << " " << factor;
                for (std::size_t i = 0; i < ticks.size(); ++i) {
                    EXPECT_GE(ticks[i].position, 0);
                    EXPECT_LE(ticks[i].position, 1);
                    if (i == 0) continue;
                    EXPECT_GE(ticks[i].position - ticks[i - 1].position,
                              (share(ticks[i].label) + share(ticks[i - 1].label)) / 2);
                    EXPECT_NE(ticks[i].label, ticks[i - 1].label) << low << " " << factor;
                }
            }
}

TEST(FormatLabel, WritesNumbersForPeople) {
    EXPECT_EQ(format_label(0), "0");
    EXPECT_EQ(format_label(-2.75), "\u22122.75");
    EXPECT_EQ(format_label(100000), "10\u2075");
    EXPECT_EQ(format_label(-2.5e-7), "\u22122.5\u00d710\u207b\u2077");
    EXPECT_EQ(format_label(-1e-5), "\u221210\u207b\u2075");
    EXPECT_EQ(format_label(99999), "99999");
}

}  // namespace
}  // namespace foreglow
