// SPDX-License-Identifier: GPL-2.0-or-later
#include "picture/markup.h"

#include <gtest/gtest.h>

namespace foreglow {
namespace {

TEST(Markup, EscapesWhatHtmlReads) {
    EXPECT_EQ(escape_markup("<b a=\"1\" c='2'>&"), "&lt;b a=&quot;1&quot; c=&#39;2&#39;&gt;&amp;");
    EXPECT_EQ(escape_markup("\u03bd^\u03b2\n"), "\u03bd^\u03b2\n");
    EXPECT_EQ(escape_markup(std::string("a\0b\x1b", 4)), "a\ufffdb\ufffd");
}

// From outside: the test vectors of RFC 4648, section 10.
TEST(Markup, EncodesBase64AsTheStandardDoes) {
    EXPECT_EQ(encode_base64(""), "");
    EXPECT_EQ(encode_base64("f"), "Zg==");
    EXPECT_EQ(encode_base64("fo"), "Zm8=");
    EXPECT_EQ(encode_base64("foo"), "Zm9v");
    EXPECT_EQ(encode_base64("foob"), "Zm9vYg==");
    EXPECT_EQ(encode_base64("foobar"), "Zm9vYmFy");
    EXPECT_EQ(encode_base64("\xff\xfe\xfd"), "//79");
}

}  // namespace
}  // namespace foreglow
