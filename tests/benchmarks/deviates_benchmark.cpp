// SPDX-License-Identifier: GPL-2.0-or-later
// Normal deviates against the libm Box-Muller of the same number of deviates fed by a sequential generator,
// one thread.
#include <benchmark/benchmark.h>

#include <cmath>
#include <cstdint>
#include <vector>

#include "base/random.h"

namespace {

constexpr std::uint32_t pairs = 1 << 16;

void counter_based(benchmark::State& state) {
    std::vector<double> out(2UL * pairs);
    std::uint32_t round = 0;
    for (auto _ : state) {
        const foreglow::RandomKey key{20260101, 0, round++};
        for (std::uint32_t i = 0; i < pairs; ++i) {
            const auto two = foreglow::normal_pair(key, i, 0);
            out[2UL * i] = two[0];
            out[2UL * i + 1] = two[1];
        }
        benchmark::ClobberMemory();
    }
    state.SetItemsProcessed(state.iterations() * 2 * pairs);
}

/// SplitMix64 (Steele, Lea, Flood 2014): a few cycles a number, so that the mathematical functions are what
/// is timed.
std::uint64_t next_word(std::uint64_t& counter) {
    std::uint64_t z = (counter += 0x9e3779b97f4a7c15U);
    z = (z ^ (z >> 30)) * 0xbf58476d1ce4e5b9U;
    z = (z ^ (z >> 27)) * 0x94d049bb133111ebU;
    return z ^ (z >> 31);
}

void libm_box_muller(benchmark::State& state) {
    std::vector<double> out(2UL * pairs);
    std::uint64_t counter = 20260101;
    for (auto _ : state) {
        for (std::uint32_t i = 0; i < pairs; ++i) {
            const double u = (static_cast<double>(next_word(counter) >> 11) + 1.0) * 0x1p-53;
            const double angle = static_cast<double>(next_word(counter) >> 11) * 0x1p-53 * 2.0 * M_PI;
            const double radius = std::sqrt(-2.0 * std::log(u));
            out[2UL * i] = radius * std::cos(angle);
            out[2UL * i + 1] = radius * std::sin(angle);
        }
        benchmark::ClobberMemory();
    }
    state.SetItemsProcessed(state.iterations() * 2 * pairs);
}

BENCHMARK(counter_based)->Name("deviates/normal/foreglow")->MeasureProcessCPUTime()->UseRealTime();
BENCHMARK(libm_box_muller)->Name("deviates/normal/bare")->MeasureProcessCPUTime()->UseRealTime();

}  // namespace
