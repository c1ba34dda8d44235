// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/galaxy_sky.h"

#include <algorithm>
#include <cmath>
#include <set>

#include "base/build_info.h"
#include "base/error.h"
#include "base/text.h"
#include "model/galaxy_cache.h"
#include "model/galaxy_maps.h"
#include "model/node_sky.h"
#include "physics/synchrotron_kernel.h"

namespace foreglow {
namespace {

constexpr int dense_nodes = 33;  // whose interpolation stands for the exact spectrum
constexpr int most_nodes = 24;
constexpr int most_polarized_nodes = 14;  // beyond it the band-by-band way is cheaper
constexpr std::int64_t sampled_pixels = 192;
constexpr int sampled_nside = 64;
constexpr std::size_t checked_channels = 48;
constexpr double truth_step = 0.3;  // of ln nu: derivatives to h^4/30 of the fifth one
constexpr std::size_t truth_nodes = 5;
constexpr int integral_revision = 2;  // raised whenever the same parameters give other maps

std::vector<BandSum> bands_of(std::span<const Channel> channels) {
    std::vector<BandSum> bands;
    bands.reserve(channels.size());
    for (const Channel& channel : channels)
        bands.push_back(channel.band);
    return bands;
}

std::vector<Frequency> to_frequencies(const std::vector<double>& log_hz) {
    std::vector<Frequency> frequencies;
    frequencies.reserve(log_hz.size());
    for (const double x : log_hz)
        frequencies.push_back(Frequency::from_hz(std::exp(x)));
    return frequencies;
}

// The old disc a little above the plane in a usual field: near enough to every pixel's spectrum.
std::function<double(double)> make_common_spectrum(const GalaxySpec& galaxy,
                                                   std::shared_ptr<const GalaxyTable> table) {
    const double height = std::min(0.5, 0.5 * galaxy.height_limit);
    return [table = std::move(table), height](double log_hz) {
        constexpr double usual_field = 6;  // uG
        return table->log_old(log_hz - std::log(critical_frequency_constant_hz() * usual_field), height) -
               2 * log_hz;
    };
}

Matrix to_matrix(const std::vector<std::vector<double>>& maps, std::size_t pixels) {
    Matrix matrix(pixels, maps.size());
    for (std::size_t k = 0; k < maps.size(); ++k)
        for (std::size_t p = 0; p < pixels; ++p)
            matrix(p, k) = maps[k][p];
    return matrix;
}

/// Chooses the nodes of a Galaxy for some bands.
class NodeChooser {
  public:
    NodeChooser(const GalaxySpec& galaxy, std::shared_ptr<const GalaxyTable> table, const HealpixGrid& grid,
                bool polarized, std::span<const BandSum> bands, double accuracy)
        : polarized_(polarized),
          accuracy_(accuracy),
          common_(make_common_spectrum(galaxy, table)),
          nodes_({0.0}, [](double) { return 0.0; }) {
        for (const BandSum& band : bands)
            for (const double hz : band.hz)
                frequencies_.insert(std::log(hz));
        const std::size_t step = (bands.size() + checked_channels - 1) / checked_channels;
        for (std::size_t c = 0; c < bands.size(); c += step)
            checked_.push_back(bands[c]);
        sample_pixels(galaxy, std::move(table), grid);
    }

    // Whether Q and U can follow from the same nodes stands in NodeSky::q being wanted or not.
    struct Choice {
        NodeInterpolation nodes;
        bool with_stokes;
    };
    [[nodiscard]] Choice choose() {
        const int own = static_cast<int>(std::min<std::size_t>(frequencies_.size(), most_nodes + 1));
        int count = 1;
        while (count < std::min(own, most_nodes) && !is_good(count, false))
            ++count;
        if (!polarized_ || turns_within_bands_) return {make_nodes(count), false};
        int both = count;
        while (both < std::min(own, most_polarized_nodes) && !is_good(both, true))
            ++both;
        const bool with_stokes = both >= own || is_good(both, true);
        return {make_nodes(with_stokes ? both : count), with_stokes};
    }

    // Two thirds of what the largest depth may be are met on the sampled lines of sight.
    void look_at_rotation(std::span<const Channel> channels) {
        const BandRefinement refinement{turn_between_nodes / (2 * 1.5 * std::max(largest_depth_, 1.0)),
                                        most_band_nodes};
        turns_within_bands_ = std::any_of(channels.begin(), channels.end(), [&](const Channel& channel) {
            return refine_band(channel, refinement).hz.size() > channel.band.hz.size();
        });
    }

    [[nodiscard]] NodeSky::Sample take_sample() { return std::move(sky_->sample); }

  private:
    void sample_pixels(const GalaxySpec& galaxy, std::shared_ptr<const GalaxyTable> table,
                       const HealpixGrid& grid) {
        const HealpixGrid coarse(std::min(grid.nside(), sampled_nside));
        // An odd step, since rings have even lengths and would else be met at one longitude.
        const std::int64_t step = std::max<std::int64_t>(1, coarse.npix() / sampled_pixels) | 1;
        std::vector<std::int64_t> pixels;
        for (std::int64_t p = 0; p < coarse.npix(); p += step)
            pixels.push_back(p);
        const double low = *frequencies_.begin();
        const double high = *frequencies_.rbegin();
        // Never the bands' own frequencies: a polynomial through clusters of them would run away between
        // these.
        const NodeInterpolation dense(
            low < high ? make_chebyshev_points(low, high, dense_nodes) : std::vector<double>{low}, common_);
        const GalaxyMaker maker(galaxy, std::move(table), coarse, polarized_);
        const GalaxyMaps maps = maker.make_pixels(pixels, to_frequencies(dense.log_hz), polarized_);
        sky_.emplace(NodeSky{nodes_, {}, {}, {}, {}, {}, {}, {dense, {}, {}, {}}, 0});
        sky_->sample.i = to_matrix(maps.i, pixels.size());
        largest_depth_ = *std::max_element(maps.largest_depth.begin(), maps.largest_depth.end());
        if (!polarized_) return;
        sky_->sample.q = to_matrix(maps.q, pixels.size());
        sky_->sample.u = to_matrix(maps.u, pixels.size());
        sky_->q.resize(1);  // "there are node maps": what the measuring looks at
    }

    // The channels' own frequencies where these are as few.
    [[nodiscard]] NodeInterpolation make_nodes(int count) const {
        if (static_cast<std::size_t>(count) >= frequencies_.size())
            return {std::vector<double>(frequencies_.begin(), frequencies_.end()), common_};
        return {make_chebyshev_points(*frequencies_.begin(), *frequencies_.rbegin(), count), common_};
    }

    [[nodiscard]] bool is_good(int count, bool with_stokes) {
        sky_->nodes = make_nodes(count);
        const NodeErrors errors = measure_node_errors(*sky_, checked_, with_stokes);
        const auto largest = [](const std::vector<double>& values) {
            return *std::max_element(values.begin(), values.end());
        };
        return largest(errors.rms) <= 0.2 * accuracy_ && largest(errors.worst) <= 0.5 * accuracy_;
    }

    bool polarized_;
    double accuracy_;
    std::function<double(double)> common_;
    std::set<double> frequencies_;  // ln of every band's nodes
    std::vector<BandSum> checked_;
    NodeInterpolation nodes_;
    std::optional<NodeSky> sky_;
    double largest_depth_ = 0;         // rotation measure on the sampled lines of sight [rad/m^2]
    bool turns_within_bands_ = false;  // by more than the bands' own nodes can follow
};

std::string cache_key(const GalaxySpec& galaxy, const HealpixGrid& grid, const std::string& what,
                      const std::vector<double>& numbers) {
    std::string key = "foreglow " + version() + "\nintegral " + std::to_string(integral_revision) + "\n" +
                      describe_exactly(galaxy) + "nside=" + std::to_string(grid.nside()) + "\n" + what + "\n";
    for (const double number : numbers)
        key += format_exact(number) + "\n";
    return key;
}

// Takes maps from the cache, or makes them and keeps them there; a cache that fails costs a notice, no more.
template <class Make>
CachedGalaxy from_cache(const std::optional<std::filesystem::path>& folder, const std::string& key,
                        Progress& progress, const Make& make) {
    if (!folder) return make();
    const GalaxyCache cache(*folder);
    if (auto found = cache.read(key)) {
        progress.notice("the Galaxy's maps were taken from the cache " + folder->string());
        return std::move(*found);
    }
    CachedGalaxy made = make();
    if (!made.maps.empty() &&
        made.maps.size() * made.maps.front().size() * sizeof(double) > largest_cache_bytes / 2)
        return made;
    try {
        cache.write(key, made);
    } catch (const FileError& error) {
        progress.notice(std::string("the Galaxy's maps were not kept for the next run: ") + error.what());
    }
    return made;
}

void append(std::vector<std::vector<double>>& to, std::vector<std::vector<double>>&& from) {
    for (auto& map : from)
        to.push_back(std::move(map));
}

std::vector<std::vector<double>> take(std::vector<std::vector<double>>& maps, std::size_t first,
                                      std::size_t count) {
    const auto begin = maps.begin() + static_cast<std::ptrdiff_t>(first);
    return {std::make_move_iterator(begin),
            std::make_move_iterator(begin + static_cast<std::ptrdiff_t>(count))};
}

std::shared_ptr<const SkyMap> to_sky_map(const HealpixGrid& grid, std::vector<double> values) {
    return std::make_shared<const SkyMap>(SkyMap{grid, Frame::Galactic, "", std::move(values)});
}

// Tangent index and curvature from five maps evenly spaced in ln nu: half the second derivative.
void set_truth(SkyModel& sky, std::vector<std::vector<double>> maps) {
    const std::size_t npix = maps[0].size();
    std::vector<double> index(npix);
    std::vector<double> curvature(npix);
    for (std::size_t p = 0; p < npix; ++p) {
        const auto log_t = [&](std::size_t k) { return std::log(maps[k][p]); };
        const double near = log_t(3) - log_t(1);
        const double far = log_t(4) - log_t(0);
        index[p] = (8 * near - far) / (12 * truth_step);
        const double second = 16 * (log_t(3) + log_t(1)) - (log_t(4) + log_t(0)) - 30 * log_t(2);
        curvature[p] = 0.5 * second / (12 * truth_step * truth_step);
    }
    sky.intensity = PixelField::of_map(to_sky_map(sky.grid, std::move(maps[2])));
    sky.index = PixelField::of_map(to_sky_map(sky.grid, std::move(index)));
    sky.curvature = PixelField::of_map(to_sky_map(sky.grid, std::move(curvature)));
}

void set_stokes(SkyModel& sky, std::vector<double> q, std::vector<double> u) {
    PolarizedSky polarized;
    polarized.reference = sky.reference;
    polarized.stokes.source = std::make_shared<const StokesMaps>(
        StokesMaps{sky.grid, Frame::Galactic, "K_RJ", std::move(q), std::move(u)});
    sky.polarization = std::move(polarized);
}

/// Integrates what the chosen nodes and the reference frequency want.
class Integrator {
  public:
    Integrator(const GalaxySpec& galaxy, std::shared_ptr<const GalaxyTable> table, const HealpixGrid& grid,
               bool polarized, const SkyUse& use, Progress& progress)
        : galaxy_(galaxy),
          table_(std::move(table)),
          grid_(grid),
          polarized_(polarized),
          use_(use),
          progress_(progress) {}

    // I at all frequencies, then Q and then U where they are wanted.
    [[nodiscard]] CachedGalaxy node_maps(const std::vector<double>& log_hz, bool with_stokes) {
        const std::string what = with_stokes ? "I Q U at frequencies" : "I at frequencies";
        return from_cache(use_.cache, cache_key(galaxy_, grid_, what, log_hz), progress_, [&] {
            GalaxyMaps maps = maker().make_maps(to_frequencies(log_hz), with_stokes, progress_);
            CachedGalaxy made{std::move(maps.i), maps.sampling, 0};
            append(made.maps, std::move(maps.q));
            append(made.maps, std::move(maps.u));
            return made;
        });
    }

    // Q of every channel and of the reference frequency, then U.
    [[nodiscard]] CachedGalaxy band_maps(Frequency reference) {
        std::vector<RefinedBand> bands;
        std::vector<double> numbers{reference.hz()};
        for (const Channel& channel : use_.channels) {
            bands.emplace_back([&channel](double step) {
                return refine_band(channel, {step, most_band_nodes});
            });
            numbers.insert(numbers.end(), channel.band.hz.begin(), channel.band.hz.end());
            numbers.insert(numbers.end(), channel.band.weights.begin(), channel.band.weights.end());
        }
        bands.emplace_back([reference](double) { return BandSum{{reference.hz()}, {1.0}}; });
        return from_cache(use_.cache, cache_key(galaxy_, grid_, "Q U in bands", numbers), progress_, [&] {
            GalaxyStokes stokes = maker().make_band_stokes(bands, progress_);
            CachedGalaxy made{std::move(stokes.q), {}, stokes.coarse_pixels};
            append(made.maps, std::move(stokes.u));
            return made;
        });
    }

  private:
    // Drawing the turbulence takes time: not done where the cache has the maps.
    [[nodiscard]] const GalaxyMaker& maker() {
        if (!maker_) maker_.emplace(galaxy_, table_, grid_, polarized_);
        return *maker_;
    }

    const GalaxySpec& galaxy_;
    std::shared_ptr<const GalaxyTable> table_;
    HealpixGrid grid_;
    bool polarized_;
    const SkyUse& use_;
    Progress& progress_;
    std::optional<GalaxyMaker> maker_;
};

std::vector<double> with_truth_nodes(std::vector<double> log_hz, Frequency reference) {
    for (std::size_t j = 0; j < truth_nodes; ++j)
        log_hz.push_back(std::log(reference.hz()) + truth_step * (static_cast<double>(j) - 2));
    return log_hz;
}

void add_notices(const NodeSky& nodes, const GalaxySampling& sampling, std::int64_t coarse, bool polarized,
                 Progress& progress) {
    progress.notice("the Galaxy was integrated at " + std::to_string(nodes.nodes.log_hz.size()) +
                    " frequencies with " + std::to_string(sampling.steps_near_plane) +
                    " steps a line of sight near the "
                    "plane and " +
                    std::to_string(sampling.steps_elsewhere) + " elsewhere: errors below " +
                    format_number(sampling.error, 2) + " of I");
    if (polarized && nodes.q.empty())
        progress.notice(
            "Faraday rotation is too strong over these bands for a few frequencies: Q and U were "
            "averaged over each channel's band in each pixel");
    if (coarse > 0)
        progress.notice(std::to_string(coarse) + " pixels rotate by more than " +
                        std::to_string(most_band_nodes) +
                        " nodes over a band can follow: their polarization is below a few thousandths there");
}

}  // namespace

SkyModel make_galaxy_sky(const GalaxySpec& galaxy, Frequency reference, const HealpixGrid& grid,
                         bool polarized, const SkyUse& use, Progress& progress) {
    FOREGLOW_EXPECTS(!use.channels.empty());
    progress.begin("choosing the Galaxy's frequencies");
    const auto table = std::make_shared<const GalaxyTable>(galaxy);
    const std::vector<BandSum> bands = bands_of(use.channels);
    NodeChooser chooser(galaxy, table, grid, polarized, bands, use.accuracy);
    if (polarized) chooser.look_at_rotation(use.channels);
    const NodeChooser::Choice choice = chooser.choose();
    progress.end();
    const std::size_t count = choice.nodes.log_hz.size();
    Integrator integrator(galaxy, table, grid, polarized, use, progress);
    CachedGalaxy made =
        integrator.node_maps(with_truth_nodes(choice.nodes.log_hz, reference), choice.with_stokes);
    SkyModel sky;
    sky.grid = grid;
    sky.reference = reference;
    auto nodes = std::make_shared<NodeSky>(
        NodeSky{choice.nodes, {}, {}, {}, {}, {}, {}, chooser.take_sample(), made.sampling.error});
    nodes->i = take(made.maps, 0, count);
    set_truth(sky, take(made.maps, count, truth_nodes));
    std::int64_t coarse = 0;
    const std::size_t all = count + truth_nodes;
    if (choice.with_stokes) {
        nodes->q = take(made.maps, all, count);
        nodes->u = take(made.maps, 2 * all, count);
        set_stokes(sky, std::move(made.maps[all + count + 2]), std::move(made.maps[2 * all + count + 2]));
    } else if (polarized) {
        CachedGalaxy stokes = integrator.band_maps(reference);
        coarse = stokes.coarse_pixels;
        nodes->bands = bands;
        nodes->band_q = take(stokes.maps, 0, bands.size());
        nodes->band_u = take(stokes.maps, bands.size() + 1, bands.size());
        set_stokes(sky, std::move(stokes.maps[bands.size()]), std::move(stokes.maps[2 * bands.size() + 1]));
    }
    add_notices(*nodes, made.sampling, coarse, polarized, progress);
    sky.nodes = std::move(nodes);
    sky.labels.push_back("Simulated Galaxy with invented parameters: not the measured sky");
    return sky;
}

std::int64_t count_galaxy_values(const HealpixGrid& grid, bool polarized, std::span<const Channel> channels) {
    constexpr std::int64_t usual_nodes = 8;
    constexpr double strong_rotation_hz = 8e9;  // below it, rotation measures of 1000 turn by radians
    const std::int64_t stokes = polarized ? 3 : 1;
    std::int64_t maps = (usual_nodes + static_cast<std::int64_t>(truth_nodes)) * stokes + 2 * stokes;
    for (const Channel& channel : channels)
        if (polarized && channel.band.hz.front() < strong_rotation_hz) maps += 2;
    return maps * grid.npix();
}

}  // namespace foreglow
