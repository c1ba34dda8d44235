// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/sky_position.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/error.h"
#include "support/messages.h"

namespace foreglow {
namespace {

using testing::message_of;

TEST(SkyPosition, ReadsDegreesInAnyFrameAndSexagesimalInIcrs) {
    const SkyPosition degrees = parse_position(" -10.5", "+41.25 ", Frame::Galactic);
    EXPECT_EQ(degrees.lon_deg, 349.5);
    EXPECT_EQ(degrees.lat_deg, 41.25);
    // By hand: 5 h 34 m 31.9 s = 83.632916666... deg; 22 deg 0' 52" = 22.014444... deg. Two roundings.
    const SkyPosition crab = parse_position("05:34:31.9", "+22:00:52", Frame::Icrs);
    EXPECT_NEAR(crab.lon_deg, 83.63291666666667, 3e-14);
    EXPECT_NEAR(crab.lat_deg, 22.014444444444443, 1e-14);
    EXPECT_NEAR(parse_position("12:30", "-00:30:00", Frame::Icrs).lat_deg, -0.5, 0);
    EXPECT_EQ(parse_position("360", "90", Frame::Icrs).lon_deg, 0);
}

TEST(SkyPosition, RefusesWhatIsNoPosition) {
    const auto read = [](const char* lon, const char* lat, Frame frame) {
        return message_of<InputError>([&] { return parse_position(lon, lat, frame).lon_deg; });
    };
    EXPECT_NE(read("10", "90.001", Frame::Galactic).find("beyond 90 deg"), std::string::npos);
    EXPECT_NE(read("361", "0", Frame::Galactic).find("beyond 360 deg"), std::string::npos);
    EXPECT_NE(read("05:34", "0", Frame::Galactic).find("icrs"), std::string::npos);
    for (const char* wrong :
         {"", "ten", "nan", "inf", "1 2", "+-1", "05:60:00", "5:", ":5", "1:2:3:4", "1:-2"})
        EXPECT_NE(read(wrong, "0", Frame::Icrs).find("no longitude"), std::string::npos) << wrong;
}

TEST(SkyPosition, DirectionsAndPositionsAreInverse) {
    for (const double lon : {0.0, 33.25, 180.0, 359.0})
        for (const double lat : {-89.5, -12.0, 0.0, 60.0}) {
            const SkyPosition back = position_of(direction_of({lon, lat}));
            EXPECT_NEAR(back.lon_deg, lon, 1e-12);  // some roundings of numbers up to 360
            EXPECT_NEAR(back.lat_deg, lat, 1e-12);
        }
    EXPECT_EQ(position_of({0, 0, 2}).lat_deg, 90);
}

}  // namespace
}  // namespace foreglow
