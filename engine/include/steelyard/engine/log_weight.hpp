// SPDX-License-Identifier: Apache-2.0
#pragma once
// A weight of evidence: the logarithm of a likelihood ratio. Kept in nats; said in bits, bans or decibans.
// ln = nats, log2 = bits, log10 = bans, 10 log10 = decibans (Turing's unit; Good 1950, from memory). Only
// arithmetic that means something exists: weights add, a weight is added to log odds, a difference of log
// odds is a weight.

#include <compare>

#include "steelyard/engine/probability.hpp"

namespace steelyard::engine {

inline constexpr double nats_per_bit = 0.693147180559945309417;      ///< ln 2
inline constexpr double nats_per_ban = 2.30258509299404568402;       ///< ln 10
inline constexpr double nats_per_deciban = 0.230258509299404568402;  ///< ln 10 / 10

/// A finite weight of evidence.
///
///     const LogWeight six = LogWeight::of_ratio(2.0);         // a six from the loaded die
///     six.to_decibans();                                      // 3.0103
///     LogOdds::of(Probability::of(0.1)) + six;                // log odds
class LogWeight {
  public:
    /// @param value  [nats], finite   @throws DomainError
    static LogWeight nats(double value);
    /// @param value  [bits], finite   @throws DomainError
    static LogWeight bits(double value);
    /// @param value  [bans], finite   @throws DomainError
    static LogWeight bans(double value);
    /// @param value  [decibans], finite   @throws DomainError
    static LogWeight decibans(double value);
    /// ln(ratio). @param ratio  a likelihood ratio [1], finite, > 0   @throws DomainError
    static LogWeight of_ratio(double ratio);

    constexpr double to_nats() const noexcept { return nats_; }
    constexpr double to_bits() const noexcept { return nats_ / nats_per_bit; }
    constexpr double to_bans() const noexcept { return nats_ / nats_per_ban; }
    constexpr double to_decibans() const noexcept { return nats_ / nats_per_deciban; }
    /// e^x [1]; may be 0 or +infinity.
    double to_ratio() const;

    /// The weight discounted for dependence. @param factor  [1], in [0, 1]   @throws DomainError
    LogWeight discounted(double factor) const;

    constexpr LogWeight operator-() const noexcept { return LogWeight(-nats_); }
    friend constexpr auto operator<=>(LogWeight, LogWeight) = default;

  private:
    explicit constexpr LogWeight(double nats) noexcept : nats_(nats) {}
    double nats_;
};

/// @throws DomainError  when the sum overflows
LogWeight operator+(LogWeight left, LogWeight right);
LogWeight operator-(LogWeight left, LogWeight right);

/// Posterior log odds = prior log odds + weight of evidence. Certainty stays certainty.
LogOdds operator+(LogOdds odds, LogWeight weight);
LogOdds operator-(LogOdds odds, LogWeight weight);

/// The weight that leads from `before` to `after`. @throws DomainError  when either is a certainty
LogWeight operator-(LogOdds after, LogOdds before);

}  // namespace steelyard::engine
