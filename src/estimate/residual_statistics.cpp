// SPDX-License-Identifier: GPL-2.0-or-later
#include "estimate/residual_statistics.h"

#include <algorithm>
#include <cmath>

#include "base/constants.h"
#include "base/error.h"
#include "base/parallel.h"
#include "sphere/converged_analysis.h"
#include "sphere/power_spectrum.h"
#include "sphere/sky_map.h"

namespace foreglow {
namespace {

bool counts(const PixelSelection& selection, std::span<const double> values, std::size_t pixel) {
    return (selection.empty() || selection[pixel] != 0) && is_defined(values[pixel]);
}

std::vector<double> selected_values(std::span<const double> values, const PixelSelection& selection) {
    std::vector<double> out;
    out.reserve(values.size());
    for (std::size_t p = 0; p < values.size(); ++p)
        if (counts(selection, values, p)) out.push_back(values[p]);
    return out;
}

// Linear between the nearest ranks; changes the order of the values.
double quantile(std::vector<double>& values, double share) {
    const double rank = share * static_cast<double>(values.size() - 1);
    const auto low = static_cast<std::ptrdiff_t>(std::floor(rank));
    std::nth_element(values.begin(), values.begin() + low, values.end());
    const double below = values[static_cast<std::size_t>(low)];
    const double part = rank - static_cast<double>(low);
    if (part == 0) return below;
    const double above = *std::min_element(values.begin() + low + 1, values.end());
    return below + part * (above - below);
}

}  // namespace

PixelSelection select_latitudes(const HealpixGrid& grid, Frame frame, double cut_degrees) {
    if (cut_degrees <= 0) return {};
    const Matrix3 turn = rotation_between(frame, Frame::Galactic);
    const double lowest = std::sin(cut_degrees * constants::pi / 180);
    PixelSelection out(static_cast<std::size_t>(grid.npix()));
    parallel_for_blocks(grid.npix(), 65536, [&](std::int64_t begin, std::int64_t end) {
        std::vector<Vector3> directions(static_cast<std::size_t>(end - begin));
        grid.directions(begin, directions);
        for (std::size_t i = 0; i < directions.size(); ++i)
            out[static_cast<std::size_t>(begin) + i] =
                std::abs(rotate(turn, directions[i])[2]) >= lowest ? 1 : 0;
    });
    return out;
}

ResidualStatistics make_residual_statistics(std::span<const double> values, const PixelSelection& selection) {
    FOREGLOW_EXPECTS(selection.empty() || selection.size() == values.size());
    std::vector<double> chosen = selected_values(values, selection);
    ResidualStatistics out;
    out.pixels = static_cast<std::int64_t>(chosen.size());
    if (chosen.empty()) return out;
    const auto sum_of = [&](const auto& term) {
        return parallel_sum(out.pixels, 65536, [&](std::int64_t begin, std::int64_t end) {
            double sum = 0;
            for (auto i = static_cast<std::size_t>(begin); i < static_cast<std::size_t>(end); ++i)
                sum += term(chosen[i]);
            return sum;
        });
    };
    const auto n = static_cast<double>(chosen.size());
    out.mean = sum_of([](double v) { return v; }) / n;
    out.rms = std::sqrt(sum_of([](double v) { return v * v; }) / n);
    out.p5 = quantile(chosen, 0.05);
    out.p50 = quantile(chosen, 0.5);
    out.p95 = quantile(chosen, 0.95);
    for (double& value : chosen)
        value = std::abs(value);
    out.p95_of_size = quantile(chosen, 0.95);
    return out;
}

MaskedSpectra::MaskedSpectra(const HealpixGrid& grid, int lmax)
    : grid_(grid),
      lmax_(lmax),
      weights_(make_ring_weights(grid.nside(), std::min(2 * lmax, 3 * grid.nside()))) {}

std::vector<double> MaskedSpectra::of(std::span<const double> values, const PixelSelection& selection) const {
    std::vector<double> map(values.begin(), values.end());
    double sum = 0, count = 0;
    for (std::size_t p = 0; p < map.size(); ++p)
        if (counts(selection, values, p)) {
            sum += map[p];
            ++count;
        }
    if (count == 0) return std::vector<double>(static_cast<std::size_t>(lmax_) + 1);
    for (std::size_t p = 0; p < map.size(); ++p)
        map[p] = counts(selection, values, p) ? map[p] - sum / count : 0.0;
    ConvergenceOptions options;
    options.tolerance = 0;
    options.max_iterations = 1;
    options.start_weights = &weights_;
    std::vector<double> cl = power_spectrum(analyse_converged(grid_, map, lmax_, options).alm);
    for (double& value : cl)
        value *= static_cast<double>(grid_.npix()) / count;
    return cl;
}

std::vector<LBand> make_l_bands(int lmax) {
    std::vector<LBand> bands;
    int low = 2;
    for (int ten = 10; low <= lmax; ten *= 10)
        for (const int high : {ten, 3 * ten}) {
            if (low > lmax) break;
            bands.push_back({low, std::min(high, lmax)});
            low = high + 1;
        }
    return bands;
}

double rms_in_band(std::span<const double> cl, const LBand& band) {
    double sum = 0;
    for (int l = band.low; l <= band.high && l < static_cast<int>(cl.size()); ++l)
        sum += (2.0 * l + 1) * cl[static_cast<std::size_t>(l)];
    return std::sqrt(sum / (4 * constants::pi));
}

}  // namespace foreglow
