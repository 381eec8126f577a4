// SPDX-License-Identifier: Apache-2.0
#pragma once
// Blocks worked on by many threads, with the results used in the order of the blocks: the same whatever the
// number of threads. No more blocks are in memory than there are threads.

#include <condition_variable>
#include <cstdint>
#include <exception>
#include <mutex>
#include <system_error>
#include <thread>
#include <vector>

namespace steelyard::cli {

/// @param next    fills an item, false when there is no more; called by one thread at a time, in order
/// @param work    (worker, item) -> nothing; called by many threads at once, each worker by one at a time
/// @param use     (item); called by one thread at a time, in the order of next()
/// @tparam Item   what is handed along: input and result of one block, reused
/// The first exception of any of them stops all and is thrown again.
template <class Item, class Next, class Work, class Use>
void work_in_order(int threads, const Next& next, const Work& work, const Use& use) {
    std::mutex reading;
    std::mutex ordering;
    std::condition_variable turn_changed;
    std::uint64_t given = 0;
    std::uint64_t turn = 0;
    bool ended = false;
    std::exception_ptr failure;
    const auto fail = [&] {
        const std::lock_guard lock(ordering);
        failure = failure ? failure : std::current_exception();
        turn_changed.notify_all();
    };
    const auto loop = [&](int worker) {
        Item item;
        while (true) {
            std::uint64_t number = 0;
            try {
                {
                    const std::lock_guard lock(reading);
                    if (ended || !next(item)) {
                        ended = true;
                        return;
                    }
                    number = given++;
                }
                work(worker, item);
                std::unique_lock lock(ordering);
                turn_changed.wait(lock, [&] { return turn == number || failure; });
                if (failure) {
                    return;
                }
                use(item);
                ++turn;
                turn_changed.notify_all();
            } catch (...) {
                {
                    const std::lock_guard lock(reading);
                    ended = true;
                }
                fail();
                return;
            }
        }
    };
    {
        std::vector<std::jthread> helpers;
        for (int i = 1; i < threads; ++i) {
            try {
                helpers.emplace_back(loop, i);
            } catch (const std::system_error&) {
                break;  // no more threads to be had: those there are do the work
            }
        }
        loop(0);
    }
    if (failure) {
        std::rethrow_exception(failure);
    }
}

}  // namespace steelyard::cli
