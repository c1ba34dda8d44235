// SPDX-License-Identifier: GPL-2.0-or-later
// Foreglow's transforms against libsharp called by itself; nside 512, lmax 1024, all threads.
#include <benchmark/benchmark.h>

#include "bare_transforms.h"
#include "sphere/harmonics.h"

namespace {

using namespace foreglow;

constexpr int nside = 512, lmax = 2 * nside;

std::vector<double> make_map() {
    std::vector<double> map(static_cast<std::size_t>(HealpixGrid(nside).npix()));
    for (std::size_t i = 0; i < map.size(); ++i)
        map[i] = static_cast<double>(i % 1013) / 1013 - 0.5;
    return map;
}

Alm make_coefficients() {
    Alm alm(lmax);
    for (std::size_t i = 0; i < alm.values().size(); ++i)
        alm.values()[i] = {static_cast<double>(i % 1013) / 1013 - 0.5,
                           i <= lmax ? 0.0 : static_cast<double>(i % 1009) / 1009};
    return alm;
}

void analysis(benchmark::State& state) {
    const auto map = make_map();
    for (auto _ : state)
        benchmark::DoNotOptimize(analyse(HealpixGrid(nside), map, lmax));
}

void analysis_spin2(benchmark::State& state) {
    const auto map = make_map();
    for (auto _ : state)
        benchmark::DoNotOptimize(analyse_spin2(HealpixGrid(nside), map, map, lmax));
}

void synthesis(benchmark::State& state) {
    const Alm alm = make_coefficients();
    for (auto _ : state)
        benchmark::DoNotOptimize(synthesize(alm, HealpixGrid(nside)));
}

void synthesis_spin2(benchmark::State& state) {
    const AlmEB alm{make_coefficients(), make_coefficients()};
    for (auto _ : state)
        benchmark::DoNotOptimize(synthesize_spin2(alm, HealpixGrid(nside)));
}

template <void (benchmarks::BareTransforms::*call)()>
void bare(benchmark::State& state) {
    benchmarks::BareTransforms transforms(nside, lmax);
    for (auto _ : state)
        (transforms.*call)();
}

BENCHMARK(analysis)->Name("analysis/spin 0/foreglow")->MeasureProcessCPUTime()->UseRealTime();
BENCHMARK(bare<&benchmarks::BareTransforms::analyse>)
    ->Name("analysis/spin 0/bare")
    ->MeasureProcessCPUTime()
    ->UseRealTime();
BENCHMARK(analysis_spin2)->Name("analysis/spin 2/foreglow")->MeasureProcessCPUTime()->UseRealTime();
BENCHMARK(bare<&benchmarks::BareTransforms::analyse_spin2>)
    ->Name("analysis/spin 2/bare")
    ->MeasureProcessCPUTime()
    ->UseRealTime();
BENCHMARK(synthesis)->Name("synthesis/spin 0/foreglow")->MeasureProcessCPUTime()->UseRealTime();
BENCHMARK(bare<&benchmarks::BareTransforms::synthesize>)
    ->Name("synthesis/spin 0/bare")
    ->MeasureProcessCPUTime()
    ->UseRealTime();
BENCHMARK(synthesis_spin2)->Name("synthesis/spin 2/foreglow")->MeasureProcessCPUTime()->UseRealTime();
BENCHMARK(bare<&benchmarks::BareTransforms::synthesize_spin2>)
    ->Name("synthesis/spin 2/bare")
    ->MeasureProcessCPUTime()
    ->UseRealTime();

}  // namespace
