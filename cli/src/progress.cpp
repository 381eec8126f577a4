// SPDX-License-Identifier: Apache-2.0
#include "progress.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <ostream>

namespace steelyard::cli {

Progress::Progress(std::ostream& err, bool wanted, std::chrono::milliseconds patience)
    : err_(err), wanted_(wanted), next_(Clock::now() + patience) {}

Progress::~Progress() {
    if (written_) {
        err_ << "\r\x1b[K" << std::flush;
    }
}

void Progress::tell(const std::string& what, double done) {
    if (!wanted_ || Clock::now() < next_) {
        return;
    }
    constexpr int width = 30;
    const auto filled = static_cast<std::size_t>(std::lround(width * std::clamp(done, 0.0, 1.0)));
    err_ << fmt::format("\r[{}{}] {:3.0f} % {}\x1b[K", std::string(filled, '#'),
                        std::string(width - filled, ' '), 100.0 * std::clamp(done, 0.0, 1.0), what)
         << std::flush;
    written_ = true;
    next_ = Clock::now() + std::chrono::milliseconds(100);
}

}  // namespace steelyard::cli
