// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/parallel.hpp"

#include <algorithm>
#include <atomic>
#include <exception>
#include <mutex>
#include <system_error>
#include <thread>
#include <vector>

namespace steelyard::engine {

void run_in_parallel(Eigen::Index count, int threads, const std::function<void(Eigen::Index)>& job,
                     const std::function<void(double done)>& progress) {
    std::atomic<Eigen::Index> next{0};
    std::atomic<Eigen::Index> finished{0};
    std::exception_ptr failure;
    std::mutex failing;
    const auto work = [&](bool reports) {
        for (Eigen::Index at = next++; at < count; at = next++) {
            try {
                job(at);
            } catch (...) {
                const std::lock_guard lock(failing);
                failure = failure ? failure : std::current_exception();
                next = count;
                return;
            }
            ++finished;
            if (reports && progress) {
                progress(static_cast<double>(finished) / static_cast<double>(count));
            }
        }
    };
    {
        std::vector<std::jthread> helpers;
        for (Eigen::Index i = 1; i < std::min<Eigen::Index>(threads, count); ++i) {
            try {
                helpers.emplace_back(work, false);
            } catch (const std::system_error&) {
                break;  // no more threads to be had: those there are do the work
            }
        }
        work(true);
    }
    if (failure) {
        std::rethrow_exception(failure);
    }
}

}  // namespace steelyard::engine
