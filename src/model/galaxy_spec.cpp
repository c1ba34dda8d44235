// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/galaxy_spec.h"

#include <array>

#include "base/text.h"

namespace foreglow {
namespace {

using G = GalaxySpec;

constexpr std::array keys{GalaxyKey{"", "sun_radius", "kpc", &G::sun_radius, 0.1, 100},
                          GalaxyKey{"", "radius_limit", "kpc", &G::radius_limit, 0.2, 200},
                          GalaxyKey{"", "height_limit", "kpc", &G::height_limit, 0.1, 100},
                          GalaxyKey{"", "distance_limit", "kpc", &G::distance_limit, 0.1, 300},
                          GalaxyKey{"", "turbulence_length", "kpc", &G::turbulence_length, 0, 1},
                          GalaxyKey{"", "index_scatter", "", &G::index_scatter, 0, 1},
                          GalaxyKey{"", "tolerance", "", &G::tolerance, 1e-7, 0.1},
                          GalaxyKey{"electrons", "density", "m^-3 GeV^-1", &G::density, 0, 1e-3},
                          GalaxyKey{"electrons", "slope", "", &G::slope, 0, 6},
                          GalaxyKey{"electrons", "slope_above", "", &G::slope_above, 1, 6},
                          GalaxyKey{"electrons", "break_energy", "GeV", &G::break_energy, 0.01, 1e4},
                          GalaxyKey{"electrons", "break_width", "", &G::break_width, 0.05, 5},
                          GalaxyKey{"electrons", "height", "kpc", &G::height, 0.05, 100},
                          GalaxyKey{"electrons", "height_energy", "GeV", &G::height_energy, 0.01, 1e4},
                          GalaxyKey{"electrons", "height_power", "", &G::height_power, 0, 2},
                          GalaxyKey{"electrons", "radius", "kpc", &G::radius, 0.1, 1000},
                          GalaxyKey{"electrons", "core", "kpc", &G::core, 0, 100},
                          GalaxyKey{"electrons", "young_share", "", &G::young_share, 0, 100},
                          GalaxyKey{"electrons", "young_slope", "", &G::young_slope, 1, 6},
                          GalaxyKey{"electrons", "young_cutoff", "GeV", &G::young_cutoff, 1, 1e6},
                          GalaxyKey{"electrons", "young_turnover", "GeV", &G::young_turnover, 0, 1e3},
                          GalaxyKey{"electrons", "young_turnover_power", "", &G::young_turnover_power, 0, 4},
                          GalaxyKey{"electrons", "young_height", "kpc", &G::young_height, 0.02, 100},
                          GalaxyKey{"electrons", "young_radius", "kpc", &G::young_radius, 0.1, 1000},
                          GalaxyKey{"electrons", "young_core", "kpc", &G::young_core, 0, 100},
                          GalaxyKey{"electrons", "young_arm_contrast", "", &G::young_arm_contrast, 0, 10},
                          GalaxyKey{"field", "disc_field", "uG", &G::disc_field, 0, 1e3},
                          GalaxyKey{"field", "disc_radius", "kpc", &G::disc_radius, 0.1, 1000},
                          GalaxyKey{"field", "disc_core", "kpc", &G::disc_core, 0, 100},
                          GalaxyKey{"field", "disc_height", "kpc", &G::disc_height, 0.02, 100},
                          GalaxyKey{"field", "disc_onset", "kpc", &G::disc_onset, 0.01, 100},
                          GalaxyKey{"field", "pitch", "deg", &G::pitch, -89, -0.5},
                          GalaxyKey{"field", "arm", "", &G::arm, 0, 1},
                          GalaxyKey{"field", "arm_phase", "deg", &G::arm_phase, -360, 360},
                          GalaxyKey{"field", "arm_onset", "kpc", &G::arm_onset, 0.01, 100},
                          GalaxyKey{"field", "arm_height", "kpc", &G::arm_height, 0.02, 100},
                          GalaxyKey{"field", "reversal_radius", "kpc", &G::reversal_radius, 0, 100},
                          GalaxyKey{"field", "reversal_width", "kpc", &G::reversal_width, 0.02, 100},
                          GalaxyKey{"field", "halo_field", "uG", &G::halo_field, 0, 1e3},
                          GalaxyKey{"field", "halo_height", "kpc", &G::halo_height, 0, 100},
                          GalaxyKey{"field", "halo_width", "kpc", &G::halo_width, 0.02, 100},
                          GalaxyKey{"field", "halo_radius", "kpc", &G::halo_radius, 0.1, 1000},
                          GalaxyKey{"field", "halo_onset", "kpc", &G::halo_onset, 0.02, 100},
                          GalaxyKey{"field", "vertical_field", "uG", &G::vertical_field, -1e3, 1e3},
                          GalaxyKey{"field", "random_field", "uG", &G::random_field, 0, 1e3},
                          GalaxyKey{"field", "random_radius", "kpc", &G::random_radius, 0.1, 1000},
                          GalaxyKey{"field", "random_core", "kpc", &G::random_core, 0, 100},
                          GalaxyKey{"field", "random_height", "kpc", &G::random_height, 0.02, 100},
                          GalaxyKey{"gas", "thick_density", "cm^-3", &G::thick_density, 0, 1e3},
                          GalaxyKey{"gas", "thick_height", "kpc", &G::thick_height, 0.02, 100},
                          GalaxyKey{"gas", "thick_radius", "kpc", &G::thick_radius, 0.1, 1000},
                          GalaxyKey{"gas", "thick_core", "kpc", &G::thick_core, 0, 100},
                          GalaxyKey{"gas", "thin_density", "cm^-3", &G::thin_density, 0, 1e3},
                          GalaxyKey{"gas", "thin_height", "kpc", &G::thin_height, 0.02, 100},
                          GalaxyKey{"gas", "thin_radius", "kpc", &G::thin_radius, 0.1, 1000},
                          GalaxyKey{"gas", "thin_core", "kpc", &G::thin_core, 0, 100}};

}  // namespace

std::vector<GalaxyLoop> make_published_loops() {
    return {{"I", 329, 17.5, 116, 0.130, 0.1, 22, 55, 0.12, 2, 8},
            {"II", 100, -32.5, 91, 0.110, 0.1, 5, 150, 0.25, 1.5, 8},
            {"III", 124, 15.5, 65, 0.150, 0.1, 9, 20, 0.2, 1.5, 8},
            {"IV", 315, 48.5, 39.5, 0.250, 0.1, 4.5, 20, 0.2, 1.5, 8}};
}

std::span<const GalaxyKey> galaxy_keys() {
    return keys;
}

std::string describe_exactly(const GalaxySpec& galaxy) {
    std::string text;
    const auto add = [&](const std::string& name, double value) {
        text += name + "=" + format_exact(value) + "\n";
    };
    add("disc", galaxy.disc ? 1 : 0);
    add("loops", galaxy.loops ? 1 : 0);
    add("turbulence", galaxy.turbulence ? 1 : 0);
    text += "seed=" + std::to_string(galaxy.seed) + "\n";
    for (const GalaxyKey& key : keys)
        add(std::string(key.section) + "." + key.name, galaxy.*key.member);
    for (const GalaxyLoop& loop : galaxy.shells) {
        text += "loop=" + std::to_string(loop.name.size()) + ":" + loop.name + "\n";
        for (const double value :
             {loop.longitude, loop.latitude, loop.diameter, loop.distance, loop.thickness, loop.brightness,
              loop.bright_angle, loop.faint_side, loop.contrast, loop.field})
            add("", value);
    }
    return text;
}

}  // namespace foreglow
