// SPDX-License-Identifier: GPL-2.0-or-later
#include "estimate/index_maps.h"

#include "base/error.h"
#include "base/parallel.h"
#include "sphere/sky_map.h"

namespace foreglow {
namespace {

constexpr std::int64_t block = 8192;

struct Counts {
    std::array<std::int64_t, index_verdicts> verdicts{};
    std::int64_t in_linear_space = 0, with_fewer_surveys = 0;

    void add(const IndexFit& fit, std::size_t surveys) {
        ++verdicts[static_cast<std::size_t>(fit.verdict)];
        if (fit.verdict != IndexVerdict::Good) return;
        in_linear_space += fit.in_linear_space ? 1 : 0;
        with_fewer_surveys += fit.surveys < surveys ? 1 : 0;
    }
};

void put(IndexMaps& maps, std::size_t pixel, const IndexFit& fit) {
    const bool good = fit.verdict == IndexVerdict::Good;
    const auto value = [good](double v) { return good ? v : undefined_pixel; };
    maps.amplitude[pixel] = value(fit.amplitude);
    maps.amplitude_error[pixel] = value(fit.amplitude_error);
    maps.index[pixel] = value(fit.index);
    maps.index_error[pixel] = value(fit.index_error);
    if (maps.curvature.empty()) return;
    maps.curvature[pixel] = value(fit.curvature);
    maps.curvature_error[pixel] = value(fit.curvature_error);
}

}  // namespace

IndexMaps make_index_maps(const IndexFitSetup& setup, std::span<const SmoothedSurvey> surveys) {
    FOREGLOW_EXPECTS(!surveys.empty());
    const std::size_t pixels = surveys[0].values.size();
    IndexMaps maps;
    for (auto* map : {&maps.amplitude, &maps.amplitude_error, &maps.index, &maps.index_error})
        map->resize(pixels);
    if (setup.curvature)
        for (auto* map : {&maps.curvature, &maps.curvature_error})
            map->resize(pixels);
    const auto count = static_cast<std::int64_t>(pixels);
    std::vector<Counts> counts(static_cast<std::size_t>((count + block - 1) / block));
    parallel_for_blocks(count, block, [&](std::int64_t begin, std::int64_t end) {
        std::vector<double> values(surveys.size()), variances(surveys.size());
        for (auto p = static_cast<std::size_t>(begin); p < static_cast<std::size_t>(end); ++p) {
            for (std::size_t s = 0; s < surveys.size(); ++s) {
                values[s] = surveys[s].values[p];
                variances[s] = surveys[s].variance(p);
            }
            const IndexFit fit = fit_index(setup, values, variances);
            put(maps, p, fit);
            counts[static_cast<std::size_t>(begin / block)].add(fit, surveys.size());
        }
    });
    for (const Counts& one : counts) {
        for (std::size_t v = 0; v < index_verdicts; ++v)
            maps.verdicts[v] += one.verdicts[v];
        maps.in_linear_space += one.in_linear_space;
        maps.with_fewer_surveys += one.with_fewer_surveys;
    }
    return maps;
}

}  // namespace foreglow
