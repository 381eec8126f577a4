// SPDX-License-Identifier: Apache-2.0
#include "make_posterior.hpp"

#include <boost/multiprecision/cpp_bin_float.hpp>
#include <cmath>
#include <random>
#include <vector>

namespace steelyard::test {
namespace {

using Number = boost::multiprecision::cpp_bin_float_50;

}  // namespace

PosteriorProblem posterior_problem(std::uint64_t index) {
    // The engine of the standard library is the same everywhere; its distributions are not, so the mapping is
    // ours.
    std::mt19937_64 words(20260101U + index);
    const auto uniform = [&words] { return (static_cast<double>(words() >> 11U) + 0.5) * 0x1p-53; };
    const auto causes = static_cast<Eigen::Index>(2 + index % 11);
    const auto findings = static_cast<Eigen::Index>((index / 11) % 41);
    const bool close = index % 3 == 0;
    PosteriorProblem problem;
    problem.log_prior = Eigen::ArrayXd::NullaryExpr(causes, [&] { return std::log(uniform()) * 3.0; });
    problem.weight =
        Eigen::ArrayXd::NullaryExpr(findings, [&] { return uniform() < 0.4 ? 1.0 : 1.0 - uniform(); });
    problem.loglik.resize(findings, causes);
    for (Eigen::Index finding = 0; finding < findings; ++finding) {
        const double depth = uniform() < 0.5 ? 700.0 : 10.0;
        const double common = -depth * uniform();
        for (Eigen::Index cause = 0; cause < causes; ++cause) {
            const double own = close ? common * (1.0 + 1e-3 * (uniform() - 0.5)) : -depth * uniform();
            problem.loglik(finding, cause) = std::fmax(own, -700.0);
        }
    }
    return problem;
}

struct ExactPosterior::Digits {
    std::vector<Number> score;
    Number sum = 0, prior_sum = 0;
};

ExactPosterior::ExactPosterior(const PosteriorProblem& problem) : digits_(std::make_unique<Digits>()) {
    for (Eigen::Index cause = 0; cause < problem.log_prior.size(); ++cause) {
        Number score = problem.log_prior(cause);
        digits_->prior_sum += exp(score);
        for (Eigen::Index finding = 0; finding < problem.weight.size(); ++finding) {
            score += Number(problem.weight(finding)) * Number(problem.loglik(finding, cause));
        }
        digits_->score.push_back(score);
        digits_->sum += exp(score);  // the exponent of a cpp_bin_float_50 does not underflow at e^-28000
    }
}

ExactPosterior::~ExactPosterior() = default;

double ExactPosterior::posterior(Eigen::Index cause) const {
    const Number share = exp(digits_->score[static_cast<std::size_t>(cause)]) / digits_->sum;
    return share < Number("1e-330") ? 0.0 : static_cast<double>(share);
}

double ExactPosterior::log_odds(Eigen::Index a, Eigen::Index b) const {
    return static_cast<double>(
        Number(digits_->score[static_cast<std::size_t>(a)] - digits_->score[static_cast<std::size_t>(b)]));
}

double ExactPosterior::log_posterior(Eigen::Index cause) const {
    return static_cast<double>(Number(digits_->score[static_cast<std::size_t>(cause)] - log(digits_->sum)));
}

double ExactPosterior::log_evidence() const {
    return static_cast<double>(Number(log(digits_->sum) - log(digits_->prior_sum)));
}

double ExactPosterior::odds_error(Eigen::Index a, Eigen::Index b, double found_a, double found_b) const {
    const Number exact = exp(
        Number(digits_->score[static_cast<std::size_t>(a)] - digits_->score[static_cast<std::size_t>(b)]));
    return static_cast<double>(Number(Number(found_a) / Number(found_b) / exact - 1));
}

}  // namespace steelyard::test
