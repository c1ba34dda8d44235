// SPDX-License-Identifier: GPL-2.0-or-later
#include "base/quantity.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/error.h"
#include "support/messages.h"

namespace foreglow {
namespace {

using testing::has;
using testing::message_of;

std::string wrong_frequency(const std::string& text) {
    return message_of<InputError>([&] { return parse_frequency(text); });
}
std::string wrong_angle(const std::string& text) {
    return message_of<InputError>([&] { return parse_angle(text); });
}

TEST(NumberWithUnit, SplitsNumbersFromUnits) {
    const auto check = [](const char* text, double value, const char* unit) {
        const NumberWithUnit parsed = parse_number_with_unit(text);
        EXPECT_EQ(parsed.value, value) << text;
        EXPECT_EQ(parsed.unit, unit) << text;
    };
    check("30 GHz", 30, "GHz");
    check("30GHz", 30, "GHz");
    check("  1.5e3\tMHz \n", 1500, "MHz");
    check("+2.5 deg", 2.5, "deg");
    check("-.5", -0.5, "");
    check("5 uK_CMB arcmin", 5, "uK_CMB arcmin");
    check("3 eV", 3, "eV");  // the e of the unit is no exponent
    check("3eV", 3, "eV");
}

TEST(NumberWithUnit, RefusesWhatDoesNotBeginWithAFiniteNumber) {
    for (const char* text :
         {"", " ", "GHz", "inf GHz", "nan", "1e999 Hz", "+", "-", "+-3 GHz", "++3 GHz", "--3 GHz", ", 3"})
        EXPECT_THROW((void)parse_number_with_unit(text), InputError) << text;
}

TEST(Frequency, IsReadInEveryUnit) {
    EXPECT_EQ(parse_frequency("408 MHz").hz(), 408e6);
    EXPECT_EQ(parse_frequency("70GHz").hz(), 70e9);
    EXPECT_EQ(parse_frequency("1.5 THz").hz(), 1.5e12);
    EXPECT_EQ(parse_frequency("1e3 kHz").hz(), 1e6);
    EXPECT_EQ(parse_frequency("3 Hz").hz(), 3.0);
    EXPECT_DOUBLE_EQ(Frequency::from_ghz(22.8).ghz(), 22.8);
    EXPECT_LT(Frequency::from_hz(1), Frequency::from_hz(2));
}

TEST(Frequency, SaysWhatIsWrongWithAText) {
    EXPECT_TRUE(has(wrong_frequency("30"), "has no unit: write it as \"30 GHz\""));
    EXPECT_TRUE(has(wrong_frequency("30 ghz"), "unknown unit 'ghz': use one of Hz, kHz, MHz, GHz, THz"));
    EXPECT_TRUE(has(wrong_frequency("0 GHz"), "must be above zero"));
    EXPECT_TRUE(has(wrong_frequency("-1 GHz"), "must be above zero"));
    EXPECT_TRUE(has(wrong_frequency("1e300 THz"), "too large"));
    EXPECT_TRUE(has(wrong_frequency("many GHz"), "does not begin with a number: 'many GHz'"));
}

TEST(Frequency, IsWrittenAsAPersonWould) {
    EXPECT_EQ(to_text(Frequency::from_ghz(70)), "70 GHz");
    EXPECT_EQ(to_text(Frequency::from_hz(408e6)), "408 MHz");
    EXPECT_EQ(to_text(Frequency::from_hz(1e6)), "1 MHz");
    EXPECT_EQ(to_text(Frequency::from_hz(999e6)), "999 MHz");
    EXPECT_EQ(to_text(Frequency::from_hz(1.5e3)), "1.5 kHz");
    EXPECT_EQ(to_text(Frequency::from_hz(2e12)), "2 THz");
    EXPECT_EQ(to_text(Frequency::from_hz(0.5)), "0.5 Hz");
    for (const double ghz : {0.0221, 0.408, 22.8, 353.0, 1e3})
        EXPECT_NEAR(parse_frequency(to_text(Frequency::from_ghz(ghz))).ghz(), ghz,
                    1e-9 * ghz);  // nine digits are written
}

TEST(Angle, IsReadInEveryUnit) {
    constexpr double pi = 3.14159265358979323846;
    EXPECT_DOUBLE_EQ(parse_angle("180 deg").radians(), pi);
    EXPECT_DOUBLE_EQ(parse_angle("60 arcmin").degrees(), 1);
    EXPECT_DOUBLE_EQ(parse_angle("3600arcsec").degrees(), 1);
    EXPECT_DOUBLE_EQ(parse_angle("1 rad").radians(), 1);
    EXPECT_DOUBLE_EQ(Angle::from_degrees(0.5).arcmin(), 30);
    EXPECT_TRUE(has(wrong_angle("40"), "write it as \"40 arcmin\""));
    EXPECT_TRUE(has(wrong_angle("40 degrees"), "use one of deg, arcmin, arcsec, rad"));
}

TEST(Angle, IsWrittenAsAPersonWould) {
    EXPECT_EQ(to_text(Angle::from_degrees(1.5)), "1.5 deg");
    EXPECT_EQ(to_text(parse_angle("60 arcmin")), "1 deg");
    EXPECT_EQ(to_text(parse_angle("33 arcmin")), "33 arcmin");
    EXPECT_EQ(to_text(parse_angle("30 arcsec")), "30 arcsec");
    EXPECT_EQ(to_text(Angle()), "0 deg");
}

}  // namespace
}  // namespace foreglow
