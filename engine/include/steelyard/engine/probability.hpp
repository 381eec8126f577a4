// SPDX-License-Identifier: Apache-2.0
#pragma once
// A probability and a log odds as values that are valid whenever they exist. log odds = ln(p / (1 - p)), the
// scale on which evidence adds (I. J. Good, Probability and the Weighing of Evidence, 1950; from memory).
// Arithmetic with weights of evidence is in log_weight.hpp; nothing adds to a Probability.

#include <compare>

namespace steelyard::engine {

/// A number in [0, 1].
///
///     const Probability prior = Probability::of(0.36);
///     const Probability after = (LogOdds::of(prior) + LogWeight::of_ratio(41.47)).to_probability();
class Probability {
  public:
    /// @param value  [1], in [0, 1]   @throws DomainError
    static Probability of(double value);

    constexpr double value() const noexcept { return value_; }
    /// 1 - p. Near p = 0 this rounds to 1; LogOdds keeps both ends.
    constexpr Probability complement() const noexcept { return Probability(1.0 - value_); }

    friend constexpr auto operator<=>(Probability, Probability) = default;

  private:
    explicit constexpr Probability(double value) noexcept : value_(value) {}
    double value_;
};

/// The natural logarithm of odds. -infinity and +infinity stand for probability 0 and 1; NaN cannot occur.
class LogOdds {
  public:
    /// @param value  [nats], not NaN   @throws DomainError
    static LogOdds nats(double value);
    /// ln(p / (1 - p)), to a few units in the last place. @returns -infinity for 0, +infinity for 1
    static LogOdds of(Probability probability);
    /// ln(odds). @param odds  [1], >= 0, finite; written 1:3 they are 1/3   @throws DomainError
    static LogOdds of_odds(double odds);

    constexpr double to_nats() const noexcept { return nats_; }
    /// 1 / (1 + e^-x), evaluated on the side where nothing overflows.
    Probability to_probability() const;
    /// e^x [1]; may be +infinity.
    double to_odds() const;
    /// The log odds of the opposite: exact, where 1 - p would round.
    constexpr LogOdds complement() const noexcept { return LogOdds(-nats_); }

    friend constexpr auto operator<=>(LogOdds, LogOdds) = default;

  private:
    explicit constexpr LogOdds(double nats) noexcept : nats_(nats) {}
    double nats_;
};

}  // namespace steelyard::engine
