// SPDX-License-Identifier: GPL-2.0-or-later
#include "base/parallel.h"

#include <gtest/gtest.h>

#include <atomic>
#include <chrono>
#include <cmath>
#include <mutex>
#include <set>
#include <stdexcept>
#include <string>
#include <thread>
#include <vector>

#include "base/error.h"
#include "support/threads.h"

namespace foreglow {
namespace {

using testing::Threads;

TEST(Parallel, BlocksCoverTheRangeOnceWhateverTheThreads) {
    for (const int threads : {1, 2, 5}) {
        const Threads set(threads);
        EXPECT_EQ(thread_count(), threads);
        for (const std::int64_t count : {0, 1, 7, 100, 101}) {
            std::mutex guard;
            std::multiset<std::pair<std::int64_t, std::int64_t>> blocks;
            parallel_for_blocks(count, 10, [&](std::int64_t begin, std::int64_t end) {
                const std::lock_guard lock(guard);
                blocks.emplace(begin, end);
            });
            std::int64_t next = 0;
            for (const auto& [begin, end] : blocks) {
                EXPECT_EQ(begin, next);
                EXPECT_EQ(end, std::min(count, begin + 10));
                next = end;
            }
            EXPECT_EQ(next, count);
        }
    }
}

TEST(Parallel, ReallyUsesItsThreads) {
    const Threads set(2);
    std::atomic<int> inside{0};
    std::atomic<bool> met{false};
    parallel_for_blocks(2, 1, [&](std::int64_t, std::int64_t) {
        ++inside;
        const auto start = std::chrono::steady_clock::now();
        while (!met && std::chrono::steady_clock::now() - start < std::chrono::seconds(20)) {
            if (inside == 2) met = true;
            std::this_thread::yield();
        }
    });
    EXPECT_TRUE(met);
    EXPECT_GE(available_processors(), 1);
}

TEST(Parallel, ThrowsTheFirstExceptionByBlockOrder) {
    for (const int threads : {1, 2, 4}) {
        const Threads set(threads);
        for (int trial = 0; trial < 50; ++trial) {
            try {
                parallel_for_blocks(40, 1, [&](std::int64_t b, std::int64_t) {
                    if (b == 3)
                        std::this_thread::sleep_for(std::chrono::microseconds(200));  // others fail before it
                    if (b >= 3) throw std::runtime_error(std::to_string(b));
                });
                ADD_FAILURE() << "nothing thrown";
            } catch (const std::runtime_error& error) {
                EXPECT_EQ(std::string(error.what()), "3");
            }
        }
    }
}

TEST(Parallel, StopsSoonAfterAFailure) {
    const Threads set(2);
    std::atomic<int> done{0};
    EXPECT_THROW(parallel_for_blocks(100000, 1,
                                     [&](std::int64_t b, std::int64_t) {
                                         ++done;
                                         if (b == 0) throw InputError("x");
                                         std::this_thread::sleep_for(std::chrono::microseconds(10));
                                     }),
                 InputError);
    EXPECT_LT(done, 50000);  // those begun before block 0 failed: a handful, or some more on a busy machine
}

TEST(Parallel, SumsAreTheSameBitForBit) {
    const auto partial = [](std::int64_t begin, std::int64_t end) {
        double sum = 0;
        for (std::int64_t i = begin; i < end; ++i)
            sum += std::sin(static_cast<double>(i)) * 1e10 + 1.0 / (1.0 + static_cast<double>(i));
        return sum;
    };
    double expected = 0;
    for (std::int64_t b = 0; b < 10007; b += 64)
        expected += partial(b, std::min<std::int64_t>(10007, b + 64));
    for (const int threads : {1, 2, 3}) {
        const Threads set(threads);
        EXPECT_EQ(parallel_sum(10007, 64, partial), expected);
    }
    EXPECT_EQ(parallel_sum(0, 64, partial), 0.0);
}

TEST(Parallel, RefusesImpossibleRequests) {
    const auto nothing = [](std::int64_t, std::int64_t) {};
    EXPECT_THROW(parallel_for_blocks(-1, 1, nothing), ContractError);
    EXPECT_THROW(parallel_for_blocks(1, 0, nothing), ContractError);
    EXPECT_THROW(set_thread_count(0), ContractError);
}

}  // namespace
}  // namespace foreglow
