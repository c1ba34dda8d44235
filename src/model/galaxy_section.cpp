// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/galaxy_section.h"

#include <array>
#include <limits>
#include <map>
#include <optional>

#include "base/error.h"
#include "base/quantity.h"
#include "base/text.h"
#include "model/typed_keys.h"

namespace foreglow {
namespace {

struct Unit {
    const char* kind;  // the unit that a GalaxySpec holds
    const char* name;
    double scale;
};
constexpr std::array units{
    Unit{"kpc", "kpc", 1},     Unit{"kpc", "pc", 1e-3},
    Unit{"uG", "uG", 1},       Unit{"uG", "nG", 1e-3},
    Unit{"uG", "mG", 1e3},     Unit{"GeV", "GeV", 1},
    Unit{"GeV", "MeV", 1e-3},  Unit{"GeV", "TeV", 1e3},
    Unit{"deg", "deg", 1},     Unit{"deg", "rad", 180 / 3.141592653589793238462643383279502884},
    Unit{"cm^-3", "cm^-3", 1}, Unit{"m^-3 GeV^-1", "m^-3 GeV^-1", 1},
    Unit{"K_RJ", "K_RJ", 1},   Unit{"K_RJ", "mK_RJ", 1e-3}};

// A number of the given unit, kept where the key is absent.
struct Wanted {
    const char* unit;
    double low, high;
};

void read_into(TomlReader& reader, const std::string& key, const Wanted& wanted, double& value) {
    const std::string kind = wanted.unit;
    if (kind.empty()) {
        if (const auto number =
                read_number(reader, key, wanted.low, wanted.high, key + " = " + format_exact(value)))
            value = *number;
        return;
    }
    const std::string example = key + " = \"" + format_exact(value) + " " + kind + "\"";
    const auto text = reader.text(key, example);
    if (!text) return;
    NumberWithUnit parsed;
    try {
        parsed = parse_number_with_unit(*text);
    } catch (const InputError& error) {
        reader.fail(key, std::string(error.what()) + ": write it as " + example);
    }
    std::string list;
    for (const Unit& unit : units) {
        if (unit.kind != kind) continue;
        list += (list.empty() ? "" : ", ") + std::string(unit.name);
        if (parsed.unit != unit.name) continue;
        const double scaled = parsed.value * unit.scale;
        if (!(scaled >= wanted.low && scaled <= wanted.high))
            reader.fail(key, "must lie between " + format_exact(wanted.low) + " and " +
                                 format_exact(wanted.high) + " " + kind + ", for example " + example +
                                 ", but is '" + *text + "'");
        value = scaled;
        return;
    }
    reader.fail(key, (parsed.unit.empty() ? std::string("has no unit")
                                          : "has the unit '" + parsed.unit + "', which does not fit") +
                         ": write it as " + example + " (" + list + ")");
}

GalaxyLoop read_loop(TomlReader reader, std::size_t number) {
    GalaxyLoop loop;
    loop.name = reader.text("name", "name = \"I\"").value_or(std::to_string(number));
    reader.set_section("[[galaxy.loop]] '" + loop.name + "'");
    struct Key {
        const char* name;
        Wanted wanted;
        double GalaxyLoop::*member;
        bool required;
    };
    using L = GalaxyLoop;
    const std::array keys{Key{"longitude", {"deg", -360, 360}, &L::longitude, true},
                          Key{"latitude", {"deg", -90, 90}, &L::latitude, true},
                          Key{"diameter", {"deg", 0.1, 179}, &L::diameter, true},
                          Key{"distance", {"kpc", 1e-4, 100}, &L::distance, true},
                          Key{"thickness", {"", 1e-3, 1}, &L::thickness, false},
                          Key{"brightness", {"K_RJ", 0, 1e6}, &L::brightness, true},
                          Key{"bright_angle", {"deg", -360, 360}, &L::bright_angle, false},
                          Key{"faint_side", {"", 0, 1}, &L::faint_side, false},
                          Key{"contrast", {"", 0, 20}, &L::contrast, false},
                          Key{"field", {"uG", 0.01, 1e3}, &L::field, false}};
    for (const Key& key : keys) {
        if (key.required && !reader.has(key.name))
            reader.fail_missing(key.name, std::string(key.name) + " = \"100 " + key.wanted.unit + "\"");
        read_into(reader, key.name, key.wanted, loop.*key.member);
    }
    reader.check_no_other_keys();
    return loop;
}

void check_together(const TomlReader& reader, const GalaxySpec& galaxy) {
    if (!galaxy.disc && !galaxy.loops)
        reader.fail_here("[galaxy] has both 'disc' and 'loops' off, which leaves no sky: switch one on");
    if (galaxy.radius_limit <= galaxy.sun_radius)
        reader.fail("radius_limit", "must be larger than sun_radius, " + format_exact(galaxy.sun_radius) +
                                        " kpc, since lines of sight begin at the Sun");
}

}  // namespace

GalaxySpec read_galaxy(TomlReader reader) {
    GalaxySpec galaxy;
    galaxy.disc = reader.boolean("disc").value_or(galaxy.disc);
    galaxy.loops = reader.boolean("loops").value_or(galaxy.loops);
    galaxy.turbulence = reader.boolean("turbulence").value_or(galaxy.turbulence);
    if (const auto seed =
            read_integer(reader, "seed", 0, std::numeric_limits<std::int64_t>::max(), "seed = 1"))
        galaxy.seed = static_cast<std::uint64_t>(*seed);
    std::map<std::string, std::optional<TomlReader>> sections;
    for (const char* name : {"electrons", "field", "gas"}) {
        sections[name] = reader.table(name);
        if (sections[name]) sections[name]->set_section("[galaxy." + std::string(name) + "]");
    }
    for (const GalaxyKey& key : galaxy_keys()) {
        const std::string section = key.section;
        TomlReader* const from = section.empty()     ? &reader
                                 : sections[section] ? &*sections[section]
                                                     : nullptr;
        if (from != nullptr) read_into(*from, key.name, {key.unit, key.low, key.high}, galaxy.*key.member);
    }
    const std::vector<TomlReader> loops = reader.tables("loop");
    if (!loops.empty()) galaxy.shells.clear();
    for (const TomlReader& loop : loops)
        galaxy.shells.push_back(read_loop(loop, galaxy.shells.size() + 1));
    for (const auto& [name, section] : sections)
        if (section) section->check_no_other_keys();
    reader.check_no_other_keys();
    check_together(reader, galaxy);
    return galaxy;
}

}  // namespace foreglow
