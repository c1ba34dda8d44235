// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/toml_reader.h"

#include <gtest/gtest.h>

#include <string>

#include "base/error.h"

namespace foreglow {
namespace {

template <typename Action>
std::string message_of(const Action& action) {
    try {
        action();
    } catch (const InputError& error) {
        return error.what();
    }
    return "";
}

bool has(const std::string& message, const std::string& part) {
    return message.find(part) != std::string::npos;
}

TEST(TomlReader, ReadsWhatIsThereAndNothingElse) {
    const TomlValue document =
        parse_toml("i = 3\nx = 2.5\nt = \"a\"\nb = true\n[s]\n[[l]]\n[[l]]\n", "a.toml");
    TomlReader reader(document);
    EXPECT_EQ(reader.integer("i", ""), 3);
    EXPECT_EQ(reader.number("i", ""), 3.0);  // a whole number is a number
    EXPECT_EQ(reader.number("x", ""), 2.5);
    EXPECT_EQ(reader.text("t", ""), "a");
    EXPECT_EQ(reader.boolean("b"), true);
    EXPECT_TRUE(reader.table("s").has_value());
    EXPECT_EQ(reader.tables("l").size(), 2U);
    EXPECT_FALSE(reader.text("none", "").has_value());
    EXPECT_NO_THROW(reader.check_no_other_keys());
}

TEST(TomlReader, NamesKeyPlaceWantedAndFound) {
    const TomlValue document = parse_toml("i = 3.0\nx = nan\nt = 5\nb = \"true\"\ns = 1\nl = 2\n", "a.toml");
    TomlReader reader(document);
    EXPECT_EQ(message_of([&] { (void)reader.integer("i", "i = 256"); }),
              "a.toml:1:5: 'i' must be a whole number, for example i = 256, but is the number 3.0");
    EXPECT_TRUE(has(message_of([&] { (void)reader.number("x", "x = 1"); }), "a finite number"));
    EXPECT_TRUE(has(message_of([&] { (void)reader.text("t", "t = \"a\""); }), "but is the whole number 5"));
    EXPECT_TRUE(has(message_of([&] { (void)reader.boolean("b"); }), "without quotes"));
    EXPECT_TRUE(has(message_of([&] { (void)reader.table("s"); }), "[s]"));
    EXPECT_TRUE(has(message_of([&] { (void)reader.tables("l"); }), "[[l]]"));
}

TEST(TomlReader, FindsUnknownKeysAndTheNearestKnownOne) {
    const TomlValue document = parse_toml("frequncy = 1\n", "a.toml");
    TomlReader reader(document, "[[channel]] 'low'");
    (void)reader.find("name");
    (void)reader.find("frequency");
    EXPECT_EQ(message_of([&] { reader.check_no_other_keys(); }),
              "a.toml:1:1: there is no key 'frequncy' in [[channel]] 'low': did you mean 'frequency'?");
    const TomlValue far = parse_toml("zzzzzzzzzzzz = 1\n", "a.toml");
    TomlReader other(far);
    (void)other.find("name");
    EXPECT_TRUE(has(message_of([&] { other.check_no_other_keys(); }), "the keys are name"));
}

TEST(TomlReader, TakesAnOptionsTextAsTyped) {
    TomlValue document = parse_toml("", "a.toml");
    apply_override(document, "title=2026");
    apply_override(document, "list=[1]");
    TomlReader reader(document);
    EXPECT_EQ(reader.text("title", ""), "2026");
    EXPECT_TRUE(has(message_of([&] { (void)reader.text("list", "list = \"a\""); }), "--set list=[1]: "));
}

TEST(TomlReader, KeepsMessagesOnOneLine) {
    const TomlValue document = parse_toml("a = \"\"\"x\ny\"\"\"\n", "a.toml");
    TomlReader reader(document);
    const std::string message = message_of([&] { (void)reader.integer("a", "a = 1"); });
    EXPECT_TRUE(has(message, "'x y'"));
}

}  // namespace
}  // namespace foreglow
