// SPDX-License-Identifier: Apache-2.0
#pragma once
// Random posterior problems and their answers in 50-digit arithmetic. Kept apart from the engine:
// Boost.Multiprecision's cpp_bin_float_50, sums of exact products, no log-sum-exp, no compensation.

#include <Eigen/Core>
#include <cstdint>
#include <memory>

namespace steelyard::test {

struct PosteriorProblem {
    Eigen::ArrayXd log_prior;  ///< shape (K)
    Eigen::ArrayXXd loglik;    ///< shape (F, K)
    Eigen::ArrayXd weight;     ///< shape (F)
};

/// Problem number `index` of a fixed series: 2 to 12 causes, 0 to 40 findings, log-likelihoods down to -700,
/// weights in (0, 1]. Every third has causes that agree on nearly everything, so that large scores differ by
/// little.
PosteriorProblem posterior_problem(std::uint64_t index);

/// Answers of one problem, computed with 50 digits and rounded once.
class ExactPosterior {
  public:
    explicit ExactPosterior(const PosteriorProblem& problem);
    ~ExactPosterior();
    ExactPosterior(const ExactPosterior&) = delete;
    ExactPosterior& operator=(const ExactPosterior&) = delete;

    double posterior(Eigen::Index cause) const;  ///< may round to 0
    double log_odds(Eigen::Index a, Eigen::Index b) const;
    double log_posterior(Eigen::Index cause) const;
    double log_evidence() const;
    /// found / (exact posterior odds of a to b) - 1
    double odds_error(Eigen::Index a, Eigen::Index b, double found_a, double found_b) const;

  private:
    struct Digits;
    std::unique_ptr<Digits> digits_;
};

}  // namespace steelyard::test
