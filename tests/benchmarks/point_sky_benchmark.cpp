// SPDX-License-Identifier: GPL-2.0-or-later
// A million positions on a model over float32 templates of nside 1024 (I, Q, U, index, curvature): from
// longitude and latitude to brightness, index, curvature, Q and U at one frequency, text left out. The files
// are in the folder FOREGLOW_BENCHMARK_MEMORY and in the page cache.
#include <benchmark/benchmark.h>

#include <array>
#include <cmath>
#include <cstdlib>
#include <fstream>

#include "base/parallel.h"
#include "io/fits_map_write.h"
#include "model/model_file.h"
#include "model/point_sky.h"
#include "model/point_values.h"
#include "sphere/sky_position.h"

namespace {

using namespace foreglow;
namespace fs = std::filesystem;

constexpr int nside = 1024;
constexpr std::int64_t npix = 12LL * nside * nside;
constexpr std::size_t positions_count = 1000000;
constexpr std::size_t batch = 65536;  // as `foreglow at` takes them

fs::path folder() {
    const char* name = std::getenv("FOREGLOW_BENCHMARK_MEMORY");
    return (name != nullptr ? fs::path(name) : fs::temp_directory_path()) / "point-sky";
}

void write_template(const fs::path& path, const std::vector<FitsMapColumnName>& columns, float low,
                    float high) {
    FitsMapLayout layout;
    layout.nside = nside;
    layout.columns = columns;
    if (columns.size() == 3) layout.convention = PolarizationConvention::Cosmo;
    FitsMapWriter writer(path, layout);
    constexpr std::size_t tile = 1 << 15;
    std::vector<float> values(tile);
    const std::vector<std::span<const float>> parts(columns.size(), std::span<const float>(values));
    for (std::int64_t first = 0; first < npix; first += static_cast<std::int64_t>(tile)) {
        for (std::size_t i = 0; i < tile; ++i)
            values[i] = low + (high - low) *
                                  static_cast<float>((static_cast<std::size_t>(first) + i) % 1013) / 1013.0F;
        writer.write_pixels(first, FitsMapWriter::FloatColumns(parts));
    }
    writer.finish();
}

fs::path make_model_file() {
    fs::create_directories(folder());
    write_template(folder() / "sky.fits", {{"I_STOKES", "K_RJ"}, {"Q_STOKES", "K_RJ"}, {"U_STOKES", "K_RJ"}},
                   1, 30);
    write_template(folder() / "index.fits", {{"INDEX", ""}}, -3.1F, -2.5F);
    write_template(folder() / "curvature.fits", {{"CURVATURE", ""}}, -0.1F, 0.0F);
    const fs::path path = folder() / "model.toml";
    std::ofstream(path)
        << "reference_frequency = \"408 MHz\"\n[intensity]\nmap = \"sky.fits\"\n[polarization]\nmap = "
           "\"sky.fits\"\ncolumns = [2, 3]\n[index]\nmap = \"index.fits\"\n[curvature]\nmap = "
           "\"curvature.fits\"\n";
    return path;
}

std::vector<SkyPosition> make_positions() {
    std::vector<SkyPosition> out;
    out.reserve(positions_count);
    for (std::size_t i = 0; i < positions_count; ++i) {
        // Golden-ratio steps: no two neighbours in the list are neighbours on the sky.
        const double turn = std::fmod(static_cast<double>(i) * 0.6180339887498949, 1.0);
        const double height = std::fmod(static_cast<double>(i) * 0.7548776662466927, 1.0);
        out.push_back({360 * turn, std::asin(2 * height - 1) * 57.29577951308232});
    }
    return out;
}

void answer_million(benchmark::State& state) {
    set_thread_count(available_processors());
    const PointSky sky(read_model(make_model_file()), std::nullopt, true);
    const Frequency at = Frequency::from_ghz(22.8);
    const BandSum band = make_band_sum(Response::at(at), ResponseWeights::Temperature, {{}, at, 0, 0});
    const std::vector<SkyPosition> positions = make_positions();
    double sum = 0;
    for (auto _ : state)
        for (std::size_t first = 0; first < positions.size(); first += batch) {
            const std::size_t count = std::min(batch, positions.size() - first);
            PixelGroups groups;
            groups.pixels.resize(count);
            parallel_for_blocks(
                static_cast<std::int64_t>(count), 4096, [&](std::int64_t begin, std::int64_t end) {
                    for (auto i = static_cast<std::size_t>(begin); i < static_cast<std::size_t>(end); ++i)
                        groups.pixels[i] = sky.grid().pixel_at(direction_of(positions[first + i]));
                });
            const SkyStrip strip = sky.evaluate(groups.pixels);
            const GroupedValues rows = take_means(
                make_point_values(strip, sky.reference(), sky.polarized_reference(), band, at), groups);
            sum += rows.values.brightness.back() + rows.values.u.front();
        }
    benchmark::DoNotOptimize(sum);
    state.SetItemsProcessed(state.iterations() * static_cast<std::int64_t>(positions_count));
    fs::remove_all(folder());
}

BENCHMARK(answer_million)
    ->Name("positions/million/foreglow")
    ->Unit(benchmark::kMillisecond)
    ->MeasureProcessCPUTime()
    ->UseRealTime();

}  // namespace
