// SPDX-License-Identifier: Apache-2.0
#include "success_law.hpp"

#include <algorithm>
#include <cmath>
#include <cstddef>
#include <utility>

namespace steelyard::engine {
namespace {

constexpr double least = 1e-17;

/// P(0), P(1), ... successes of equal trials with p <= 1/2, up to where they are under `least` for good.
std::vector<double> binomial_mass(double trials, double p) {
    double term = std::exp(trials * std::log1p(-p));
    std::vector<double> mass{term};
    for (double x = 1.0; x <= trials; ++x) {
        term *= (trials - x + 1.0) / x * (p / (1.0 - p));
        if (term < least && x > trials * p) {
            break;
        }
        mass.push_back(term);
    }
    return mass;
}

/// Drops what is under `least` at both ends. @returns how many at the lower end
std::size_t trim(std::vector<double>& mass) {
    while (mass.size() > 1 && mass.back() < least) {
        mass.pop_back();
    }
    const auto kept = std::find_if(mass.begin(), mass.end(), [](double x) { return x >= least; });
    const auto dropped = static_cast<std::size_t>(kept - mass.begin());
    mass.erase(mass.begin(), kept);
    return dropped;
}

}  // namespace

void SuccessLaw::add_trials(double trials, double p) {
    std::vector<double> added;
    if (p <= 0.5) {
        added = binomial_mass(trials, p);
    } else {  // failures are the rare ones; outcomes run from all successes down
        added = binomial_mass(trials, 1.0 - p);
        std::reverse(added.begin(), added.end());
        first_ += trials - static_cast<double>(added.size() - 1);
    }
    std::vector<double> sum(mass_.size() + added.size() - 1, 0.0);
    for (std::size_t j = 0; j < added.size(); ++j) {
        for (std::size_t i = 0; i < mass_.size(); ++i) {
            sum[i + j] += mass_[i] * added[j];
        }
    }
    first_ += static_cast<double>(trim(sum));
    mass_ = std::move(sum);
}

}  // namespace steelyard::engine
