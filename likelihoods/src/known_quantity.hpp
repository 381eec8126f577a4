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
    /// Unknown.
    explicit Known(std::string_view id) : id_(id) {}
    Known(std::string_view id, const Interval& value, Origin origin)
        : id_(id), value_(value), known_(true), origin_(origin) {}
    Known(const Quantities& quantities, std::string_view id) : id_(id) {
        if (const QuantityValue* quantity = quantities.find(id)) {
            *this = Known(id, quantity->value, quantity->origin);
        }
    }

    std::string_view id() const { return id_; }
    explicit operator bool() const { return known_; }
    const Interval& value() const { return value_; }
    Origin origin() const { return origin_; }
    bool is_point() const { return known_ && value_.is_point(); }
    double point() const { return value_.low; }
    Answer below(double limit) const { return known_ ? is_below(value_, limit) : Answer::unknown; }
    Answer above(double limit) const { return known_ ? is_above(value_, limit) : Answer::unknown; }

    /// `30 mmHg`, `below 22 mmol/L`.
    std::string words() const;
    /// The same, not rounded onto a limit that the value does not meet.
    std::string words_beside(double limit) const;
    /// A limit of this quantity, in the same decimals.
    std::string limit_words(double limit) const;

  private:
    std::string unit_in_words() const;

    std::string_view id_;
    Interval value_;
    bool known_ = false;
    Origin origin_{};
};

}  // namespace steelyard::likelihoods::detail
