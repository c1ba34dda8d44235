// SPDX-License-Identifier: GPL-2.0-or-later
#include <algorithm>
#include <cmath>
#include <optional>
#include <string>

#include "base/interrupt.h"
#include "base/parallel.h"
#include "jobs/channel_stream.h"
#include "jobs/make_maps.h"
#include "jobs/map_cards.h"
#include "jobs/map_pieces.h"
#include "model/pixel_route.h"
#include "sphere/regrid.h"
#include "sphere/rotation.h"

namespace foreglow {
namespace {

constexpr std::int64_t strip_pixels = std::int64_t{1} << 22;
constexpr double truth_tolerance = 1e-9;

void write_pieces(const HealpixGrid& grid, const RingStrip& strip, MapFile& file,
                  std::span<std::vector<double>* const> columns) {
    const auto pieces = cut_into_pieces(grid, strip);
    parallel_for_blocks(static_cast<std::int64_t>(pieces.size()), 1, [&](std::int64_t task, std::int64_t) {
        const MapPiece& piece = pieces[static_cast<std::size_t>(task)];
        std::array<std::span<double>, 3> parts;
        for (std::size_t c = 0; c < columns.size(); ++c)
            parts[c] = std::span(*columns[c]).subspan(piece.begin, piece.size());
        file.write(piece.first_pixel, {parts.data(), columns.size()});
    });
}

/// Brings strips to what the truth files show: Q and U as their law gives them at the intensity's reference
/// frequency, the law's local index and curvature there.
class TruthAtReference {
  public:
    TruthAtReference(const SkyModel& sky, bool polarized) : sky_(sky) {
        if (polarized && !(sky.polarization->reference == sky.reference))
            carry_.emplace(polarized_law(sky), BandSum{{sky.reference.hz()}, {1.0}}, truth_tolerance);
    }
    void apply(SkyStrip& values) const {
        if (carry_) {
            parallel_for_blocks(
                static_cast<std::int64_t>(values.q.size()), 65536, [&](std::int64_t begin, std::int64_t end) {
                    carry(values, static_cast<std::size_t>(begin), static_cast<std::size_t>(end - begin));
                });
        }
        add_local_spectrum(sky_, values);
    }

  private:
    void carry(SkyStrip& values, std::size_t first, std::size_t count) const {
        std::vector<double> factor(count);
        carry_->evaluate(values.polarized_columns().part(first, count), factor);
        for (std::size_t i = 0; i < count; ++i) {
            values.q[first + i] *= factor[i];
            values.u[first + i] *= factor[i];
        }
    }

    const SkyModel& sky_;
    std::optional<BandFactor> carry_;
};

std::string truth_name(const Plan& plan, const std::string& what, std::optional<int> realization) {
    return "truth/" + (realization ? map_stem(plan, what, *realization) : what) + ".fits";
}

std::vector<FitsMapColumnName> amplitude_columns(bool polarized) {
    if (polarized) return {{"I_STOKES", "K_RJ"}, {"Q_STOKES", "K_RJ"}, {"U_STOKES", "K_RJ"}};
    return {{"I_STOKES", "K_RJ"}};
}

/// The three files, open; index.fits has a second column where the polarization has its own index.
class TruthFiles {
  public:
    TruthFiles(const Plan& plan, const SkyModel& sky, std::optional<int> realization, OutputFolder& folder,
               MakeResult& result)
        : polarized_(plan.study.polarized),
          own_index_(polarized_ && sky.polarization->index.has_value()),
          amplitude_(folder.prepare(truth_name(plan, "amplitude", realization)),
                     make_truth_layout(plan, sky, amplitude_columns(polarized_), polarized_, realization),
                     polarized_),
          index_(folder.prepare(truth_name(plan, "index", realization)),
                 make_truth_layout(plan, sky, index_columns(), false, realization), false),
          curvature_(folder.prepare(truth_name(plan, "curvature", realization)),
                     make_truth_layout(plan, sky, {{"CURVATURE", ""}}, false, realization), false) {
        for (const char* name : {"amplitude", "index", "curvature"})
            result.outputs.push_back(truth_name(plan, name, realization));
    }

    void write(const HealpixGrid& grid, const RingStrip& strip, SkyStrip& values) {
        const std::array<std::vector<double>*, 3> stokes{&values.intensity, &values.q, &values.u};
        const std::array<std::vector<double>*, 2> indices{&values.index, &values.polarized_index};
        std::vector<double>* curvature = &values.curvature;
        write_pieces(grid, strip, amplitude_, {stokes.data(), polarized_ ? 3U : 1U});
        write_pieces(grid, strip, index_, {indices.data(), own_index_ ? 2U : 1U});
        write_pieces(grid, strip, curvature_, {&curvature, 1});
    }

    void finish() {
        amplitude_.finish();
        index_.finish();
        curvature_.finish();
    }

  private:
    [[nodiscard]] std::vector<FitsMapColumnName> index_columns() const {
        if (own_index_) return {{"INDEX", ""}, {"INDEX_POLARIZED", ""}};
        return {{"INDEX", ""}};
    }

    bool polarized_, own_index_;
    MapFile amplitude_, index_, curvature_;
};

// The whole sky in another frame: brightness through its a_lm (bilinear interpolation would smooth it),
// indices by interpolation.
SkyStrip turn_sky(const Plan& plan, const SkyModel& sky) {
    const StudySpec& study = plan.study;
    const RingStrip whole{0, sky.grid.ring_count(), false};
    SkyStrip values = make_sky_strip(sky, whole, study.polarized);
    TruthAtReference(sky, study.polarized).apply(values);
    const auto turn_plain = [&](std::vector<double>& column) {
        if (column.empty()) return;
        column = interpolate({sky.grid, sky.frame, "", std::move(column)}, sky.grid, study.frame).values;
    };
    turn_plain(values.index);
    turn_plain(values.curvature);
    turn_plain(values.polarized_index);
    values.intensity = harmonic_regrid(SkyMap{sky.grid, sky.frame, "K_RJ", std::move(values.intensity)},
                                       sky.grid, study.frame, study.lmax)
                           .values;
    if (!study.polarized) return values;
    StokesMaps stokes =
        harmonic_regrid(StokesMaps{sky.grid, sky.frame, "K_RJ", std::move(values.q), std::move(values.u)},
                        sky.grid, study.frame, study.lmax);
    values.q = std::move(stokes.q);
    values.u = std::move(stokes.u);
    return values;
}

MapFile open_channel_sky(const Plan& plan, const SkyModel& sky, OutputFolder& folder, std::size_t channel,
                         std::optional<int> realization, double accuracy, MakeResult& result) {
    const std::string name = truth_name(plan, "channels/" + plan.channels[channel].name, realization);
    result.outputs.push_back(name);
    const FitsMapLayout layout = make_channel_layout(
        plan, sky, plan.channels[channel], realization.value_or(plan.realizations.front()), accuracy, false);
    return {folder.prepare(name), layout, plan.study.polarized};
}

// Each channel's sky before its beam, pixel by pixel.
void write_channel_skies(const Plan& plan, const SkyModel& sky, std::optional<int> realization,
                         OutputFolder& folder, MakeResult& result) {
    std::vector<BandSum> bands;
    for (const Channel& channel : plan.channels)
        bands.push_back(channel.band);
    const PixelRoute route(sky, bands, plan.study.polarized, truth_tolerance);
    const std::size_t stokes = plan.study.polarized ? 3 : 1;
    for (std::size_t c = 0; c < bands.size(); ++c) {
        MapFile file = open_channel_sky(plan, sky, folder, c, realization, route.error_of(c), result);
        for (const RingStrip& strip : cut_into_strips(sky.grid, strip_pixels)) {
            check_interrupt();
            const SkyStrip values = route.make_strip(sky, strip);
            std::array<std::vector<double>, 3> columns;
            std::array<std::vector<double>*, 3> targets{};
            std::array<std::span<double>, 3> views;
            for (std::size_t s = 0; s < stokes; ++s) {
                columns[s].resize(values.intensity.size());
                targets[s] = &columns[s];
                views[s] = columns[s];
            }
            route.make_pixels(values, c, 0, values.intensity.size(), {views.data(), stokes});
            write_pieces(sky.grid, strip, file, {targets.data(), stokes});
        }
        file.finish();
    }
}

// As above in another frame: through a_lm, as the maps themselves.
void write_turned_channel_skies(const Plan& plan, const SkyModel& sky, std::optional<int> realization,
                                OutputFolder& folder, Progress& progress, MakeResult& result) {
    std::vector<Channel> channels = plan.channels;
    for (Channel& channel : channels)
        channel.beam.reset();
    HarmonicOptions options;
    options.polarized = plan.study.polarized;
    options.lmax = plan.study.lmax;
    options.accuracy = plan.study.accuracy;
    options.frame = plan.study.frame;
    const HarmonicRoute route(sky, std::move(channels), options, progress);
    const std::size_t group = std::min<std::size_t>(128, route.group_size());
    for (std::size_t first = 0; first < route.channel_count(); first += group) {
        const std::size_t count = std::min(group, route.channel_count() - first);
        std::vector<MapFile> files;
        for (std::size_t c = first; c < first + count; ++c)
            files.push_back(open_channel_sky(plan, sky, folder, c, realization, route.error_of(c), result));
        stream_channels(
            sky.grid, route, plan.study.polarized ? 3 : 1, first, count,
            [&](std::size_t k, const MapPiece& piece, std::span<const std::span<double>> columns,
                StokesStatistics&) { files[k].write(piece.first_pixel, columns); },
            [](std::size_t, const StokesStatistics&) {});
        for (MapFile& file : files)
            file.finish();
    }
}

}  // namespace

void write_truth_maps(const Plan& plan, const SkyModel& sky, std::optional<int> realization,
                      OutputFolder& folder, Progress& progress, MakeResult& result) {
    if (plan.study.truth == TruthLevel::None) return;
    progress.begin("writing truth maps");
    TruthFiles files(plan, sky, realization, folder, result);
    if (plan.study.frame != sky.frame) {
        SkyStrip turned = turn_sky(plan, sky);
        files.write(sky.grid, {0, sky.grid.ring_count(), false}, turned);
    } else {
        const TruthAtReference at_reference(sky, plan.study.polarized);
        for (const RingStrip& strip : cut_into_strips(sky.grid, strip_pixels)) {
            check_interrupt();
            SkyStrip values = make_sky_strip(sky, strip, plan.study.polarized);
            at_reference.apply(values);
            files.write(sky.grid, strip, values);
        }
    }
    files.finish();
    progress.end();
    if (plan.study.truth != TruthLevel::Full) return;
    if (plan.study.frame != sky.frame) {
        write_turned_channel_skies(plan, sky, realization, folder, progress, result);
        return;
    }
    progress.begin("writing the channels' skies before beams");
    write_channel_skies(plan, sky, realization, folder, result);
    progress.end();
}

}  // namespace foreglow
