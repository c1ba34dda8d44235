// SPDX-License-Identifier: GPL-2.0-or-later
#include "picture/chart.h"

#include <gtest/gtest.h>

#include <cmath>
#include <limits>

#include "base/error.h"
#include "unit/picture/well_formed.h"

namespace foreglow {
namespace {

Chart make_chart() {
    Chart chart;
    chart.title = "Brightness <against> frequency & more";
    chart.description = "\"T\" falls";
    chart.x = {"Frequency [GHz]", true, {}, {}};
    chart.y = {"Brightness temperature [K_RJ]", true, {}, {}};
    ChartSeries series;
    series.label = "mean |b| > 20 deg";
    for (const double nu : {1.0, 10.0, 100.0}) {
        series.x.push_back(nu);
        series.y.push_back(std::pow(nu, -2.7));
        series.half_widths.push_back(0.1 * nu);
    }
    chart.series.push_back(series);
    return chart;
}

int count(const std::string& text, const std::string& part) {
    int found = 0;
    for (std::size_t at = text.find(part); at != std::string::npos; at = text.find(part, at + 1))
        ++found;
    return found;
}

TEST(Chart, IsWellFormedAndNamed) {
    const std::string svg = write_svg(make_chart(), "one");
    EXPECT_TRUE(testing::is_well_formed(svg));
    EXPECT_NE(svg.find("<title id=\"one-title\">Brightness &lt;against&gt; frequency &amp; more</title>"),
              std::string::npos);
    EXPECT_NE(svg.find("<desc id=\"one-desc\">&quot;T&quot; falls</desc>"), std::string::npos);
    EXPECT_NE(svg.find("mean |b| &gt; 20 deg"), std::string::npos);
    EXPECT_EQ(svg, write_svg(make_chart(), "one"));
}

TEST(Chart, DrawsAPowerLawAsAStraightLineOnLogAxes) {
    Chart chart = make_chart();
    chart.series[0].half_widths.clear();
    const std::string svg = write_svg(chart, "c");
    const auto at = svg.find("stroke-width=\"2\" stroke-linejoin");
    const auto begin = svg.rfind("<path d=\"M", at) + 10;
    double x[3], y[3];
    ASSERT_EQ(
        std::sscanf(svg.c_str() + begin, "%lf %lfL%lf %lfL%lf %lf", &x[0], &y[0], &x[1], &y[1], &x[2], &y[2]),
        6);
    EXPECT_NEAR(x[1], (x[0] + x[2]) / 2, 0.011);  // each is written to a hundredth
    EXPECT_NEAR(y[1], (y[0] + y[2]) / 2, 0.011);
    EXPECT_LT(x[0], x[2]);
    EXPECT_LT(y[0], y[2]);  // falls: SVG's y grows downwards
}

TEST(Chart, LeavesOutWhatAnAxisCannotShow) {
    Chart chart = make_chart();
    chart.series[0].half_widths.clear();
    chart.series[0].label = "";
    chart.series[0].x = {1, 2, 3, 4, 5};
    chart.series[0].y = {1, -1, std::numeric_limits<double>::quiet_NaN(), 2, 3};
    const std::string svg = write_svg(chart, "c");
    EXPECT_EQ(svg.find("nan"), std::string::npos);
    EXPECT_EQ(svg.find("inf"), std::string::npos);
    EXPECT_EQ(count(svg, "a3.6 3.6 0 1 0 7.2 0"), 3);  // marks
    EXPECT_TRUE(testing::is_well_formed(svg));
}

TEST(Chart, TakesEmptyConstantAndNegativeData) {
    for (const std::vector<double>& y : {std::vector<double>{}, {5.0}, {-1.0, -1.0}, {0.0, 0.0}}) {
        Chart chart = make_chart();
        chart.series[0].half_widths.clear();
        chart.series[0].y = y;
        chart.series[0].x.assign(y.size(), 3.0);
        EXPECT_TRUE(testing::is_well_formed(write_svg(chart, "c")));
    }
    Chart none;
    EXPECT_TRUE(testing::is_well_formed(write_svg(none, "c")));
}

TEST(Chart, RefusesSeriesOfUnequalLength) {
    Chart chart = make_chart();
    chart.series[0].y.pop_back();
    EXPECT_THROW((void)write_svg(chart, "c"), ContractError);
}

}  // namespace
}  // namespace foreglow
