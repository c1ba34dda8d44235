// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/toml_document.h"

#include <gtest/gtest.h>

#include <string>

#include "base/error.h"

namespace foreglow {
namespace {

std::string message_of(const std::string& text) {
    try {
        (void)parse_toml(text, "a.toml");
    } catch (const InputError& error) {
        return error.what();
    }
    return "";
}

std::string message_of_override(const std::string& text, const std::string& assignment) {
    TomlValue document = parse_toml(text, "a.toml");
    try {
        apply_override(document, assignment);
    } catch (const InputError& error) {
        return error.what();
    }
    return "";
}

TEST(TomlDocument, GivesEachValueItsTypeAndPlace) {
    const TomlValue document = parse_toml("b = 3\na = \"x\"\n[s]\n  c = 1.5\n", "a.toml");
    ASSERT_EQ(document.keys,
              (std::vector<std::string>{"b", "a", "s"}));  // the order of the file, not of the alphabet
    EXPECT_EQ(document.items[0].type, TomlValue::Type::Integer);
    EXPECT_EQ(document.items[0].integer, 3);
    EXPECT_EQ(document.items[0].number, 3.0);
    EXPECT_EQ(document.items[0].place, "a.toml:1:5");
    EXPECT_EQ(document.items[0].key_place, "a.toml:1:1");
    EXPECT_EQ(document.items[1].text, "x");
    const TomlValue* inner = find_value(*find_value(document, "s"), "c");
    ASSERT_NE(inner, nullptr);
    EXPECT_EQ(inner->number, 1.5);
    EXPECT_EQ(inner->place, "a.toml:4:7");
    EXPECT_EQ(find_value(document, "none"), nullptr);
}

TEST(TomlDocument, PlacesArraysOfTables) {
    const TomlValue document = parse_toml("[[channel]]\nname = \"a\"\n[[channel]]\nname = \"b\"\n", "a.toml");
    const TomlValue* channels = find_value(document, "channel");
    ASSERT_NE(channels, nullptr);
    ASSERT_EQ(channels->items.size(), 2U);
    EXPECT_EQ(channels->items[1].place.substr(0, 9), "a.toml:3:");
}

TEST(TomlDocument, SaysWhereTheSyntaxIsWrong) {
    EXPECT_EQ(message_of("a = 1\nb = \n").substr(0, 9), "a.toml:2:");
    EXPECT_EQ(message_of("a = 1\na = 2\n").substr(0, 9), "a.toml:2:");
    EXPECT_EQ(message_of("a = \"never closed\nb = 1").substr(0, 9), "a.toml:1:");
    EXPECT_EQ(message_of("[s\n").substr(0, 9), "a.toml:1:");
    EXPECT_EQ(message_of("a = \"\xff\xfe\"").substr(0, 9), "a.toml:1:");
    EXPECT_EQ(message_of("a = [1, 2\n").find('\n'), std::string::npos);
}

TEST(TomlDocument, SurvivesDeepNesting) {
    EXPECT_NE(message_of("a = " + std::string(100000, '[')), "");
}

TEST(TomlOverride, SetsPlainNestedAndNewValues) {
    TomlValue document = parse_toml("nside = 64\n[channel_grid]\ncount = 3\n", "a.toml");
    apply_override(document, "nside=128");
    apply_override(document, "channel_grid.count = 5");
    apply_override(document, "unit=uK_CMB");
    apply_override(document, "fresh.key=true");
    EXPECT_EQ(find_value(document, "nside")->integer, 128);
    EXPECT_EQ(find_value(document, "nside")->place, "--set nside=128");
    EXPECT_EQ(find_value(*find_value(document, "channel_grid"), "count")->integer, 5);
    EXPECT_EQ(find_value(document, "unit")->text, "uK_CMB");
    EXPECT_TRUE(find_value(*find_value(document, "fresh"), "key")->boolean);
}

TEST(TomlOverride, ReachesElementsByNameOrNumber) {
    TomlValue document = parse_toml(
        "[[channel]]\nname = \"a.b\"\n[[channel]]\nname = \"Low\"\n[[channel]]\nname = \"0\"\n", "a.toml");
    apply_override(document, "channel.a.b.noise=1 K_RJ deg");
    apply_override(document, "channel.low.frequency=30 GHz");
    apply_override(document, "channel.0.bandwidth=1 GHz");  // a channel of that name goes before a number
    apply_override(document, "channel.1.bandwidth=2 GHz");
    const auto& channels = find_value(document, "channel")->items;
    EXPECT_EQ(find_value(channels[0], "noise")->text, "1 K_RJ deg");
    EXPECT_EQ(find_value(channels[1], "frequency")->text, "30 GHz");
    EXPECT_EQ(find_value(channels[2], "bandwidth")->text, "1 GHz");
    EXPECT_EQ(find_value(channels[1], "bandwidth")->text, "2 GHz");
}

TEST(TomlOverride, TakesWhatIsNotTomlAsOneString) {
    TomlValue document = parse_toml("", "a.toml");
    apply_override(document, "title=a \"b\" c");
    apply_override(document, "path=x\nsmuggled = 1");
    apply_override(document, "list=[1, 2]");
    EXPECT_EQ(find_value(document, "title")->text, "a \"b\" c");
    EXPECT_EQ(find_value(document, "path")->text, "x\nsmuggled = 1");
    EXPECT_EQ(find_value(document, "list")->items.size(), 2U);
    EXPECT_EQ(find_value(document, "smuggled"), nullptr);
}

TEST(TomlOverride, RefusesWaysThatLeadNowhere) {
    EXPECT_NE(message_of_override("", "nside").find("key=value"), std::string::npos);
    EXPECT_NE(message_of_override("", "a..b=1").find("empty part"), std::string::npos);
    EXPECT_NE(message_of_override("", "=1").find("empty part"), std::string::npos);
    EXPECT_NE(message_of_override("model = \"x\"", "model.index=1").find("the string 'x'"),
              std::string::npos);
    const std::string message = message_of_override("[[channel]]\nname = \"low\"\n", "channel.high.noise=1");
    EXPECT_EQ(message.find("--set channel.high.noise=1: "), 0U);
    EXPECT_NE(message.find("there are low"), std::string::npos);
    EXPECT_NE(message_of_override("[[channel]]\nname = \"low\"\n", "channel.1.noise=1"), "");
    EXPECT_NE(message_of_override("[[channel]]\nname = \"low\"\n", "channel.99999999999999999999.noise=1"),
              "");
}

TEST(TomlString, ReadsBackAsItWas) {
    const std::string text = "quote \" backslash \\ line\nend \x01 tab\t \xc3\xa9";
    const TomlValue document = parse_toml("a = " + to_toml_string(text), "a.toml");
    EXPECT_EQ(find_value(document, "a")->text, text);
}

}  // namespace
}  // namespace foreglow
