// SPDX-License-Identifier: GPL-2.0-or-later
#include "base/error.h"

#include <gtest/gtest.h>

#include <csignal>
#include <type_traits>

#include "base/build_info.h"
#include "base/interrupt.h"
#include "support/messages.h"

namespace foreglow {
namespace {

using testing::has;
using testing::message_of;

TEST(Errors, CarryTheExitStatusOfTheInterfacePage) {
    EXPECT_EQ(InputError("x").exit_status(), 2);
    EXPECT_EQ(DataError("x").exit_status(), 1);
    EXPECT_EQ(FileError("x").exit_status(), 1);
    EXPECT_EQ(NumericError("x").exit_status(), 1);
    EXPECT_EQ(Interrupted(SIGINT).exit_status(), 130);
    EXPECT_EQ(Interrupted(SIGTERM).exit_status(), 143);
    EXPECT_STREQ(InputError("what, where, what to do").what(), "what, where, what to do");
}

TEST(Contract, NamesConditionFileAndLineWithoutFolders) {
    const std::string message = message_of<ContractError>([] {
        FOREGLOW_EXPECTS(1 + 1 == 3);
        return 0;
    });
    EXPECT_TRUE(has(message, "1 + 1 == 3 at error_test.cpp:")) << message;
    EXPECT_FALSE(has(message, "/"));
    EXPECT_NO_THROW(FOREGLOW_EXPECTS(true));
    static_assert(!std::is_base_of_v<Error, ContractError>,
                  "a fault of the program is never one of the user");
}

TEST(Contract, EvaluatesItsConditionOnce) {
    int calls = 0;
    FOREGLOW_EXPECTS(++calls == 1);
    EXPECT_EQ(calls, 1);
}

TEST(Interrupt, ASignalIsNotedAndThrownAtTheNextCheck) {
    EXPECT_NO_THROW(check_interrupt());
    EXPECT_EXIT(
        {
            catch_interrupts();
            static_cast<void>(std::raise(SIGTERM));
            try {
                check_interrupt();
            } catch (const Interrupted& stop) {
                std::exit(stop.exit_status());
            }
            std::exit(0);
        },
        ::testing::ExitedWithCode(143), "");
}

TEST(Interrupt, ASecondSignalEndsTheProcessAtOnce) {
    EXPECT_EXIT(
        {
            catch_interrupts();
            static_cast<void>(std::raise(SIGINT));
            static_cast<void>(std::raise(SIGINT));
            std::exit(0);
        },
        ::testing::KilledBySignal(SIGINT), "");
}

TEST(BuildInfo, SaysVersionAndCompiler) {
    EXPECT_EQ(testing::count_of(version(), "."), 2);
    EXPECT_TRUE(has(build_description(), ", ")) << build_description();
}

}  // namespace
}  // namespace foreglow
