// SPDX-License-Identifier: Apache-2.0
#pragma once
// A line on the terminal that tells how far a long run is; nothing for a short one, nothing where no terminal
// is.

#include <chrono>
#include <iosfwd>
#include <string>

namespace steelyard::cli {

class Progress {
  public:
    /// @param wanted  whether there is a terminal to write on   @param patience  silence before the first
    /// line
    Progress(std::ostream& err, bool wanted, std::chrono::milliseconds patience = std::chrono::seconds(1));
    ~Progress();
    Progress(const Progress&) = delete;
    Progress& operator=(const Progress&) = delete;
    Progress(Progress&&) = delete;
    Progress& operator=(Progress&&) = delete;

    /// @param what  `case 3 of 40`   @param done  of all work, in [0, 1]
    void tell(const std::string& what, double done);

  private:
    using Clock = std::chrono::steady_clock;
    std::ostream& err_;
    bool wanted_;
    Clock::time_point next_;
    bool written_ = false;
};

}  // namespace steelyard::cli
