// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/frame.h"

#include <gtest/gtest.h>

#include "reference.h"
#include "sphere/projection.h"

namespace foreglow {
namespace {

constexpr double arcsec = 1.0 / 206264.8;

double distance(const Vector3& a, const Vector3& b) {
    return std::hypot(a[0] - b[0], a[1] - b[1], a[2] - b[2]);
}

Vector3 at(double lon, double lat) {
    return direction_of(Angle::from_degrees(lon), Angle::from_degrees(lat));
}

// From outside: astropy 5.2 (SkyCoord, BarycentricMeanEcliptic of J2000), sphere_reference.py.
TEST(Frame, AgreesWithAstropy) {
    const auto table = reference::read_table("frames");
    for (std::size_t i = 0; i < table.at("ra").size(); ++i) {
        const Vector3 icrs = at(table.at("ra")[i], table.at("dec")[i]);
        const Vector3 galactic = at(table.at("l")[i], table.at("b")[i]);
        const Vector3 ecliptic = at(table.at("ecliptic_lon")[i], table.at("ecliptic_lat")[i]);
        // astropy goes from ICRS to galactic by way of FK5, whose origin lies 0.023 arcsec away
        EXPECT_LT(distance(rotate(rotation_between(Frame::Icrs, Frame::Galactic), icrs), galactic),
                  0.05 * arcsec);
        // astropy takes the obliquity of IAU 2006, 0.042 arcsec smaller, and the frame bias, 0.02 arcsec
        EXPECT_LT(distance(rotate(rotation_between(Frame::Icrs, Frame::Ecliptic), icrs), ecliptic),
                  0.1 * arcsec);
        EXPECT_LT(distance(rotate(rotation_between(Frame::Galactic, Frame::Ecliptic), galactic), ecliptic),
                  0.15 * arcsec);
    }
}

// From outside: ESA 1997, vol. 1, eq. 1.5.11 (from memory), A_G of v_icrs = A_G v_gal with ten digits.
TEST(Frame, GivesTheMatrixOfTheHipparcosCatalogue) {
    const double expected[3][3] = {{-0.0548755604, 0.4941094279, -0.8676661490},
                                   {-0.8734370902, -0.4448296300, -0.1980763734},
                                   {-0.4838350155, 0.7469822445, 0.4559837762}};
    const auto found = rotation_between(Frame::Galactic, Frame::Icrs);
    for (std::size_t i = 0; i < 3; ++i)
        for (std::size_t j = 0; j < 3; ++j)
            EXPECT_NEAR(found[i][j], expected[i][j], 6e-11);  // its last digit
}

TEST(Frame, RotationsAreOrthogonalAndUndoEachOther) {
    for (const auto a : {Frame::Galactic, Frame::Icrs, Frame::Ecliptic})
        for (const auto b : {Frame::Galactic, Frame::Icrs, Frame::Ecliptic}) {
            const Vector3 v = at(33.0, -70.0);
            const Vector3 back = rotate(rotation_between(b, a), rotate(rotation_between(a, b), v));
            EXPECT_LT(distance(back, v), 1e-15);  // a few roundings
        }
}

TEST(Frame, IsNamedByItsLetterAndWord) {
    EXPECT_EQ(coordsys_letter(Frame::Galactic), 'G');
    EXPECT_EQ(coordsys_letter(Frame::Icrs), 'C');
    EXPECT_EQ(coordsys_letter(Frame::Ecliptic), 'E');
    EXPECT_EQ(to_text(Frame::Icrs), "icrs");
}

}  // namespace
}  // namespace foreglow
