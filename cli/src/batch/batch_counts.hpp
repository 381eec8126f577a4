// SPDX-License-Identifier: Apache-2.0
#pragma once
// What became of the rows of a run. The numbers add up: read = weighed + out of scope + set aside.

#include <cstdint>
#include <string>

#include "../progress.hpp"

namespace steelyard::cli {

struct BatchCounts {
    std::uint64_t weighed = 0, out_of_scope = 0, set_aside = 0;

    std::uint64_t read() const noexcept { return weighed + out_of_scope + set_aside; }
    BatchCounts& operator+=(const BatchCounts& other) noexcept;
    /// `1,000 rows read: 950 weighed, 40 out of scope, 10 set aside`.
    std::string in_words() const;
};

/// A whole number with its thousands parted.
std::string counted(std::uint64_t number);

/// Tells on a terminal how far a run over rows is: their number, how many a second, the time left.
class RowProgress {
  public:
    RowProgress(std::ostream& err, bool terminal);
    /// @param done  share of the bytes taken; 0 when not known
    void tell(std::uint64_t rows, double done);

  private:
    using Clock = std::chrono::steady_clock;
    Progress progress_;
    Clock::time_point start_ = Clock::now();
};

}  // namespace steelyard::cli
