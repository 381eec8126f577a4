// SPDX-License-Identifier: Apache-2.0
#pragma once
// The law of the number of successes in independent trials of unequal probability (Poisson-binomial), by
// adding one kind of trial after the other.

#include <vector>

namespace steelyard::engine {

/// Starts at no trial: 0 successes for certain. Outcomes under 1e-17 at either end are dropped.
class SuccessLaw {
  public:
    /// @param trials  whole, >= 0   @param p  in [0, 1]; trials p (1 - p) at most a few hundred
    void add_trials(double trials, double p);

    double first() const { return first_; }                    ///< smallest outcome kept
    const std::vector<double>& mass() const { return mass_; }  ///< probabilities of first(), first() + 1, ...

  private:
    double first_ = 0.0;
    std::vector<double> mass_{1.0};
};

}  // namespace steelyard::engine
