// SPDX-License-Identifier: GPL-2.0-or-later
#include "base/parallel.h"

#include <omp.h>

#include <algorithm>
#include <atomic>
#include <exception>
#include <limits>
#include <mutex>
#include <vector>

#include "base/error.h"

namespace foreglow {

void set_thread_count(int threads) {
    FOREGLOW_EXPECTS(threads >= 1);
    omp_set_dynamic(0);
    omp_set_num_threads(threads);
}

int thread_count() {
    return omp_get_max_threads();
}

int available_processors() {
    return omp_get_num_procs();
}

void parallel_for_blocks(std::int64_t count, std::int64_t block,
                         const std::function<void(std::int64_t, std::int64_t)>& work) {
    FOREGLOW_EXPECTS(count >= 0 && block >= 1);
    const std::int64_t blocks = (count + block - 1) / block;
    // Blocks before the first failed one are still done: one of them may fail as well, and then it is the
    // first.
    std::atomic<std::int64_t> failed_block{std::numeric_limits<std::int64_t>::max()};
    std::mutex guard;
    std::exception_ptr failure;
#pragma omp parallel for schedule(dynamic, 1) if (blocks > 1)
    for (std::int64_t b = 0; b < blocks; ++b) {
        if (b > failed_block.load(std::memory_order_relaxed)) continue;
        try {
            work(b * block, std::min(count, (b + 1) * block));
        } catch (...) {
            const std::lock_guard lock(guard);
            if (b < failed_block.load(std::memory_order_relaxed)) {
                failed_block.store(b, std::memory_order_relaxed);
                failure = std::current_exception();
            }
        }
    }
    if (failure) std::rethrow_exception(failure);
}

double parallel_sum(std::int64_t count, std::int64_t block,
                    const std::function<double(std::int64_t, std::int64_t)>& partial) {
    FOREGLOW_EXPECTS(count >= 0 && block >= 1);
    std::vector<double> sums(static_cast<std::size_t>((count + block - 1) / block));
    parallel_for_blocks(count, block, [&](std::int64_t begin, std::int64_t end) {
        sums[static_cast<std::size_t>(begin / block)] = partial(begin, end);
    });
    double total = 0;
    for (const double sum : sums)
        total += sum;
    return total;
}

}  // namespace foreglow
