// SPDX-License-Identifier: GPL-2.0-or-later
#include "picture/report_page.h"

#include <gtest/gtest.h>

#include "base/error.h"
#include "unit/picture/well_formed.h"

namespace foreglow {
namespace {

ReportContent make_content() {
    ReportContent content;
    content.title = "Ridge <array> & \"more\"";
    content.subtitles = {"two channels"};
    content.warnings = {"channel `low` is <coarse>"};
    content.facts = {{"Grid", "nside 64", "RING"}};
    content.conventions = {{"Unit", "uK_CMB", "thermodynamic"}};
    content.figures.push_back({"PNG", "", "Stokes I", "the sky", 1200, 774});
    content.figures.push_back({"", "maps/a #1.png", "", "other", 0, 0});
    ReportChart chart;
    chart.chart.title = "Spectrum";
    content.charts.push_back(chart);
    content.accuracy = {{"Reached", "3e-06", ""}};
    content.tables.push_back({"Channels", "", {"Name", "GHz"}, {{"low", "30"}, {"high", "95"}}});
    content.files = {{"maps/low.fits", "I, Q, U", 2048}, {"run.json", "manifest", {}}};
    content.how_to_open = {{"In Python:", "print(1 < 2)"}};
    content.footer = "Foreglow";
    return content;
}

TEST(ReportPage, IsWellFormedAndStandsAlone) {
    const std::string page = write_report_page(make_content());
    EXPECT_TRUE(testing::is_well_formed(page));
    EXPECT_EQ(page, write_report_page(make_content()));
    EXPECT_EQ(page.find("<script"), std::string::npos);
    EXPECT_EQ(page.find("<link"), std::string::npos);
    EXPECT_EQ(page.find("url("), std::string::npos);
    for (std::size_t at = page.find("http"); at != std::string::npos; at = page.find("http", at + 1))
        EXPECT_EQ(page.substr(at, 26), "http://www.w3.org/2000/svg");  // a name, nothing that is fetched
}

TEST(ReportPage, EscapesEverything) {
    ReportContent content = make_content();
    const std::string evil = "<x y='\"&`";
    content = {};
    content.title = evil;
    content.subtitles = {evil};
    content.warnings = {evil};
    content.facts = content.conventions = content.accuracy = {{evil, evil, evil}};
    content.figures = {{"", evil, evil, evil, 0, 0}};
    content.charts.resize(1);
    content.charts[0].caption = content.charts[0].chart.title = content.charts[0].chart.x.label = evil;
    content.tables = {{evil, evil, {evil}, {{evil}}}};
    content.files = {{evil, evil, {}}};
    content.how_to_open = {{evil, evil}};
    content.footer = evil;
    const std::string page = write_report_page(content);
    EXPECT_EQ(page.find("<x"), std::string::npos);
    EXPECT_TRUE(testing::is_well_formed(page));
}

TEST(ReportPage, PutsWarningsFirstAndFilesLast) {
    const std::string page = write_report_page(make_content());
    std::size_t last = 0;
    for (const char* part : {"<h1>Ridge", "two channels", "is &lt;coarse&gt;", "nside 64", "uK_CMB",
                             "the sky", "<svg", "3e-06", ">high<", "maps/low.fits", "<footer>"}) {
        const std::size_t at = page.find(part);
        ASSERT_NE(at, std::string::npos) << part;
        EXPECT_GT(at, last) << part;
        last = at;
    }
}

TEST(ReportPage, EmbedsPicturesAndLinksFiles) {
    const std::string page = write_report_page(make_content());
    EXPECT_NE(page.find("src=\"data:image/png;base64,UE5H\""), std::string::npos);  // base64 of "PNG"
    EXPECT_NE(page.find("src=\"maps/a%20%231.png\""), std::string::npos);
    EXPECT_NE(page.find("href=\"maps/low.fits\""), std::string::npos);
    EXPECT_NE(page.find("<code>low</code>"), std::string::npos);
    EXPECT_NE(page.find("print(1 &lt; 2)"), std::string::npos);
}

TEST(ReportPage, SetsNumbersToTheRight) {
    const std::string page = write_report_page(make_content());
    EXPECT_NE(page.find("<td class=\"number\">95</td>"), std::string::npos);
    EXPECT_NE(page.find("<td>high</td>"), std::string::npos);
}

TEST(ReportPage, LeavesOutWhatIsEmpty) {
    ReportContent content;
    content.title = "Bare";
    const std::string page = write_report_page(content);
    EXPECT_EQ(page.find("<section"), std::string::npos);
    EXPECT_EQ(page.find("<footer>"), std::string::npos);
    EXPECT_TRUE(testing::is_well_formed(page));
}

TEST(ReportPage, RefusesRowsThatDoNotFitTheirHeader) {
    ReportContent content;
    content.tables = {{"t", "", {"a", "b"}, {{"1"}}}};
    EXPECT_THROW((void)write_report_page(content), ContractError);
}

}  // namespace
}  // namespace foreglow
