// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/galaxy_maps.h"

#include <algorithm>
#include <array>
#include <cmath>

#include "base/interrupt.h"
#include "base/parallel.h"
#include "model/galaxy_pixels.h"

namespace foreglow {
namespace {

constexpr std::int64_t part_pixels = 1 << 15;
// Lines of sight are sorted by their largest rotation measure into those below each of these [rad/m^2].
constexpr std::array depth_levels{30.0, 120.0, 480.0, 1920.0, 7680.0};
constexpr std::size_t nodes_at_once = 256;  // tables of more would not stay in the cache

// Calls work(pixel) for all pixels of a list of `count`, with threads, in parts that can be stopped.
template <class Work>
void for_each_pixel(std::int64_t count, Progress& progress, std::int64_t done, const Work& work) {
    for (std::int64_t first = 0; first < count; first += part_pixels) {
        check_interrupt();
        const std::int64_t end = std::min(first + part_pixels, count);
        parallel_for_blocks(end - first, 64, [&](std::int64_t a, std::int64_t b) {
            for (std::int64_t p = first + a; p < first + b; ++p)
                work(p);
        });
        progress.step(done + end);
    }
}

void store(const GalaxySightline& line, std::size_t place, GalaxyMaps& maps) {
    maps.largest_depth[place] = line.largest_depth;
    for (std::size_t k = 0; k < maps.i.size(); ++k)
        maps.i[k][place] = line.i[k];
    for (std::size_t k = 0; k < maps.q.size(); ++k) {
        maps.q[k][place] = line.q[k];
        maps.u[k][place] = line.u[k];
    }
}

GalaxyMaps make_empty_maps(std::size_t frequencies, std::size_t pixels, bool polarized) {
    GalaxyMaps maps;
    maps.i.assign(frequencies, std::vector<double>(pixels));
    if (polarized) maps.q = maps.u = maps.i;
    maps.largest_depth.resize(pixels);
    return maps;
}

// Some bands that are integrated together: their nodes side by side.
struct Batch {
    std::size_t first_band = 0;
    std::vector<BandSum> bands;
    std::vector<Frequency> nodes;
};

std::vector<Batch> make_batches(std::span<const RefinedBand> bands, double depth) {
    std::vector<Batch> batches;
    for (std::size_t b = 0; b < bands.size(); ++b) {
        BandSum band = bands[b](turn_between_nodes / (2 * depth));
        if (batches.empty() || batches.back().nodes.size() + band.hz.size() > nodes_at_once)
            batches.push_back({b, {}, {}});
        for (const double hz : band.hz)
            batches.back().nodes.push_back(Frequency::from_hz(hz));
        batches.back().bands.push_back(std::move(band));
    }
    return batches;
}

void store_averages(const GalaxySightline& line, const Batch& batch, std::size_t pixel, GalaxyStokes& out) {
    std::size_t node = 0;
    for (std::size_t b = 0; b < batch.bands.size(); ++b) {
        double q = 0;
        double u = 0;
        for (const double weight : batch.bands[b].weights) {
            q += weight * line.q[node];
            u += weight * line.u[node];
            ++node;
        }
        out.q[batch.first_band + b][pixel] = q;
        out.u[batch.first_band + b][pixel] = u;
    }
}

}  // namespace

struct GalaxyMaker::Impl {
    GalaxySpec galaxy;
    std::shared_ptr<const GalaxyTable> table;
    HealpixGrid grid;
    TurbulenceFields fields;

    [[nodiscard]] GalaxyPixels pixels(std::span<const Frequency> frequencies, bool polarized) const {
        return {galaxy, *table, fields, grid, polarized, frequencies};
    }
    // The largest rotation measure on each pixel's lines of sight.
    [[nodiscard]] std::vector<double> largest_depths(const GalaxySampling& sampling) const {
        const std::array one{Frequency::from_hz(408e6)};
        const GalaxyPixels maker = pixels(one, false);
        std::vector<double> depths(static_cast<std::size_t>(grid.npix()));
        Progress quiet;
        for_each_pixel(grid.npix(), quiet, 0, [&](std::int64_t p) {
            depths[static_cast<std::size_t>(p)] = maker.pixel(p, sampling).largest_depth;
        });
        return depths;
    }
};

GalaxyMaker::GalaxyMaker(const GalaxySpec& galaxy, std::shared_ptr<const GalaxyTable> table,
                         const HealpixGrid& grid, bool polarized)
    : impl_(std::make_unique<Impl>(
          Impl{galaxy, std::move(table), grid, make_turbulence_fields(galaxy, grid, polarized)})) {}

GalaxyMaker::~GalaxyMaker() = default;

GalaxyMaps GalaxyMaker::make_maps(std::span<const Frequency> frequencies, bool polarized,
                                  Progress& progress) const {
    const std::int64_t npix = impl_->grid.npix();
    GalaxyMaps maps = make_empty_maps(frequencies.size(), static_cast<std::size_t>(npix), polarized);
    const GalaxyPixels maker = impl_->pixels(frequencies, polarized);
    if (impl_->galaxy.disc) maps.sampling = choose_sampling(impl_->galaxy, maker.integral(), polarized);
    progress.begin("integrating the Galaxy", npix);
    for_each_pixel(npix, progress, 0, [&](std::int64_t p) {
        store(maker.pixel(p, maps.sampling), static_cast<std::size_t>(p), maps);
    });
    progress.end();
    return maps;
}

GalaxyMaps GalaxyMaker::make_pixels(std::span<const std::int64_t> pixels,
                                    std::span<const Frequency> frequencies, bool polarized) const {
    GalaxyMaps maps = make_empty_maps(frequencies.size(), pixels.size(), polarized);
    const GalaxyPixels maker = impl_->pixels(frequencies, polarized);
    parallel_for_blocks(
        static_cast<std::int64_t>(pixels.size()), 4, [&](std::int64_t begin, std::int64_t end) {
            for (auto p = static_cast<std::size_t>(begin); p < static_cast<std::size_t>(end); ++p)
                store(maker.pixel(pixels[p], maps.sampling), p, maps);
        });
    return maps;
}

GalaxyStokes GalaxyMaker::make_band_stokes(std::span<const RefinedBand> bands, Progress& progress) const {
    const auto npix = static_cast<std::size_t>(impl_->grid.npix());
    GalaxyStokes out;
    out.q.assign(bands.size(), std::vector<double>(npix));
    out.u = out.q;
    GalaxySampling sampling;
    if (impl_->galaxy.disc) {
        std::vector<Frequency> middles;
        for (const RefinedBand& band : bands) {
            const BandSum nodes = band(1e30);
            middles.push_back(Frequency::from_hz(nodes.hz[nodes.hz.size() / 2]));
        }
        middles.resize(std::min<std::size_t>(middles.size(), 32));
        const GalaxyIntegral probes(impl_->galaxy, *impl_->table, middles);
        sampling = choose_sampling(impl_->galaxy, probes, true);
    }
    progress.begin("integrating the Galaxy's polarization band by band", impl_->grid.npix());
    const std::vector<double> depths = impl_->largest_depths(sampling);
    std::int64_t done = 0;
    for (std::size_t level = 0; level < depth_levels.size(); ++level) {
        const bool is_last = level + 1 == depth_levels.size();
        std::vector<std::int64_t> pixels;
        for (std::size_t p = 0; p < npix; ++p)
            if ((is_last || depths[p] <= depth_levels[level]) &&
                (level == 0 || depths[p] > depth_levels[level - 1]))
                pixels.push_back(static_cast<std::int64_t>(p));
        if (pixels.empty()) continue;
        bool is_coarse = false;
        for (const Batch& batch : make_batches(bands, depth_levels[level])) {
            const GalaxyPixels maker = impl_->pixels(batch.nodes, true);
            for_each_pixel(static_cast<std::int64_t>(pixels.size()), progress, done, [&](std::int64_t p) {
                const std::int64_t pixel = pixels[static_cast<std::size_t>(p)];
                store_averages(maker.pixel(pixel, sampling), batch, static_cast<std::size_t>(pixel), out);
            });
            for (const BandSum& band : batch.bands)
                is_coarse = is_coarse || band.hz.size() >= most_band_nodes;
        }
        done += static_cast<std::int64_t>(pixels.size());
        if (is_coarse) out.coarse_pixels += static_cast<std::int64_t>(pixels.size());
    }
    progress.end();
    return out;
}

}  // namespace foreglow
