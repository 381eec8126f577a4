// SPDX-License-Identifier: Apache-2.0
#include "batch_counts.hpp"

#include <fmt/format.h>

namespace steelyard::cli {

BatchCounts& BatchCounts::operator+=(const BatchCounts& other) noexcept {
    weighed += other.weighed;
    out_of_scope += other.out_of_scope;
    set_aside += other.set_aside;
    return *this;
}

std::string counted(std::uint64_t number) {
    std::string text = fmt::format("{}", number);
    for (std::size_t at = text.size(); at > 3; at -= 3) {
        text.insert(at - 3, ",");
    }
    return text;
}

std::string BatchCounts::in_words() const {
    return fmt::format("{} row{} read: {} weighed, {} out of scope, {} set aside", counted(read()),
                       read() == 1 ? "" : "s", counted(weighed), counted(out_of_scope), counted(set_aside));
}

RowProgress::RowProgress(std::ostream& err, bool terminal) : progress_(err, terminal) {}

void RowProgress::tell(std::uint64_t rows, double done) {
    const double seconds = std::chrono::duration<double>(Clock::now() - start_).count();
    const double rate = static_cast<double>(rows) / std::max(seconds, 1e-9);
    std::string what =
        fmt::format("{} rows, {} a second", counted(rows), counted(static_cast<std::uint64_t>(rate)));
    if (done > 0.0) {
        what += fmt::format(", {:.0f} s left", seconds * (1.0 - done) / done);
    }
    progress_.tell(what, done);
}

}  // namespace steelyard::cli
