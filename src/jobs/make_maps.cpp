// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/make_maps.h"

#include <algorithm>
#include <memory>

#include "base/parallel.h"
#include "jobs/channel_stream.h"
#include "jobs/map_cards.h"
#include "jobs/map_pieces.h"
#include "model/map_file.h"
#include "model/pixel_route.h"

namespace foreglow {
namespace {

constexpr std::size_t most_open_files = 128;  // well below the usual limit of 1024
constexpr std::size_t most_previews = 3;
constexpr double single_rounding = 0x1p-24;  // largest relative error of a float32

std::string map_name(const Plan& plan, std::size_t channel, int realization) {
    return "maps/" + map_stem(plan, plan.channels[channel].name, realization) + ".fits";
}

double rounding_of(const StudySpec& study) {
    return study.precision == MapPrecision::Float32 ? single_rounding : 0.0;
}

// The first, the middle and the last channel.
bool has_preview(const Plan& plan, std::size_t channel) {
    const std::size_t n = plan.channels.size();
    return channel == 0 || channel + 1 == n || (n > most_previews - 1 && channel == n / 2);
}

std::unique_ptr<PreviewSampler> make_sampler(const Plan& plan, std::size_t channel) {
    if (!has_preview(plan, channel)) return nullptr;
    return std::make_unique<PreviewSampler>(HealpixGrid(plan.study.nside), plan.study.frame,
                                            to_text(plan.study.unit), plan.study.polarized ? 3 : 1,
                                            plan.channels[channel].name);
}

/// One channel's file of one realization, open.
struct OpenMap {
    std::size_t channel = 0;
    std::unique_ptr<MapFile> file;
    std::unique_ptr<PreviewSampler> sampler;  ///< of the first realization
    bool counts = false;                      ///< statistics are taken
    double mean = 0;                          ///< to be subtracted from I
};

/// What a route reached in one channel, which goes into the channel's headers.
struct Reached {
    double accuracy = 0;
    double mean_removed = 0;
};

OpenMap open_map(const Plan& plan, const SkyModel& sky, OutputFolder& folder, std::size_t channel,
                 int realization, const Reached& reached, MakeResult& result) {
    OpenMap map;
    map.channel = channel;
    const std::string name = map_name(plan, channel, realization);
    const FitsMapLayout layout =
        make_channel_layout(plan, sky, plan.channels[channel], realization, reached.accuracy);
    map.file = std::make_unique<MapFile>(folder.prepare(name), layout, plan.study.polarized);
    result.outputs.push_back(name);
    map.counts = realization == plan.realizations.front();
    if (map.counts) map.sampler = make_sampler(plan, channel);
    map.mean = reached.mean_removed;
    return map;
}

// Subtracts the mean, counts, samples, writes.
void deliver(OpenMap& map, std::int64_t first_pixel, std::span<const std::span<double>> columns,
             StokesStatistics& statistics) {
    if (map.mean != 0)
        for (double& value : columns[0])
            value -= map.mean;
    if (map.counts)
        for (std::size_t c = 0; c < columns.size(); ++c)
            statistics[c].add(columns[c]);
    if (map.sampler) map.sampler->sample(first_pixel, columns);
    map.file->write(first_pixel, columns);
}

void merge(ChannelOutcome& outcome, const StokesStatistics& statistics) {
    outcome.i.merge(statistics[0]);
    outcome.q.merge(statistics[1]);
    outcome.u.merge(statistics[2]);
}

void finish_all(std::vector<OpenMap>& maps, MakeResult& result) {
    parallel_for_blocks(static_cast<std::int64_t>(maps.size()), 1, [&](std::int64_t begin, std::int64_t) {
        maps[static_cast<std::size_t>(begin)].file->finish();
    });
    for (OpenMap& map : maps)
        if (map.sampler) result.previews.push_back(map.sampler->take());
}

/// Channels made pixel by pixel, as a route of stream_channels.
class PixelSource {
  public:
    PixelSource(const SkyModel& sky, std::span<const BandSum> bands, const StudySpec& study)
        : sky_(sky),
          precision_(study.precision == MapPrecision::Float32 ? ExpPrecision::Single : ExpPrecision::Double),
          route_(sky, bands, study.polarized, tolerance_of(study)) {}

    [[nodiscard]] double error_of(std::size_t channel) const { return route_.error_of(channel); }
    [[nodiscard]] std::size_t group_size() const { return route_.channel_count(); }
    [[nodiscard]] std::int64_t strip_pixels() const { return std::int64_t{1} << 22; }
    [[nodiscard]] SkyStrip make_strip(const RingStrip& strip, std::size_t, std::size_t) const {
        return route_.make_strip(sky_, strip);
    }
    void make_pixels(const SkyStrip& strip, std::size_t channel, std::size_t begin, std::size_t end,
                     std::span<const std::span<double>> out) const {
        route_.make_pixels(strip, channel, begin, end, out, precision_);
    }

  private:
    // Ten times below what was asked for, and never worse than what the files keep: one more term costs
    // little.
    static double tolerance_of(const StudySpec& study) {
        const double keep = study.precision == MapPrecision::Float32 ? 1e-6 : 5e-8;
        return std::clamp(0.1 * study.accuracy, 1e-11, keep);
    }

    const SkyModel& sky_;
    ExpPrecision precision_;
    PixelRoute route_;
};

/// Writes the channels of one route.
template <class Route>
class ChannelWriter {
  public:
    ChannelWriter(const Plan& plan, const SkyModel& sky, const Route& route,
                  const std::vector<std::size_t>& channels, std::span<const int> realizations)
        : plan_(plan),
          sky_(sky),
          route_(route),
          channels_(channels),
          realizations_(realizations),
          columns_(plan.study.polarized ? 3 : 1),
          reached_(channels.size()) {}

    void write(const std::string& phase, OutputFolder& folder, Progress& progress, MakeResult& result) {
        for (std::size_t k = 0; k < channels_.size(); ++k)
            reached_[k].accuracy = route_.error_of(k) + rounding_of(plan_.study);
        if (plan_.study.remove_monopole) measure_means();
        report_reached(result);
        progress.begin(phase, static_cast<std::int64_t>(channels_.size() * realizations_.size()));
        std::int64_t done = 0;
        const std::size_t group = std::min(most_open_files, route_.group_size());
        for (const int realization : realizations_)
            for (std::size_t first = 0; first < channels_.size(); first += group) {
                const std::size_t count = std::min(group, channels_.size() - first);
                write_group(first, count, realization, folder, result);
                progress.step(done += static_cast<std::int64_t>(count));
            }
        progress.end();
    }

  private:
    // The worst accuracy of all realizations, the first one's mean.
    void report_reached(MakeResult& result) const {
        const bool is_first = realizations_.front() == plan_.realizations.front();
        for (std::size_t k = 0; k < channels_.size(); ++k) {
            ChannelOutcome& outcome = result.channels[channels_[k]];
            outcome.accuracy = std::max(outcome.accuracy, reached_[k].accuracy);
            if (is_first) outcome.mean_removed = reached_[k].mean_removed;
        }
    }

    void measure_means() {
        std::vector<MapStatistics> means(channels_.size());
        for (std::size_t first = 0; first < channels_.size(); first += route_.group_size()) {
            const std::size_t count = std::min(route_.group_size(), channels_.size() - first);
            stream_channels(
                sky_.grid, route_, columns_, first, count,
                [](std::size_t, const MapPiece&, std::span<const std::span<double>> columns,
                   StokesStatistics& statistics) { statistics[0].add(columns[0]); },
                [&](std::size_t k, const StokesStatistics& statistics) {
                    means[first + k].merge(statistics[0]);
                });
        }
        for (std::size_t k = 0; k < channels_.size(); ++k)
            reached_[k].mean_removed = means[k].mean();
    }

    void write_group(std::size_t first, std::size_t count, int realization, OutputFolder& folder,
                     MakeResult& result) const {
        std::vector<OpenMap> maps;
        for (std::size_t k = first; k < first + count; ++k)
            maps.push_back(open_map(plan_, sky_, folder, channels_[k], realization, reached_[k], result));
        stream_channels(
            sky_.grid, route_, columns_, first, count,
            [&](std::size_t k, const MapPiece& piece, std::span<const std::span<double>> columns,
                StokesStatistics& statistics) { deliver(maps[k], piece.first_pixel, columns, statistics); },
            [&](std::size_t k, const StokesStatistics& statistics) {
                if (maps[k].counts) merge(result.channels[maps[k].channel], statistics);
            });
        finish_all(maps, result);
    }

    const Plan& plan_;
    const SkyModel& sky_;
    const Route& route_;
    const std::vector<std::size_t>& channels_;
    std::span<const int> realizations_;
    std::size_t columns_;
    std::vector<Reached> reached_;  // [channels]
};

void write_pixel_maps(const Plan& plan, const SkyModel& sky, const std::vector<std::size_t>& channels,
                      std::span<const int> realizations, OutputFolder& folder, Progress& progress,
                      MakeResult& result) {
    std::vector<BandSum> bands;
    for (const std::size_t c : channels) {
        bands.push_back(plan.channels[c].band);
        result.channels[c].per_pixel = true;
    }
    const PixelSource source(sky, bands, plan.study);
    ChannelWriter(plan, sky, source, channels, realizations)
        .write("writing maps made pixel by pixel", folder, progress, result);
}

void write_harmonic_maps(const Plan& plan, const SkyModel& sky, const std::vector<std::size_t>& channels,
                         std::span<const int> realizations, OutputFolder& folder, Progress& progress,
                         MakeResult& result) {
    std::vector<Channel> chosen;
    chosen.reserve(channels.size());
    for (const std::size_t c : channels)
        chosen.push_back(plan.channels[c]);
    HarmonicOptions options;
    options.polarized = plan.study.polarized;
    options.lmax = plan.study.lmax;
    options.accuracy = plan.study.accuracy;
    options.frame = plan.study.frame;
    if (plan.study.pixel_window) options.pixel_window = read_pixel_window(plan.study.nside, plan.study.lmax);
    const HarmonicRoute route(sky, std::move(chosen), options, progress);
    if (!result.has_harmonic) result.harmonic = route.report();
    result.has_harmonic = true;
    ChannelWriter(plan, sky, route, channels, realizations)
        .write("writing maps with beams", folder, progress, result);
}

}  // namespace

void write_channel_maps(const Plan& plan, const SkyModel& sky, std::span<const int> realizations,
                        OutputFolder& folder, Progress& progress, MakeResult& result) {
    result.channels.resize(plan.channels.size());
    result.labels = sky.labels;
    std::vector<std::size_t> per_pixel, harmonic;
    for (std::size_t c = 0; c < plan.channels.size(); ++c)
        (plan.per_pixel[c] ? per_pixel : harmonic).push_back(c);
    if (!per_pixel.empty()) write_pixel_maps(plan, sky, per_pixel, realizations, folder, progress, result);
    if (!harmonic.empty()) write_harmonic_maps(plan, sky, harmonic, realizations, folder, progress, result);
    std::sort(result.outputs.begin(), result.outputs.end());
}

}  // namespace foreglow
