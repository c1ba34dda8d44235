// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/galaxy_points.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <map>

#include "base/error.h"
#include "base/parallel.h"
#include "model/galaxy_pixels.h"
#include "model/spectral_stencil.h"
#include "physics/spectral_law.h"
#include "sphere/sky_map.h"

namespace foreglow {
namespace {

constexpr std::int64_t block = 16;          // lines of sight of one task
constexpr double stencil_step = 0.3;        // of ln nu, as make's truth maps
constexpr double turn_between_nodes = 0.3;  // rad, of 2 RM lambda^2, as make's bands
constexpr std::size_t nodes_at_once = 256;  // tables of more would not stay in the cache
constexpr double reference_hz = 408e6;
// Bands are made for the first of these that the largest rotation measure does not exceed [rad/m^2].
constexpr std::array depth_levels{30.0, 120.0, 480.0, 1920.0, 7680.0};

/// Frequencies in the order in which they were first asked for, each once.
class FrequencyList {
  public:
    std::size_t add(double hz) {
        const auto [found, is_new] = places_.emplace(hz, frequencies_.size());
        if (is_new) frequencies_.push_back(Frequency::from_hz(hz));
        return found->second;
    }
    [[nodiscard]] const std::vector<Frequency>& frequencies() const { return frequencies_; }

  private:
    std::map<double, std::size_t> places_;
    std::vector<Frequency> frequencies_;
};

/// Where the numbers of a row stand among the frequencies.
struct RowNodes {
    std::array<std::size_t, SpectralStencil::count> stencil{};
    std::vector<std::size_t> band, stokes_band;
    std::vector<double> weights, stokes_weights;
};

/// The tables that some rows want.
struct Prepared {
    std::vector<RowNodes> rows;
    std::array<std::size_t, SpectralStencil::count> reference{};
    std::vector<Frequency> frequencies;
    std::vector<std::unique_ptr<GalaxyPixels>> parts;  // each of up to nodes_at_once frequencies
};

std::array<std::size_t, SpectralStencil::count> add_stencil(FrequencyList& list, Frequency middle) {
    const SpectralStencil stencil(middle, stencil_step);
    std::array<std::size_t, SpectralStencil::count> places{};
    for (std::size_t k = 0; k < places.size(); ++k)
        places[k] = list.add(stencil.frequency(k).hz());
    return places;
}

// ln T of a stencil's five frequencies; false where one is not above zero.
bool read_stencil(const std::array<std::size_t, SpectralStencil::count>& places, std::span<const double> i,
                  std::array<double, SpectralStencil::count>& log_t) {
    for (std::size_t k = 0; k < places.size(); ++k) {
        if (!(i[places[k]] > 0)) return false;
        log_t[k] = std::log(i[places[k]]);
    }
    return true;
}

double weighted_sum(std::span<const double> values, const std::vector<std::size_t>& places,
                    const std::vector<double>& weights) {
    double sum = 0;
    for (std::size_t k = 0; k < places.size(); ++k)
        sum += weights[k] * values[places[k]];
    return sum;
}

PointValues make_sized(std::size_t count, bool polarized) {
    PointValues out;
    for (auto* column : {&out.brightness, &out.amplitude, &out.index, &out.curvature, &out.index_reference,
                         &out.electron_slope})
        column->resize(count);
    out.q.resize(polarized ? count : 0);
    out.u.resize(polarized ? count : 0);
    return out;
}

}  // namespace

struct GalaxyPoints::Impl {
    Impl(const GalaxySpec& galaxy_in, Frequency reference_in, const HealpixGrid& grid_in, bool polarized_in)
        : galaxy(galaxy_in),
          reference(reference_in),
          grid(grid_in),
          polarized(polarized_in),
          table(galaxy),
          waves(galaxy, grid, polarized) {}

    [[nodiscard]] std::unique_ptr<Prepared> prepare(std::span<const PointRow> rows, double depth) const;
    [[nodiscard]] double largest_depth(std::span<const std::int64_t> pixels) const;
    [[nodiscard]] const Prepared& prepared_for(std::span<const std::int64_t> pixels,
                                               std::span<const PointRow> rows) const;
    [[nodiscard]] GalaxySightline line(const Prepared& prepared, std::int64_t pixel, std::size_t place) const;
    void store(const Prepared& prepared, const GalaxySightline& line, std::size_t place,
               std::vector<PointValues>& out) const;

    GalaxySpec galaxy;
    Frequency reference;
    HealpixGrid grid;
    bool polarized;
    GalaxyTable table;
    TurbulenceWaves waves;
    mutable TurbulenceFields fields;                                    // at the pixels asked for last
    mutable std::map<std::size_t, std::unique_ptr<Prepared>> prepared;  // by depth level
};

std::unique_ptr<Prepared> GalaxyPoints::Impl::prepare(std::span<const PointRow> rows, double depth) const {
    auto out = std::make_unique<Prepared>();
    FrequencyList list;
    out->reference = add_stencil(list, reference);
    for (const PointRow& row : rows) {
        RowNodes nodes;
        nodes.stencil = add_stencil(list, row.at);
        nodes.weights = row.band.weights;
        for (const double hz : row.band.hz)
            nodes.band.push_back(list.add(hz));
        const BandSum stokes =
            polarized && row.refine ? row.refine(turn_between_nodes / (2 * depth)) : row.band;
        nodes.stokes_weights = stokes.weights;
        for (const double hz : stokes.hz)
            nodes.stokes_band.push_back(list.add(hz));
        out->rows.push_back(std::move(nodes));
    }
    out->frequencies = list.frequencies();
    for (std::size_t first = 0; first < out->frequencies.size(); first += nodes_at_once)
        out->parts.push_back(std::make_unique<GalaxyPixels>(
            galaxy, table, fields, grid, polarized,
            std::span(out->frequencies)
                .subspan(first, std::min(nodes_at_once, out->frequencies.size() - first))));
    return out;
}

double GalaxyPoints::Impl::largest_depth(std::span<const std::int64_t> pixels) const {
    const std::array one{Frequency::from_hz(reference_hz)};
    const GalaxyPixels maker(galaxy, table, fields, grid, false, one);
    std::vector<double> depths(pixels.size());
    parallel_for_blocks(
        static_cast<std::int64_t>(pixels.size()), block, [&](std::int64_t begin, std::int64_t end) {
            for (auto i = static_cast<std::size_t>(begin); i < static_cast<std::size_t>(end); ++i)
                depths[i] = maker.pixel(pixels[i], i, GalaxySampling{}).largest_depth;
        });
    return depths.empty() ? 0.0 : *std::max_element(depths.begin(), depths.end());
}

const Prepared& GalaxyPoints::Impl::prepared_for(std::span<const std::int64_t> pixels,
                                                 std::span<const PointRow> rows) const {
    const bool refines = polarized && std::any_of(rows.begin(), rows.end(), [](const PointRow& row) {
                             return static_cast<bool>(row.refine);
                         });
    std::size_t level = 0;
    if (refines) {
        const double depth = largest_depth(pixels);
        while (level + 1 < depth_levels.size() && depth > depth_levels[level])
            ++level;
    }
    auto& entry = prepared[level];
    if (!entry) entry = prepare(rows, depth_levels[level]);
    FOREGLOW_EXPECTS(entry->rows.size() == rows.size());
    return *entry;
}

GalaxySightline GalaxyPoints::Impl::line(const Prepared& tables, std::int64_t pixel,
                                         std::size_t place) const {
    GalaxySightline all;
    for (const auto& part : tables.parts) {
        const GalaxySightline some = part->pixel(pixel, place, GalaxySampling{});
        all.i.insert(all.i.end(), some.i.begin(), some.i.end());
        all.q.insert(all.q.end(), some.q.begin(), some.q.end());
        all.u.insert(all.u.end(), some.u.begin(), some.u.end());
    }
    return all;
}

void GalaxyPoints::Impl::store(const Prepared& tables, const GalaxySightline& line, std::size_t place,
                               std::vector<PointValues>& out) const {
    std::array<double, SpectralStencil::count> log_t{};
    const double index_reference = read_stencil(tables.reference, line.i, log_t)
                                       ? SpectralStencil(reference, stencil_step).index(log_t)
                                       : undefined_pixel;
    for (std::size_t r = 0; r < out.size(); ++r) {
        const RowNodes& nodes = tables.rows[r];
        PointValues& values = out[r];
        values.amplitude[place] = line.i[tables.reference[SpectralStencil::count / 2]];
        values.brightness[place] = weighted_sum(line.i, nodes.band, nodes.weights);
        values.index_reference[place] = index_reference;
        const SpectralStencil stencil(tables.frequencies[nodes.stencil[SpectralStencil::count / 2]],
                                      stencil_step);
        const bool good = read_stencil(nodes.stencil, line.i, log_t);
        values.index[place] = good ? stencil.index(log_t) : undefined_pixel;
        values.curvature[place] = good ? stencil.curvature(log_t) : undefined_pixel;
        values.electron_slope[place] = electron_slope(values.index[place]);
        if (!polarized) continue;
        values.q[place] = weighted_sum(line.q, nodes.stokes_band, nodes.stokes_weights);
        values.u[place] = weighted_sum(line.u, nodes.stokes_band, nodes.stokes_weights);
    }
}

GalaxyPoints::GalaxyPoints(const GalaxySpec& galaxy, Frequency reference, const HealpixGrid& grid,
                           bool polarized)
    : impl_(std::make_unique<Impl>(galaxy, reference, grid, polarized)) {}
GalaxyPoints::~GalaxyPoints() = default;
GalaxyPoints::GalaxyPoints(GalaxyPoints&&) noexcept = default;
GalaxyPoints& GalaxyPoints::operator=(GalaxyPoints&&) noexcept = default;

std::vector<PointValues> GalaxyPoints::answer(std::span<const std::int64_t> pixels,
                                              std::span<const PointRow> rows) const {
    impl_->fields = impl_->waves.at(pixels);
    const Prepared& prepared = impl_->prepared_for(pixels, rows);
    std::vector<PointValues> out(rows.size(), make_sized(pixels.size(), impl_->polarized));
    parallel_for_blocks(
        static_cast<std::int64_t>(pixels.size()), block, [&](std::int64_t begin, std::int64_t end) {
            for (auto i = static_cast<std::size_t>(begin); i < static_cast<std::size_t>(end); ++i)
                impl_->store(prepared, impl_->line(prepared, pixels[i], i), i, out);
        });
    return out;
}

}  // namespace foreglow
