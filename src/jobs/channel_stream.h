// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <algorithm>
#include <array>
#include <cstdint>
#include <memory>
#include <span>
#include <vector>

#include "base/interrupt.h"
#include "base/parallel.h"
#include "jobs/map_pieces.h"

namespace foreglow {

/// The columns of one piece.
class PieceBuffer {
  public:
    PieceBuffer(std::size_t columns, std::size_t size)
        : values_(std::make_unique_for_overwrite<double[]>(columns * size)), count_(columns) {
        for (std::size_t c = 0; c < columns; ++c)
            columns_[c] = std::span(values_.get() + c * size, size);
    }
    [[nodiscard]] std::span<const std::span<double>> columns() const { return {columns_.data(), count_}; }

  private:
    std::unique_ptr<double[]> values_;
    std::array<std::span<double>, 3> columns_;
    std::size_t count_;
};

/// Makes channels first to first + count of a route strip by strip and piece by piece: work(channel's place
/// in the group, piece, columns, statistics) runs in threads; after(channel's place, statistics) follows in a
/// fixed order after each strip.
///
/// A thread does one piece for several channels, so that what the piece is made of stays in the cache.
/// @param route  has strip_pixels(), make_strip(strip, first, count) and make_pixels(strip, channel, begin,
/// end, columns)
/// @param columns  1 or 3
template <class Route, class Work, class After>
void stream_channels(const HealpixGrid& grid, const Route& route, std::size_t columns, std::size_t first,
                     std::size_t count, const Work& work, const After& after) {
    constexpr std::size_t batch_size = 8;
    const std::size_t batches = (count + batch_size - 1) / batch_size;
    for (const RingStrip& strip : cut_into_strips(grid, route.strip_pixels())) {
        check_interrupt();
        const auto values = route.make_strip(strip, first, count);
        const auto pieces = cut_into_pieces(grid, strip);
        std::vector<StokesStatistics> statistics(count * pieces.size());  // [pieces][count]
        const auto tasks = static_cast<std::int64_t>(pieces.size() * batches);
        parallel_for_blocks(tasks, 1, [&](std::int64_t task, std::int64_t) {
            const std::size_t p = static_cast<std::size_t>(task) / batches;
            const std::size_t begin = static_cast<std::size_t>(task) % batches * batch_size;
            const PieceBuffer buffer(columns, pieces[p].size());
            for (std::size_t k = begin; k < std::min(count, begin + batch_size); ++k) {
                route.make_pixels(values, first + k, pieces[p].begin, pieces[p].end, buffer.columns());
                work(k, pieces[p], buffer.columns(), statistics[p * count + k]);
            }
        });
        for (std::size_t t = 0; t < statistics.size(); ++t)
            after(t % count, statistics[t]);
    }
}

}  // namespace foreglow
