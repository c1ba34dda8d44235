// SPDX-License-Identifier: GPL-2.0-or-later
#include "api/foreglow_c.h"

#include <gtest/gtest.h>

#include <array>
#include <cmath>
#include <cstring>
#include <string>

#include "api/foreglow.h"
#include "support/messages.h"
#include "support/temporary_folder.h"
#include "support/threads.h"

namespace foreglow {
namespace {

using testing::has;

TEST(CApi, ReturnsTheCommandsExitStatusAndASentence) {
    const testing::Threads keep(1);
    const testing::TemporaryFolder folder;
    const std::string file = (folder / "s.toml").string(), out = (folder / "run").string();
    std::array<char, 400> message{};
    EXPECT_EQ(foreglow_make(nullptr, nullptr, 0, message.data(), message.size()), 2);
    EXPECT_TRUE(has(message.data(), "no study file was named"));
    EXPECT_EQ(foreglow_make(file.c_str(), out.c_str(), 0, message.data(), message.size()), 2);
    EXPECT_TRUE(has(message.data(), "s.toml")) << message.data();
    testing::write_whole_file(
        file, "model = \"quick-sketch\"\nnside = 4\n[[channel]]\nname = \"low\"\nfrequency = \"70 GHz\"\n");
    EXPECT_EQ(foreglow_make(file.c_str(), out.c_str(), 0, message.data(), message.size()), 0);
    EXPECT_STREQ(message.data(), "");
    EXPECT_EQ(foreglow_make(file.c_str(), out.c_str(), 0, message.data(), message.size()), 2)
        << "the folder is not empty";
    EXPECT_EQ(foreglow_make(file.c_str(), out.c_str(), 1, message.data(), message.size()), 0);
}

TEST(CApi, CutsItsMessageToTheRoomThereIs) {
    std::array<char, 8> message{};
    message.fill('x');
    EXPECT_EQ(foreglow_make(nullptr, nullptr, 0, message.data(), 6), 2);
    EXPECT_STREQ(message.data(), "no st");
    EXPECT_EQ(message[6], 'x');
    EXPECT_EQ(foreglow_make(nullptr, nullptr, 0, nullptr, 0), 2);
    EXPECT_EQ(foreglow_make(nullptr, nullptr, 0, message.data(), 0), 2);
    EXPECT_EQ(foreglow_make(nullptr, nullptr, 0, nullptr, 100), 2);
}

TEST(CApi, AgreesWithTheCppInterface) {
    EXPECT_EQ(std::string(foreglow_version()), api::library_version());
    EXPECT_EQ(foreglow_brightness_ratio(23e9, 408e6, -2.7, -0.05),
              api::brightness_ratio(Frequency::from_hz(23e9), Frequency::from_hz(408e6), -2.7, -0.05));
}

}  // namespace
}  // namespace foreglow
