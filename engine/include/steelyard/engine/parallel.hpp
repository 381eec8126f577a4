// SPDX-License-Identifier: Apache-2.0
#pragma once
// Jobs that do not depend on each other, on several threads.

#include <Eigen/Core>
#include <functional>

namespace steelyard::engine {

/// Calls job(0) ... job(count - 1), each once, in any order and on up to `threads` threads, the calling one
/// among them. What a job throws is thrown again here, the others unfinished. `progress` is called from the
/// calling thread only.
void run_in_parallel(Eigen::Index count, int threads, const std::function<void(Eigen::Index)>& job,
                     const std::function<void(double done)>& progress = {});

}  // namespace steelyard::engine
