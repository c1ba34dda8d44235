// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>
#include <functional>

namespace foreglow {

/// Sets how many threads later parallel work uses, the transforms included.
/// @param threads  1 or more
void set_thread_count(int threads);

/// Returns how many threads parallel work uses.
[[nodiscard]] int thread_count();

/// Returns how many processors this process may use.
[[nodiscard]] int available_processors();

/// Calls work(begin, end) for the blocks [0, block), [block, 2 block), ... of [0, count), shared among the
/// threads.
///
/// Blocks are the same whatever the number of threads; each is done by one thread, in no fixed order. After
/// an exception later blocks may be left out; the first exception by block order is thrown again once all
/// threads have stopped.
void parallel_for_blocks(std::int64_t count, std::int64_t block,
                         const std::function<void(std::int64_t, std::int64_t)>& work);

/// Sums partial(begin, end) over fixed blocks in block order, so that the result never depends on the number
/// of threads.
[[nodiscard]] double parallel_sum(std::int64_t count, std::int64_t block,
                                  const std::function<double(std::int64_t, std::int64_t)>& partial);

}  // namespace foreglow
