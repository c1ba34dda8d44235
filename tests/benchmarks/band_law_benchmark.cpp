// SPDX-License-Identifier: GPL-2.0-or-later
// The spectral law of one channel against a triad a = b + s c over arrays of the same lengths: both read two
// numbers a pixel and write one. "memory" arrays (400 MB together) pass the caches of common machines; "tile"
// arrays stay in the first level.
#include <benchmark/benchmark.h>

#include <vector>

#include "physics/band_law.h"

namespace {

using namespace foreglow;

struct Arrays {
    explicit Arrays(std::size_t n) : index(n), curvature(n), out(n) {
        for (std::size_t i = 0; i < n; ++i) {
            index[i] = -2.8 + 0.3 * static_cast<double>(i % 1013) / 1013;
            curvature[i] = -0.05 + 0.04 * static_cast<double>(i % 1009) / 1009;
        }
    }
    std::vector<double> index, curvature, out;
};

BandLaw make_law() {
    const auto response = Response::flat(Frequency::from_ghz(87.5), Frequency::from_ghz(112.5));
    const auto unit = find_brightness_unit("uK_CMB");
    const auto band =
        make_band_sum(response, ResponseWeights::Temperature, {*unit, Frequency::from_ghz(100)});
    return {band, Frequency::from_ghz(23), {-2.85, -2.45, -0.055, -0.005}, 1e-6};
}

void band_law(benchmark::State& state) {
    Arrays arrays(static_cast<std::size_t>(state.range(0)));
    const BandLaw law = make_law();
    for (auto _ : state) {
        law.evaluate(arrays.index, arrays.curvature, arrays.out);
        benchmark::ClobberMemory();
    }
    state.SetItemsProcessed(state.iterations() * state.range(0));
}

void triad(benchmark::State& state) {
    Arrays arrays(static_cast<std::size_t>(state.range(0)));
    const double* b = arrays.index.data();
    const double* c = arrays.curvature.data();
    double* a = arrays.out.data();
    for (auto _ : state) {
        for (std::size_t i = 0; i < arrays.out.size(); ++i)
            a[i] = b[i] + 3.0 * c[i];
        benchmark::ClobberMemory();
    }
    state.SetItemsProcessed(state.iterations() * state.range(0));
}

BENCHMARK(band_law)->Name("law/memory/foreglow")->Arg(1 << 24)->MeasureProcessCPUTime()->UseRealTime();
BENCHMARK(triad)->Name("law/memory/bare")->Arg(1 << 24)->MeasureProcessCPUTime()->UseRealTime();
BENCHMARK(band_law)->Name("law/tile/foreglow")->Arg(1 << 10)->MeasureProcessCPUTime()->UseRealTime();
BENCHMARK(triad)->Name("law/tile/bare")->Arg(1 << 10)->MeasureProcessCPUTime()->UseRealTime();

}  // namespace
