// SPDX-License-Identifier: Apache-2.0
#pragma once
// A quantity of a panel that may be unknown or known only to lie in an interval, as the gate asks about it.

#include <string>
#include <string_view>

#include "decimals.hpp"
#include "steelyard/likelihoods/derived.hpp"

namespace steelyard::likelihoods::detail {

/// A comparison with a censored value may have no answer.
enum class Answer { no, yes, unknown };

/// With the tolerance of band edges, so that the gate and the bands never disagree about one value.
Answer is_below(const Interval& value, double limit);
Answer is_above(const Interval& value, double limit);

/// Every comparison with an unknown quantity is unknown.
class Known {
  public:
    Known(const Quantities& quantities, std::string_view id)
        : id_(id), quantity_(quantities.find(id)), decimals_(decimals_of(id)) {}

    explicit operator bool() const { return quantity_ != nullptr; }
    const Interval& value() const { return quantity_->value; }
    const QuantityValue& quantity() const { return *quantity_; }
    bool is_point() const { return quantity_ != nullptr && quantity_->value.is_point(); }
    double point() const { return quantity_->value.low; }
    Answer below(double limit) const {
        return quantity_ != nullptr ? is_below(quantity_->value, limit) : Answer::unknown;
    }
    Answer above(double limit) const {
        return quantity_ != nullptr ? is_above(quantity_->value, limit) : Answer::unknown;
    }

    /// `30 mmHg`, `below 22 mmol/L`.
    std::string words() const;
    /// The same, not rounded onto a limit that the value does not meet.
    std::string words_beside(double limit) const;
    /// A limit of this quantity, in the same decimals.
    std::string limit_words(double limit) const;

  private:
    std::string_view id_;
    const QuantityValue* quantity_;
    Decimals decimals_;
};

}  // namespace steelyard::likelihoods::detail
