// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/galaxy_integral.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>

#include "base/constants.h"
#include "io/csv_table.h"

namespace foreglow {
namespace {

constexpr double degree = constants::pi / 180;

Vector3 direction_of(double lon_deg, double lat_deg) {
    const double l = lon_deg * degree;
    const double b = lat_deg * degree;
    return {std::cos(b) * std::cos(l), std::cos(b) * std::sin(l), std::sin(b)};
}

std::vector<Frequency> megahertz(std::initializer_list<double> values) {
    std::vector<Frequency> frequencies;
    for (const double value : values)
        frequencies.push_back(Frequency::from_hz(value * 1e6));
    return frequencies;
}

double polarized(const GalaxySightline& line, std::size_t k) {
    return std::hypot(line.q[k], line.u[k]);
}

// From outside: the same formulas in numpy and scipy, tests/oracle/galaxy_sightlines.py.
TEST(GalaxyIntegral, AgreesWithAnIndependentIntegral) {
    const CsvTable table =
        read_csv_table(std::string(FOREGLOW_TESTS_DIR) + "/oracle/galaxy_sightlines.csv", "reference", "lon");
    ASSERT_EQ(table.rows.size(), 60U);
    const GalaxySpec galaxy;
    const auto frequencies = megahertz({45, 408, 1420, 23000, 353000});
    const GalaxyIntegral integral(galaxy, GalaxyTable(galaxy), frequencies);
    for (std::size_t first = 0; first < table.rows.size(); first += 5) {
        const auto& place = table.rows[first];
        const GalaxySightline line = integral.sightline(direction_of(place[0], place[1]), 3000, true);
        for (std::size_t k = 0; k < 5; ++k) {
            const auto& row = table.rows[first + k];
            // Both tables are good to 1e-7; the phases at 45 MHz hold thousands of radians, but nothing is
            // left.
            EXPECT_NEAR(line.i[k] / row[3], 1, 1e-6) << row[0] << " " << row[1] << " " << row[2];
            EXPECT_NEAR(line.q[k], row[4], 1e-6 * row[3]) << row[0] << " " << row[1] << " " << row[2];
            EXPECT_NEAR(line.u[k], row[5], 1e-6 * row[3]) << row[0] << " " << row[1] << " " << row[2];
        }
        EXPECT_NEAR(line.depth, place[6], 1e-6 * std::abs(place[6]) + 1e-5);
        EXPECT_NEAR(std::sqrt(line.dispersion) / place[7], 1, 1e-7);
    }
}

TEST(GalaxyIntegral, UsualStepsAreGoodToAThousandth) {
    const GalaxySpec galaxy;
    const auto frequencies = megahertz({45, 408, 23000});
    const GalaxyIntegral integral(galaxy, GalaxyTable(galaxy), frequencies);
    for (double l = 1; l < 360; l += 13)
        for (const double b : {0.3, -1.7, 4.0, 9.0, -33.0, 77.0}) {
            const std::size_t steps = std::abs(b) < 5 ? 128 : 48;
            const auto coarse = integral.sightline(direction_of(l, b), steps, true);
            const auto fine = integral.sightline(direction_of(l, b), 2000, true);
            for (std::size_t k = 0; k < 3; ++k)
                EXPECT_NEAR(coarse.i[k] / fine.i[k], 1, 1e-3) << l << " " << b;  // the accuracy documented
            EXPECT_NEAR(coarse.q[2], fine.q[2], 1e-3 * fine.i[2]) << l << " " << b;
            EXPECT_NEAR(coarse.u[2], fine.u[2], 1e-3 * fine.i[2]) << l << " " << b;
        }
}

// Emission scales as nu^-2 Phi(nu/B) B: twice the field at twice the frequency gives half the brightness.
TEST(GalaxyIntegral, IsHomogeneousInFrequencyAndField) {
    const GalaxySpec galaxy;
    GalaxySpec stronger = galaxy;
    stronger.disc_field *= 2;
    stronger.halo_field *= 2;
    stronger.vertical_field *= 2;
    stronger.random_field *= 2;
    const GalaxyIntegral one(galaxy, GalaxyTable(galaxy), megahertz({408}));
    const GalaxyIntegral two(stronger, GalaxyTable(stronger), megahertz({816}));
    for (const double b : {0.5, 20.0, -70.0}) {
        const Vector3 n = direction_of(75, b);
        EXPECT_NEAR(two.sightline(n, 200, false).i[0] / one.sightline(n, 200, false).i[0], 0.5,
                    1e-6);  // the tables' 1e-7 at other places between their points
    }
}

TEST(GalaxyIntegral, GivesTheSameIntensityWithAndWithoutPolarizationAndBesideOthers) {
    const GalaxySpec galaxy;
    const GalaxyTable table(galaxy);
    const GalaxyIntegral alone(galaxy, table, megahertz({1420}));
    const GalaxyIntegral beside(galaxy, table, megahertz({22, 30, 45, 70, 100, 150, 300, 408, 800, 1420}));
    const Vector3 n = direction_of(200, -3);
    const GalaxySightline with = alone.sightline(n, 128, true);
    EXPECT_EQ(with.i[0], alone.sightline(n, 128, false).i[0]);
    EXPECT_EQ(with.i[0], beside.sightline(n, 128, true).i[9]);
    EXPECT_EQ(with.q[0], beside.sightline(n, 128, true).q[9]);
    EXPECT_TRUE(alone.sightline(n, 128, false).q.empty());
}

// A clockwise local field towards l = 80 and a reversal inside the Sun's circle turn the sign of the rotation
// measure from quadrant to quadrant (as measured ones do; common practice).
TEST(GalaxyIntegral, RotationMeasureChangesSignByQuadrant) {
    const GalaxySpec galaxy;
    const GalaxyIntegral integral(galaxy, GalaxyTable(galaxy), megahertz({1420}));
    const auto depth = [&](double l, double b) {
        return integral.sightline(direction_of(l, b), 200, false).depth;
    };
    EXPECT_LT(depth(85, 0.5), 0);                  // the local field points away
    EXPECT_GT(depth(250, 0.5), 0);                 // and comes towards us
    EXPECT_LT(depth(40, 30) * depth(320, 30), 0);  // the halo's field is odd in height ...
    EXPECT_LT(depth(40, 30) * depth(40, -30), 0);  // ... which makes a butterfly
    EXPECT_LT(depth(320, 30) * depth(320, -30), 0);
}

TEST(GalaxyIntegral, PlaneIsDepolarizedAt1420MHz) {
    const GalaxySpec galaxy;
    const GalaxyIntegral integral(galaxy, GalaxyTable(galaxy), megahertz({1420, 23000}));
    std::vector<double> low, high;
    for (double l = 2.5; l < 360; l += 5) {
        const GalaxySightline line = integral.sightline(direction_of(l, 0.5), 128, true);
        low.push_back(polarized(line, 0) / line.i[0]);
        high.push_back(polarized(line, 1) / line.i[1]);
    }
    std::nth_element(low.begin(), low.begin() + 36, low.end());
    std::nth_element(high.begin(), high.begin() + 36, high.end());
    EXPECT_LT(low[36], 0.02);
    EXPECT_GT(high[36], 0.03);
}

TEST(GalaxyIntegral, WithoutGasNothingIsTurned) {
    GalaxySpec galaxy;
    galaxy.thin_density = galaxy.thick_density = 0;
    const GalaxyIntegral integral(galaxy, GalaxyTable(galaxy), megahertz({100, 23000}));
    const GalaxySightline line = integral.sightline(direction_of(130, 5), 128, true);
    EXPECT_EQ(line.depth, 0);
    EXPECT_EQ(line.dispersion, 0);
    // The angle is the field's; it differs a little between frequencies, since their light comes from other
    // places.
    const double low = std::atan2(line.u[0], line.q[0]);
    const double high = std::atan2(line.u[1], line.q[1]);
    EXPECT_NEAR(std::remainder(low - high, 2 * constants::pi), 0, 0.2);
}

}  // namespace
}  // namespace foreglow
