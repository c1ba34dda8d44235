// SPDX-License-Identifier: GPL-2.0-or-later
// One map file of three float32 columns at nside 512 (37.7 MB), written and read by Foreglow, by plain system
// calls, by CFITSIO with whole columns and by the HEALPix C++ library. "disk" is the folder in
// FOREGLOW_BENCHMARK_DISK, where all who can sync the file before it is renamed; "memory" the one in
// FOREGLOW_BENCHMARK_MEMORY. One thread writes (a run writes several files at once), all read.
#include <benchmark/benchmark.h>
#include <fitsio.h>
#include <healpix_map.h>
#include <healpix_map_fitsio.h>
#include <unistd.h>

#include <array>
#include <cstdlib>
#include <stdexcept>

#include "base/parallel.h"
#include "io/fits_map_read.h"
#include "io/fits_map_write.h"
#include "raw_files.h"

namespace {

using namespace foreglow;
namespace fs = std::filesystem;

constexpr int nside = 512;
constexpr std::size_t npix = 12UL * nside * nside;

enum class Place { Disk, Memory };

fs::path folder(Place place) {
    const char* name =
        std::getenv(place == Place::Disk ? "FOREGLOW_BENCHMARK_DISK" : "FOREGLOW_BENCHMARK_MEMORY");
    return name != nullptr ? fs::path(name) : fs::temp_directory_path();
}

const std::array<std::vector<float>, 3>& sky() {
    static const auto maps = [] {
        std::array<std::vector<float>, 3> out;
        for (auto& map : out)
            for (std::size_t i = 0; i < npix; ++i)
                map.push_back(static_cast<float>(i % 1013) * 0.25F - 100.0F);
        return out;
    }();
    return maps;
}

FitsMapLayout layout() {
    FitsMapLayout out;
    out.nside = nside;
    out.convention = PolarizationConvention::Cosmo;
    for (const char* name : {"I_STOKES", "Q_STOKES", "U_STOKES"})
        out.columns.push_back({name, "uK_CMB"});
    return out;
}

class OneThread {
  public:
    OneThread() : before_(thread_count()) { set_thread_count(1); }
    ~OneThread() { set_thread_count(before_); }
    OneThread(const OneThread&) = delete;
    OneThread& operator=(const OneThread&) = delete;

  private:
    int before_;
};

void write_here(const fs::path& path) {
    FitsMapWriter writer(path, layout());
    constexpr std::size_t tile = 1 << 15;
    for (std::size_t first = 0; first < npix; first += tile) {
        const std::size_t count = std::min(tile, npix - first);
        std::array<std::span<const float>, 3> columns;
        for (std::size_t c = 0; c < 3; ++c)
            columns[c] = std::span(sky()[c]).subspan(first, count);
        writer.write_pixels(static_cast<std::int64_t>(first), FitsMapWriter::FloatColumns(columns));
    }
    writer.finish();
}

template <Place place>
void write_foreglow(benchmark::State& state) {
    const OneThread one;
    const auto path = folder(place) / "written.fits";
    write_here(path);
    for (auto _ : state)
        write_here(path);
    state.SetBytesProcessed(state.iterations() * fits_map_file_bytes(layout()));
    fs::remove(path);
}

template <Place place>
void write_raw(benchmark::State& state) {
    const auto path = folder(place) / "raw";
    benchmarks::write_raw_file(path, fits_map_file_bytes(layout()), true);
    for (auto _ : state)
        benchmarks::write_raw_file(path, fits_map_file_bytes(layout()), true);
    state.SetBytesProcessed(state.iterations() * fits_map_file_bytes(layout()));
    fs::remove(path);
}

void write_cfitsio_columns(benchmark::State& state) {
    const auto path = folder(Place::Memory) / "columns.fits";
    for (auto _ : state) {
        fs::remove(path);
        int status = 0;
        fitsfile* file = nullptr;
        char names[3][16] = {"I_STOKES", "Q_STOKES", "U_STOKES"};
        char form[] = "1024E";
        char unit[] = "uK_CMB";
        char* types[] = {names[0], names[1], names[2]};
        char* forms[] = {form, form, form};
        char* units[] = {unit, unit, unit};
        fits_create_diskfile(&file, path.c_str(), &status);
        fits_create_tbl(file, BINARY_TBL, 0, 3, types, forms, units, "xtension", &status);
        for (int c = 0; c < 3; ++c) {
            auto* values = const_cast<float*>(sky()[static_cast<std::size_t>(c)].data());
            fits_write_col(file, TFLOAT, c + 1, 1, 1, static_cast<LONGLONG>(npix), values, &status);
        }
        fits_close_file(file, &status);
        if (status != 0) throw std::runtime_error("CFITSIO cannot write " + path.string());
    }
    fs::remove(path);
}

void write_healpix(benchmark::State& state) {
    const auto path = folder(Place::Memory) / "healpix.fits";
    std::array<Healpix_Map<float>, 3> maps;
    for (std::size_t c = 0; c < 3; ++c) {
        maps[c].SetNside(nside, RING);
        for (std::size_t i = 0; i < npix; ++i)
            maps[c][static_cast<int>(i)] = sky()[c][i];
    }
    for (auto _ : state) {
        fs::remove(path);
        write_Healpix_map_to_fits(path.string(), maps[0], maps[1], maps[2], PLANCK_FLOAT32);
    }
    fs::remove(path);
}

fs::path map_to_read() {
    const auto path = folder(Place::Disk) / "read.fits";
    if (!fs::exists(path)) write_here(path);
    return path;
}

void read_foreglow(benchmark::State& state) {
    FitsMapRequest request;
    request.path = map_to_read();
    request.columns = {1, 2, 3};
    for (auto _ : state)
        benchmark::DoNotOptimize(read_fits_map(request));
    state.SetBytesProcessed(state.iterations() * static_cast<std::int64_t>(fs::file_size(request.path)));
}

void read_raw(benchmark::State& state) {
    const auto path = map_to_read();
    for (auto _ : state)
        benchmark::DoNotOptimize(benchmarks::read_raw_file(path));
    state.SetBytesProcessed(state.iterations() * static_cast<std::int64_t>(fs::file_size(path)));
}

void read_raw_into_old_memory(benchmark::State& state) {
    const auto path = map_to_read();
    std::vector<char> out(fs::file_size(path));
    for (auto _ : state)
        benchmarks::read_raw_file(path, out.data());
    state.SetBytesProcessed(state.iterations() * static_cast<std::int64_t>(fs::file_size(path)));
}

BENCHMARK(write_foreglow<Place::Disk>)->Name("writer/disk/foreglow")->MeasureProcessCPUTime()->UseRealTime();
BENCHMARK(write_raw<Place::Disk>)->Name("writer/disk/bare")->MeasureProcessCPUTime()->UseRealTime();
BENCHMARK(write_foreglow<Place::Memory>)
    ->Name("writer/memory/foreglow")
    ->MeasureProcessCPUTime()
    ->UseRealTime();
BENCHMARK(write_raw<Place::Memory>)->Name("writer/memory/bare")->MeasureProcessCPUTime()->UseRealTime();
BENCHMARK(write_cfitsio_columns)
    ->Name("writer/memory/cfitsio columns")
    ->MeasureProcessCPUTime()
    ->UseRealTime();
BENCHMARK(write_healpix)->Name("writer/memory/healpix")->MeasureProcessCPUTime()->UseRealTime();
BENCHMARK(read_foreglow)->Name("reader/cached/foreglow")->MeasureProcessCPUTime()->UseRealTime();
BENCHMARK(read_raw)->Name("reader/cached/bare")->MeasureProcessCPUTime()->UseRealTime();
BENCHMARK(read_raw_into_old_memory)
    ->Name("reader/cached/bare, old memory")
    ->MeasureProcessCPUTime()
    ->UseRealTime();

}  // namespace
