// SPDX-License-Identifier: GPL-2.0-or-later
#include "base/progress.h"

#include <gtest/gtest.h>

#include <functional>

#include "support/messages.h"

namespace foreglow {
namespace {

using testing::count_of;
using testing::has;
using Style = Progress::Style;

// What a person's standard error gets.
std::string printed(Style style, const std::function<void(Progress&)>& work) {
    ::testing::internal::CaptureStderr();
    {
        Progress progress(style);
        work(progress);
    }
    return ::testing::internal::GetCapturedStderr();
}

void some_work(Progress& progress) {
    progress.begin("first phase", 3);
    for (int i = 1; i <= 3; ++i)
        progress.step(i);
    progress.notice("a remark");
    progress.end();
    progress.begin("second phase");
    progress.warn("look here");
    progress.end();
}

TEST(Progress, KeepsEverythingAndPrintsNothingWhenQuiet) {
    ::testing::internal::CaptureStderr();
    Progress progress;
    some_work(progress);
    EXPECT_EQ(::testing::internal::GetCapturedStderr(), "");
    ASSERT_EQ(progress.phases().size(), 2U);
    EXPECT_EQ(progress.phases()[0].name, "first phase");
    EXPECT_GE(progress.phases()[0].seconds, 0);
    EXPECT_EQ(progress.notices(), std::vector<std::string>{"a remark"});
    EXPECT_EQ(progress.warnings(), std::vector<std::string>{"look here"});
}

TEST(Progress, WritesPlainLinesInALog) {
    const std::string text = printed(Style::Log, some_work);
    EXPECT_FALSE(has(text, "\r") || has(text, "\033"));
    EXPECT_EQ(count_of(text, "\n"), 4);
    EXPECT_TRUE(has(text, "note: a remark\n"));
    EXPECT_TRUE(has(text, "first phase: "));
    EXPECT_TRUE(has(text, " s\nwarning: look here\nsecond phase: "));
}

TEST(Progress, DrawsOneLiveLineOnATerminal) {
    const std::string text = printed(Style::Terminal, some_work);
    EXPECT_TRUE(has(text, "\r\033[Kfirst phase 0/3"));
    EXPECT_TRUE(has(text, "\r\033[Kfirst phase 3/3"));
    EXPECT_TRUE(has(text, "\r\033[Ksecond phase"));
    EXPECT_EQ(count_of(text, "\n"), 2);  // the note and the warning
    EXPECT_TRUE(has(text, "\r\033[Knote: a remark\n"));
    EXPECT_TRUE(text.ends_with("\n")) << "no live line is left behind";
}

TEST(Progress, LeavesAnEmptyLineWhenTheWorkFails) {
    const std::string text =
        printed(Style::Terminal, [](Progress& progress) { progress.begin("a phase that never ends", 10); });
    EXPECT_TRUE(text.ends_with("\r\033[K"));
}

TEST(Progress, TakesAFileForALog) {
    ::testing::internal::CaptureStderr();  // goes to a file
    EXPECT_EQ(Progress::style_of_stderr(), Style::Log);
    static_cast<void>(::testing::internal::GetCapturedStderr());
}

}  // namespace
}  // namespace foreglow
