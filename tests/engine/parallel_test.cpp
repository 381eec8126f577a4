// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/parallel.hpp"

#include <gtest/gtest.h>

#include <atomic>
#include <stdexcept>
#include <thread>
#include <vector>

namespace steelyard::test {
namespace {

TEST(RunInParallel, CallsEachJobOnceWhateverTheThreads) {
    for (const int threads : {1, 2, 7, 64}) {
        for (const Eigen::Index count : {0, 1, 5, 1000}) {
            std::vector<std::atomic<int>> called(static_cast<std::size_t>(count));
            engine::run_in_parallel(count, threads,
                                    [&](Eigen::Index job) { ++called[static_cast<std::size_t>(job)]; });
            for (const std::atomic<int>& times : called) {
                EXPECT_EQ(times, 1);
            }
        }
    }
}

TEST(RunInParallel, ThrowsWhatAJobThrows) {
    for (const int threads : {1, 4}) {
        EXPECT_THROW(engine::run_in_parallel(100, threads,
                                             [](Eigen::Index job) {
                                                 if (job == 37) {
                                                     throw std::runtime_error("job 37");
                                                 }
                                             }),
                     std::runtime_error);
    }
}

TEST(RunInParallel, TellsProgressFromTheCallingThread) {
    const std::thread::id caller = std::this_thread::get_id();
    double last = 0.0;
    engine::run_in_parallel(
        50, 3, [](Eigen::Index) {},
        [&](double done) {
            EXPECT_EQ(std::this_thread::get_id(), caller);
            EXPECT_GE(done, last);
            EXPECT_LE(done, 1.0);
            last = done;
        });
}

}  // namespace
}  // namespace steelyard::test
