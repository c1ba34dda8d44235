// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/galaxy_maps.h"

#include <algorithm>
#include <array>
#include <cmath>

#include "base/constants.h"
#include "base/interrupt.h"
#include "base/parallel.h"
#include "model/galaxy_loops.h"
#include "model/galaxy_turbulence.h"

namespace foreglow {
namespace {

constexpr double degree = constants::pi / 180;
constexpr double near_plane = 5 * degree;
constexpr double thin_plane = 2 * degree;  // where the young disc is
constexpr int fine_nside = 128;
constexpr std::array<std::size_t, 14> ladder{24,  48,  64,  96,   128,  192,  256,
                                             384, 512, 768, 1024, 1536, 2048, 4096};

double latitude_of(const Vector3& n) {
    return std::asin(std::clamp(n[2], -1.0, 1.0));
}

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

/// Makes the pixels of a grid one by one.
class PixelMaker {
  public:
    PixelMaker(const GalaxySpec& galaxy, const GalaxyTable& table, const GalaxyIntegral& integral,
               const HealpixGrid& grid, bool polarized, GalaxyMaps& maps)
        : galaxy_(galaxy),
          integral_(integral),
          spectra_(galaxy, table, maps.frequencies),
          grid_(grid),
          polarized_(polarized),
          maps_(maps) {
        if (galaxy.turbulence || galaxy.index_scatter > 0)
            fields_ = make_turbulence_fields(galaxy, grid, polarized);
    }

    void make(std::int64_t pixel) const {
        const auto p = static_cast<std::size_t>(pixel);
        const Vector3 direction = grid_.direction(pixel);
        GalaxySightline line;
        if (galaxy_.disc) {
            line = mean_line(pixel, direction);
            add_turbulence(line, p);
        } else {
            line.i.assign(maps_.frequencies.size(), 0.0);
            if (polarized_) line.q = line.u = line.i;
        }
        if (galaxy_.loops) add_loops(line, direction);
        for (std::size_t k = 0; k < line.i.size(); ++k) {
            const double tilt = fields_.index.empty() ? 1.0
                                                      : std::exp(galaxy_.index_scatter * fields_.index[p] *
                                                                 std::log(maps_.frequencies[k].hz() / 408e6));
            maps_.i[k][p] = tilt * line.i[k];
            if (!polarized_) continue;
            maps_.q[k][p] = tilt * line.q[k];
            maps_.u[k][p] = tilt * line.u[k];
        }
        maps_.depth[p] = line.depth;
    }

  private:
    [[nodiscard]] GalaxySightline line_of(const Vector3& direction) const {
        const bool is_near = std::abs(latitude_of(direction)) < near_plane;
        return integral_.sightline(direction,
                                   is_near ? maps_.sampling.steps_near_plane : maps_.sampling.steps_elsewhere,
                                   polarized_);
    }

    [[nodiscard]] GalaxySightline mean_line(std::int64_t pixel, const Vector3& direction) const {
        const double reach = thin_plane + 0.5 * std::sqrt(grid_.pixel_area());
        if (grid_.nside() >= fine_nside || std::abs(latitude_of(direction)) > reach)
            return line_of(direction);
        const HealpixGrid fine(fine_nside);
        const std::int64_t ratio = fine_nside / grid_.nside();
        const std::int64_t children = ratio * ratio;
        const std::int64_t first = grid_.ring_to_nested(pixel) * children;
        const double weight = 1 / static_cast<double>(children);
        GalaxySightline mean;
        mean.i.assign(maps_.frequencies.size(), 0.0);
        if (polarized_) mean.q = mean.u = mean.i;
        for (std::int64_t c = 0; c < children; ++c) {
            const GalaxySightline line = line_of(fine.direction(fine.nested_to_ring(first + c)));
            for (std::size_t k = 0; k < mean.i.size(); ++k) {
                mean.i[k] += weight * line.i[k];
                if (!polarized_) continue;
                mean.q[k] += weight * line.q[k];
                mean.u[k] += weight * line.u[k];
            }
            mean.depth += weight * line.depth;
            mean.dispersion += weight * line.dispersion;
            mean.emitting_length += weight * line.emitting_length;
            mean.random_share += weight * line.random_share;
        }
        return mean;
    }

    void add_turbulence(GalaxySightline& line, std::size_t p) const {
        if (fields_.brightness.empty()) return;
        const TurbulencePixel turbulence =
            turbulence_of(galaxy_, line, fields_.brightness[p], polarized_ ? fields_.q[p] : 0.0,
                          polarized_ ? fields_.u[p] : 0.0);
        for (std::size_t k = 0; k < line.i.size(); ++k) {
            line.i[k] *= turbulence.factor;
            if (!polarized_) continue;
            const double lambda = constants::speed_of_light / maps_.frequencies[k].hz();
            const double left = std::exp(-0.5 * line.dispersion * lambda * lambda * lambda * lambda);
            line.q[k] = line.q[k] * turbulence.factor + line.i[k] * left * turbulence.q;
            line.u[k] = line.u[k] * turbulence.factor + line.i[k] * left * turbulence.u;
        }
    }

    void add_loops(GalaxySightline& line, const Vector3& direction) const {
        const GalaxyRay ray(galaxy_, direction);
        for (std::size_t l = 0; l < galaxy_.shells.size(); ++l) {
            const LoopLight light = loop_light(galaxy_.shells[l], ray);
            if (light.brightness == 0) continue;
            for (std::size_t k = 0; k < line.i.size(); ++k) {
                const double brightness = light.brightness * spectra_.ratio[l][k];
                line.i[k] += brightness;
                if (!polarized_) continue;
                line.q[k] += brightness * spectra_.fraction[l][k] * light.q_share;
                line.u[k] += brightness * spectra_.fraction[l][k] * light.u_share;
            }
        }
    }

    const GalaxySpec& galaxy_;
    const GalaxyIntegral& integral_;
    LoopSpectra spectra_;
    const HealpixGrid& grid_;
    bool polarized_;
    TurbulenceFields fields_;
    GalaxyMaps& maps_;
};

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

GalaxyMaps make_galaxy_maps(const GalaxySpec& galaxy, const HealpixGrid& grid,
                            std::span<const Frequency> frequencies, bool polarized, Progress& progress) {
    const auto npix = static_cast<std::size_t>(grid.npix());
    GalaxyMaps maps;
    maps.frequencies.assign(frequencies.begin(), frequencies.end());
    maps.i.assign(frequencies.size(), std::vector<double>(npix));
    if (polarized) maps.q = maps.u = maps.i;
    maps.depth.resize(npix);
    const GalaxyTable table(galaxy);
    const GalaxyIntegral integral(galaxy, table, frequencies);
    if (galaxy.disc) maps.sampling = choose_sampling(galaxy, integral, polarized);
    const PixelMaker maker(galaxy, table, integral, grid, polarized, maps);
    constexpr std::int64_t part = 1 << 15;
    progress.begin("integrating the Galaxy", grid.npix());
    for (std::int64_t first = 0; first < grid.npix(); first += part) {
        check_interrupt();
        const std::int64_t count = std::min(part, grid.npix() - first);
        parallel_for_blocks(count, 64, [&](std::int64_t begin, std::int64_t end) {
            for (std::int64_t p = begin; p < end; ++p)
                maker.make(first + p);
        });
        progress.step(first + count);
    }
    progress.end();
    return maps;
}

}  // namespace foreglow
