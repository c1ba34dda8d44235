// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/make_maps.h"

#include <algorithm>
#include <memory>

#include "base/interrupt.h"
#include "base/parallel.h"
#include "jobs/map_cards.h"
#include "jobs/map_pieces.h"
#include "model/map_file.h"
#include "model/pixel_route.h"

namespace foreglow {
namespace {

constexpr std::int64_t strip_pixels = std::int64_t{1} << 22;
constexpr std::size_t batch_size = 8;    // channels that one thread does for a piece
constexpr std::size_t group_size = 128;  // files open at once stay well below the usual limit of 1024
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

OpenMap open_map(const Plan& plan, const SkyModel& sky, OutputFolder& folder, std::size_t channel,
                 int realization, MakeResult& result) {
    OpenMap map;
    map.channel = channel;
    const std::string name = map_name(plan, channel, realization);
    const FitsMapLayout layout = make_channel_layout(plan, sky, plan.channels[channel], realization,
                                                     result.channels[channel].accuracy);
    map.file = std::make_unique<MapFile>(folder.prepare(name), layout, plan.study.polarized);
    result.outputs.push_back(name);
    map.counts = realization == plan.realizations.front();
    if (map.counts) map.sampler = make_sampler(plan, channel);
    map.mean = result.channels[channel].mean_removed;
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

/// The columns of one piece.
class PieceBuffer {
  public:
    PieceBuffer(std::size_t columns, std::size_t size) : values_(columns * size), count_(columns) {
        for (std::size_t c = 0; c < columns; ++c)
            columns_[c] = std::span(values_).subspan(c * size, size);
    }
    [[nodiscard]] std::span<const std::span<double>> columns() const { return {columns_.data(), count_}; }

  private:
    std::vector<double> values_;
    std::array<std::span<double>, 3> columns_;
    std::size_t count_;
};

class PixelMaps {
  public:
    PixelMaps(const Plan& plan, const SkyModel& sky, std::vector<std::size_t> channels)
        : plan_(plan),
          sky_(sky),
          channels_(std::move(channels)),
          precision_(plan.study.precision == MapPrecision::Float32 ? ExpPrecision::Single
                                                                   : ExpPrecision::Double),
          route_(make_route()) {}

    void write(OutputFolder& folder, Progress& progress, MakeResult& result) {
        for (std::size_t k = 0; k < channels_.size(); ++k) {
            ChannelOutcome& outcome = result.channels[channels_[k]];
            outcome.per_pixel = true;
            outcome.accuracy = route_.error_of(k) + rounding_of(plan_.study);
        }
        if (plan_.study.remove_monopole) measure_means(result);
        progress.begin("writing maps made pixel by pixel",
                       static_cast<std::int64_t>(channels_.size() * plan_.realizations.size()));
        std::int64_t done = 0;
        for (const int realization : plan_.realizations)
            for (std::size_t first = 0; first < channels_.size(); first += group_size) {
                const std::size_t count = std::min(group_size, channels_.size() - first);
                write_group(first, count, realization, folder, result);
                progress.step(done += static_cast<std::int64_t>(count));
            }
        progress.end();
    }

  private:
    [[nodiscard]] PixelRoute make_route() const {
        std::vector<BandSum> bands;
        for (const std::size_t c : channels_)
            bands.push_back(plan_.channels[c].band);
        // Ten times below what was asked for, and never worse than what the files keep: one more term costs
        // little.
        const double keep = precision_ == ExpPrecision::Single ? 1e-6 : 5e-8;
        const double tolerance = std::clamp(0.1 * plan_.study.accuracy, 1e-11, keep);
        return {sky_, bands, plan_.study.polarized, tolerance};
    }

    // Calls work(channel's place, piece, columns, statistics) for all channels of a group and all pieces,
    // strip by strip. A thread does one piece for several channels, so that the piece's sky stays in the
    // cache.
    template <class Work, class AfterStrip>
    void for_each_piece(std::size_t first, std::size_t count, const Work& work,
                        const AfterStrip& after_strip) const {
        const std::size_t batches = (count + batch_size - 1) / batch_size;
        for (const RingStrip& strip : cut_into_strips(sky_.grid, strip_pixels)) {
            check_interrupt();
            const SkyStrip values = make_sky_strip(sky_, strip, plan_.study.polarized);
            const auto pieces = cut_into_pieces(sky_.grid, strip);
            std::vector<StokesStatistics> statistics(count * pieces.size());  // [pieces][count]
            const auto tasks = static_cast<std::int64_t>(pieces.size() * batches);
            parallel_for_blocks(tasks, 1, [&](std::int64_t task, std::int64_t) {
                const std::size_t p = static_cast<std::size_t>(task) / batches;
                const std::size_t begin = static_cast<std::size_t>(task) % batches * batch_size;
                const PieceBuffer buffer(plan_.study.polarized ? 3 : 1, pieces[p].size());
                for (std::size_t k = begin; k < std::min(count, begin + batch_size); ++k) {
                    route_.make_pixels(values, first + k, pieces[p].begin, pieces[p].end, buffer.columns(),
                                       precision_);
                    work(k, pieces[p], buffer.columns(), statistics[p * count + k]);
                }
            });
            for (std::size_t t = 0; t < statistics.size(); ++t)
                after_strip(t % count, statistics[t]);
        }
    }

    void measure_means(MakeResult& result) const {
        std::vector<MapStatistics> means(channels_.size());
        for_each_piece(
            0, channels_.size(),
            [](std::size_t, const MapPiece&, std::span<const std::span<double>> columns,
               StokesStatistics& statistics) { statistics[0].add(columns[0]); },
            [&](std::size_t k, const StokesStatistics& statistics) { means[k].merge(statistics[0]); });
        for (std::size_t k = 0; k < channels_.size(); ++k)
            result.channels[channels_[k]].mean_removed = means[k].mean();
    }

    void write_group(std::size_t first, std::size_t count, int realization, OutputFolder& folder,
                     MakeResult& result) const {
        std::vector<OpenMap> maps;
        for (std::size_t k = first; k < first + count; ++k)
            maps.push_back(open_map(plan_, sky_, folder, channels_[k], realization, result));
        for_each_piece(
            first, count,
            [&](std::size_t k, const MapPiece& piece, std::span<const std::span<double>> columns,
                StokesStatistics& statistics) { deliver(maps[k], piece.first_pixel, columns, statistics); },
            [&](std::size_t k, const StokesStatistics& statistics) {
                if (maps[k].counts) merge(result.channels[maps[k].channel], statistics);
            });
        finish_all(maps, result);
    }

    const Plan& plan_;
    const SkyModel& sky_;
    std::vector<std::size_t> channels_;
    ExpPrecision precision_;
    PixelRoute route_;
};

class HarmonicMaps {
  public:
    HarmonicMaps(const Plan& plan, const SkyModel& sky, std::vector<std::size_t> channels)
        : plan_(plan), sky_(sky), channels_(std::move(channels)) {}

    void write(OutputFolder& folder, Progress& progress, MakeResult& result) const {
        std::vector<Channel> chosen;
        for (const std::size_t c : channels_)
            chosen.push_back(plan_.channels[c]);
        HarmonicOptions options;
        options.polarized = plan_.study.polarized;
        options.lmax = plan_.study.lmax;
        options.accuracy = plan_.study.accuracy;
        options.frame = plan_.study.frame;
        if (plan_.study.pixel_window)
            options.pixel_window = read_pixel_window(plan_.study.nside, plan_.study.lmax);
        const HarmonicRoute route(sky_, std::move(chosen), options, progress);
        result.harmonic = route.report();
        result.has_harmonic = true;
        progress.begin("writing maps with beams", static_cast<std::int64_t>(channels_.size()));
        for (std::size_t k = 0; k < channels_.size(); ++k) {
            check_interrupt();
            result.channels[channels_[k]].accuracy = route.error_of(k) + rounding_of(plan_.study);
            write_channel(route.make_channel(k), channels_[k], folder, result);
            progress.step(static_cast<std::int64_t>(k) + 1);
        }
        progress.end();
    }

  private:
    void write_channel(ChannelMaps maps, std::size_t channel, OutputFolder& folder,
                       MakeResult& result) const {
        const RingStrip whole{0, sky_.grid.ring_count(), false};
        const auto pieces = cut_into_pieces(sky_.grid, whole);
        if (plan_.study.remove_monopole) {
            MapStatistics all;
            all.add(maps.i);
            result.channels[channel].mean_removed = all.mean();
        }
        std::vector<OpenMap> open;
        for (const int realization : plan_.realizations)
            open.push_back(open_map(plan_, sky_, folder, channel, realization, result));
        for (OpenMap& map : open) {
            std::vector<StokesStatistics> statistics(pieces.size());
            parallel_for_blocks(
                static_cast<std::int64_t>(pieces.size()), 1, [&](std::int64_t task, std::int64_t) {
                    const auto t = static_cast<std::size_t>(task);
                    const MapPiece& piece = pieces[t];
                    std::array<std::vector<double>, 3> copies;  // delivery changes signs and means
                    std::array<std::span<double>, 3> columns;
                    const std::array<const std::vector<double>*, 3> sources{&maps.i, &maps.q, &maps.u};
                    const std::size_t stokes = maps.q.empty() ? 1 : 3;
                    for (std::size_t s = 0; s < stokes; ++s) {
                        const auto from = sources[s]->begin() + piece.first_pixel;
                        copies[s].assign(from, from + static_cast<std::ptrdiff_t>(piece.size()));
                        columns[s] = copies[s];
                    }
                    deliver(map, piece.first_pixel, {columns.data(), stokes}, statistics[t]);
                });
            if (map.counts)
                for (const StokesStatistics& one : statistics)
                    merge(result.channels[channel], one);
        }
        finish_all(open, result);
    }

    const Plan& plan_;
    const SkyModel& sky_;
    std::vector<std::size_t> channels_;
};

}  // namespace

void write_channel_maps(const Plan& plan, const SkyModel& sky, OutputFolder& folder, Progress& progress,
                        MakeResult& result) {
    result.channels.resize(plan.channels.size());
    result.labels = sky.labels;
    std::vector<std::size_t> per_pixel, harmonic;
    for (std::size_t c = 0; c < plan.channels.size(); ++c)
        (plan.per_pixel[c] ? per_pixel : harmonic).push_back(c);
    if (!per_pixel.empty()) PixelMaps(plan, sky, std::move(per_pixel)).write(folder, progress, result);
    if (!harmonic.empty()) HarmonicMaps(plan, sky, std::move(harmonic)).write(folder, progress, result);
    std::sort(result.outputs.begin(), result.outputs.end());
}

}  // namespace foreglow
