// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/galaxy_section.h"

#include <gtest/gtest.h>

#include <string>

#include "base/error.h"
#include "base/text.h"
#include "model/bundled_models.h"
#include "model/model_file.h"
#include "support/messages.h"

namespace foreglow {
namespace {

using testing::has;

const std::string head = "reference_frequency = \"408 MHz\"\n[galaxy]\n";

GalaxySpec read(const std::string& text) {
    return *make_model(head + text, "m.toml", "m").galaxy;
}

std::string message_of(const std::string& text) {
    try {
        (void)read(text);
    } catch (const InputError& error) {
        return error.what();
    }
    return "";
}

TEST(GalaxySection, BundledModelWritesOutEveryDefault) {
    const ModelSpec bundled = read_bundled_model("disc-and-loops");
    ASSERT_TRUE(bundled.galaxy.has_value());
    EXPECT_EQ(describe_exactly(*bundled.galaxy), describe_exactly(GalaxySpec()));
    for (const GalaxyKey& key : galaxy_keys())
        EXPECT_TRUE(has(bundled.source, std::string("\n") + key.name + " = ")) << key.name;
}

TEST(GalaxySection, LeftOutKeysKeepTheirValues) {
    EXPECT_EQ(describe_exactly(read("")), describe_exactly(GalaxySpec()));
}

TEST(GalaxySection, EveryKeyChangesItsOwnNumber) {
    for (const GalaxyKey& key : galaxy_keys()) {
        const std::string unit = key.unit;
        const double before = GalaxySpec().*key.member;
        const double value = before == 0 ? 0.01 : 1.01 * before;
        std::string text;
        if (*key.section != '\0') text.append("[galaxy.").append(key.section).append("]\n");
        text.append(key.name).append(" = ");
        if (unit.empty())
            text.append(format_exact(value));
        else
            text.append("\"").append(format_exact(value)).append(" ").append(unit).append("\"");
        text.append("\n");
        const GalaxySpec galaxy = read(text);
        EXPECT_EQ(galaxy.*key.member, value) << key.name;
        GalaxySpec expected;
        expected.*key.member = galaxy.*key.member;
        EXPECT_EQ(describe_exactly(galaxy), describe_exactly(expected)) << key.name;
    }
}

TEST(GalaxySection, TakesOtherUnitsAndSwitches) {
    const GalaxySpec galaxy = read(
        "loops = false\nturbulence = false\nseed = 7\nsun_radius = \"8000 "
        "pc\"\n[galaxy.electrons]\nbreak_energy = "
        "\"2500 MeV\"\n[galaxy.field]\narm_phase = \"0.5 rad\"\nhalo_field = \"2600 nG\"\n");
    EXPECT_FALSE(galaxy.loops || galaxy.turbulence);
    EXPECT_TRUE(galaxy.disc);
    EXPECT_EQ(galaxy.seed, 7U);
    EXPECT_EQ(galaxy.sun_radius, 8);
    EXPECT_EQ(galaxy.break_energy, 2.5);
    EXPECT_EQ(galaxy.arm_phase, GalaxySpec().arm_phase);
    EXPECT_NEAR(galaxy.halo_field, 2.6, 1e-15);
}

TEST(GalaxySection, GivenLoopsReplaceTheFour) {
    const GalaxySpec galaxy = read(
        "[[galaxy.loop]]\nlongitude = \"30 deg\"\nlatitude = \"-10 deg\"\ndiameter = \"40 deg\"\ndistance = "
        "\"200 "
        "pc\"\nbrightness = \"3 K_RJ\"\nfield = \"5 uG\"\n");
    ASSERT_EQ(galaxy.shells.size(), 1U);
    EXPECT_EQ(galaxy.shells[0].distance, 0.2);
    EXPECT_EQ(galaxy.shells[0].field, 5);
    EXPECT_TRUE(has(message_of("[[galaxy.loop]]\nlongitude = \"30 deg\"\n"), "'latitude'"));
}

TEST(GalaxySection, RefusesWhatIsWrongWithThePlaceAndAnExample) {
    const std::string unit = message_of("[galaxy.field]\nrandom_field = 5.0\n");
    EXPECT_TRUE(has(unit, "m.toml:4") && has(unit, "random_field")) << unit;
    const std::string missing = message_of("[galaxy.field]\nrandom_field = \"5\"\n");
    EXPECT_TRUE(has(missing, "has no unit") && has(missing, "\"6.2 uG\"")) << missing;
    EXPECT_TRUE(has(message_of("[galaxy.field]\nrandom_field = \"5 kpc\"\n"), "'kpc'"));
    EXPECT_TRUE(
        has(message_of("[galaxy.field]\nrandom_field = \"strong uG\"\n"), "does not begin with a number"));
    EXPECT_TRUE(has(message_of("sun_radius = \"0 kpc\"\n"), "must lie between"));
    EXPECT_TRUE(has(message_of("[galaxy.field]\nrandom_feild = \"5 uG\"\n"), "random_field"));
    EXPECT_TRUE(has(message_of("[galaxy.fields]\n"), "fields"));
    EXPECT_TRUE(has(message_of("disc = false\nloops = false\n"), "no sky"));
    EXPECT_TRUE(has(message_of("sun_radius = \"30 kpc\"\n"), "radius_limit"));
    EXPECT_TRUE(has(message_of("[index]\nvalue = -3\n"), "contradicts [galaxy]"));
    EXPECT_TRUE(has(message_of("[sketch]\n"), "contradicts [sketch]"));
}

}  // namespace
}  // namespace foreglow
