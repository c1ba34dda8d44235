// SPDX-License-Identifier: GPL-2.0-or-later
#include "base/text.h"

#include <gtest/gtest.h>

#include <cmath>
#include <cstdlib>
#include <limits>
#include <random>

#include "base/error.h"
#include "support/messages.h"

namespace foreglow {
namespace {

TEST(Text, IsTrimmedAtBothEndsOnly) {
    EXPECT_EQ(trim(" \t a b\r\n"), "a b");
    EXPECT_EQ(trim(""), "");
    EXPECT_EQ(trim(" \n\t"), "");
    EXPECT_EQ(trim("x"), "x");
}

TEST(Text, LowerCaseTouchesLettersOnly) {
    EXPECT_EQ(to_lower("AbZ_09\xc3\x84"), "abz_09\xc3\x84");  // bytes beyond ASCII stay
}

TEST(Text, SplitKeepsEmptyPieces) {
    EXPECT_EQ(split("a,,b,", ','), (std::vector<std::string>{"a", "", "b", ""}));
    EXPECT_EQ(split("", ','), (std::vector<std::string>{""}));
    EXPECT_EQ(split("ab", ','), (std::vector<std::string>{"ab"}));
}

TEST(NearestWord, FindsSlipsOfThePenAndNothingElse) {
    const std::vector<std::string> keys{"frequency", "bandwidth", "beam_fwhm", "nside"};
    EXPECT_EQ(nearest_word("freqency", keys), "frequency");
    EXPECT_EQ(nearest_word("beam_fhwm", keys), "beam_fwhm");
    EXPECT_EQ(nearest_word("NSIDE", keys), "nside");
    EXPECT_EQ(nearest_word("bandwith", keys), "bandwidth");
    EXPECT_EQ(nearest_word("zzzzzzzz", keys), "");
    EXPECT_EQ(nearest_word("frequency", {}), "");
    EXPECT_EQ(nearest_word("", keys), "");
}

TEST(FormatNumber, WritesNoNeedlessZeros) {
    EXPECT_EQ(format_number(0.1, 6), "0.1");
    EXPECT_EQ(format_number(1e-5, 6), "1e-05");
    EXPECT_EQ(format_number(30, 6), "30");
    EXPECT_EQ(format_number(3.14159, 3), "3.14");
}

TEST(FormatExact, ReadsBackToTheSameDouble) {
    EXPECT_EQ(format_exact(0.1), "0.1");
    EXPECT_EQ(format_exact(-2.9), "-2.9");
    std::mt19937_64 random(1);
    for (int i = 0; i < 1000; ++i) {
        const double value =
            std::ldexp(static_cast<double>(random()) - 0x1p63, static_cast<int>(random() % 400) - 260);
        EXPECT_EQ(std::strtod(format_exact(value).c_str(), nullptr), value);
    }
    for (const double value :
         {std::numeric_limits<double>::denorm_min(), std::numeric_limits<double>::max(), -0.0})
        EXPECT_EQ(std::strtod(format_exact(value).c_str(), nullptr), value);
}

TEST(Bytes, AreWrittenInStepsOf1024) {
    EXPECT_EQ(format_bytes(0), "0 B");
    EXPECT_EQ(format_bytes(512), "512 B");
    EXPECT_EQ(format_bytes(1024), "1.0 KiB");
    EXPECT_EQ(format_bytes(12ULL << 30U), "12.0 GiB");
    EXPECT_EQ(format_bytes((1ULL << 20U) - 1), "1.0 MiB");  // never "1024.0 KiB"
    EXPECT_EQ(format_bytes(std::numeric_limits<std::uint64_t>::max()), "16384.0 PiB");
}

TEST(Bytes, AreReadWithBothKindsOfUnit) {
    EXPECT_EQ(parse_bytes("8 GiB"), 8ULL << 30U);
    EXPECT_EQ(parse_bytes("500MB"), 500000000U);
    EXPECT_EQ(parse_bytes("1.5 TB"), 1500000000000U);
    EXPECT_EQ(parse_bytes("1 B"), 1U);
    for (const char* text : {"8", "8 Gib", "0 GiB", "-1 GiB", "1e30 B", "0.5 B", "lots"})
        EXPECT_THROW((void)parse_bytes(text), InputError) << text;
    EXPECT_TRUE(testing::has(testing::message_of<InputError>([] { return parse_bytes("8"); }), "\"8 GiB\""));
}

}  // namespace
}  // namespace foreglow
