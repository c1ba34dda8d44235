// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/galaxy_sampling.h"

#include <algorithm>
#include <array>
#include <cmath>

#include "base/constants.h"
#include "base/parallel.h"

namespace foreglow {
namespace {

constexpr double degree = constants::pi / 180;
constexpr std::array<std::size_t, 14> ladder{24,  48,  64,  96,   128,  192,  256,
                                             384, 512, 768, 1024, 1536, 2048, 4096};

Vector3 direction_of(double lon, double lat) {
    return {std::cos(lat) * std::cos(lon), std::cos(lat) * std::sin(lon), std::sin(lat)};
}

// Lines of sight in rings of longitude at some latitudes.
std::vector<Vector3> make_probes(std::span<const double> latitudes_deg, int longitudes) {
    std::vector<Vector3> probes;
    for (std::size_t i = 0; i < latitudes_deg.size(); ++i)
        for (int j = 0; j < longitudes; ++j) {
            const double shift = static_cast<double>(i) / static_cast<double>(latitudes_deg.size());
            probes.push_back(
                direction_of(2 * constants::pi * (j + shift) / longitudes, latitudes_deg[i] * degree));
        }
    return probes;
}

double difference(const GalaxySightline& coarse, const GalaxySightline& fine) {
    double worst = 0;
    for (std::size_t k = 0; k < fine.i.size(); ++k) {
        if (!(fine.i[k] > 0)) continue;
        worst = std::max(worst, std::abs(coarse.i[k] - fine.i[k]) / fine.i[k]);
        if (fine.q.empty()) continue;
        worst = std::max(worst, std::hypot(coarse.q[k] - fine.q[k], coarse.u[k] - fine.u[k]) / fine.i[k]);
    }
    return worst;
}

struct Steps {
    std::size_t steps = 0;
    double error = 0;
};

Steps choose_steps(const GalaxyIntegral& integral, const std::vector<Vector3>& probes, std::size_t fewest,
                   double tolerance, bool polarized) {
    Steps result;
    for (const std::size_t steps : ladder) {
        if (steps < fewest) continue;
        std::vector<double> worst(probes.size());
        parallel_for_blocks(
            static_cast<std::int64_t>(probes.size()), 4, [&](std::int64_t begin, std::int64_t end) {
                for (auto p = static_cast<std::size_t>(begin); p < static_cast<std::size_t>(end); ++p)
                    worst[p] = difference(integral.sightline(probes[p], steps, polarized),
                                          integral.sightline(probes[p], 2 * steps, polarized));
            });
        // What doubling changes is three quarters of the midpoint rule's error.
        result = {steps, *std::max_element(worst.begin(), worst.end()) * 4 / 3};
        if (result.error <= tolerance) break;
    }
    return result;
}
}  // namespace

GalaxySampling choose_sampling(const GalaxySpec& galaxy, const GalaxyIntegral& integral, bool polarized) {
    const bool is_usual = galaxy.tolerance <= 1e-3;
    constexpr std::array near{0.2, -0.9, 2.1, -4.4};
    constexpr std::array far{6.0, -12.0, 25.0, -45.0, 80.0};
    const Steps plane =
        choose_steps(integral, make_probes(near, 72), is_usual ? 128 : 24, galaxy.tolerance, polarized);
    const Steps rest =
        choose_steps(integral, make_probes(far, 24), is_usual ? 48 : 24, galaxy.tolerance, polarized);
    return {plane.steps, rest.steps, std::max(plane.error, rest.error)};
}

}  // namespace foreglow
