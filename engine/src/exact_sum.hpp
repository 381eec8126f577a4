// SPDX-License-Identifier: Apache-2.0
#pragma once
// A running sum of doubles and of products of doubles that keeps the rounding error of every step: twice the
// digits of a double. Needs arithmetic as written: the engine is compiled with -ffp-contract=off and without
// -ffast-math.

#include <cmath>

namespace steelyard::engine {

/// high + low, where |low| is small beside the largest partial sum.
class ExactSum {
  public:
    explicit ExactSum(double start = 0.0) noexcept : high_(start) {}

    void add(double x) noexcept {
        const double sum = high_ + x;
        // Knuth's two-sum: the error of an addition is itself a double, whichever term is the larger.
        const double part = sum - high_;
        low_ += (high_ - (sum - part)) + (x - part);
        high_ = sum;
    }

    void add_product(double x, double y) noexcept {
        const double product = x * y;
        add(product);
        low_ += std::fma(x, y, -product);
    }

    /// Rounded once. An overflow shows as an infinity.
    double value() const noexcept { return std::isfinite(high_) ? high_ + low_ : high_; }

    /// this - other, rounded once: the leading digits that the two share cancel exactly.
    double minus(const ExactSum& other) const noexcept {
        const double difference = high_ - other.high_;
        if (!std::isfinite(difference)) {
            return difference;
        }
        const double part = difference - high_;
        const double error = (high_ - (difference - part)) - (other.high_ + part);
        return difference + (error + (low_ - other.low_));
    }

  private:
    double high_;
    double low_ = 0.0;
};

}  // namespace steelyard::engine
