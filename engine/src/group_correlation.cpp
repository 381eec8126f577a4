// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/group_correlation.hpp"

#include <Eigen/Cholesky>
#include <algorithm>
#include <array>
#include <cmath>
#include <cstddef>
#include <limits>
#include <string_view>

#include "exact_sum.hpp"
#include "guards.hpp"
#include "monotone_root.hpp"
#include "steelyard/engine/domain_error.hpp"

namespace steelyard::engine {
namespace {

constexpr double infinity = std::numeric_limits<double>::infinity();
constexpr std::string_view name = "fit_group_correlations";
constexpr double drop = 1.9207294103470620;  // half the 95 % point of chi-square with one degree of freedom

void check_loglik(std::string_view argument, const Eigen::ArrayXXd& loglik, Eigen::Index patterns,
                  Eigen::Index causes) {
    check_size(name, std::string(argument) + " rows", loglik.rows(), patterns);
    check_size(name, std::string(argument) + " columns", loglik.cols(), causes);
    for (Eigen::Index k = 0; k < causes; ++k) {
        for (Eigen::Index g = 0; g < patterns; ++g) {
            if (!(std::isfinite(loglik(g, k)) && loglik(g, k) <= 0.0)) {
                throw DomainError(name, argument, g, k, loglik(g, k), "finite and <= 0");
            }
        }
    }
}

void check_evidence(const GroupedEvidence& evidence) {
    const Eigen::Index patterns = evidence.count.rows();
    const Eigen::Index causes = evidence.count.cols();
    check_size_at_least(name, "count rows", patterns, 1);
    check_size_at_least(name, "count columns", causes, 2);
    check_size(name, "log_prior", evidence.log_prior.size(), causes);
    check_all_between(name, "log_prior", evidence.log_prior, -infinity, infinity);
    check_all_between(name, "count", evidence.count, 0.0, infinity);
    check_positive(name, "count sum", evidence.count.sum());
    check_loglik("ungrouped", evidence.ungrouped, patterns, causes);
    check_size_at_least(name, "groups", static_cast<Eigen::Index>(evidence.groups.size()), 1);
    for (const GroupEvidence& group : evidence.groups) {
        check_loglik("groups loglik", group.loglik, patterns, causes);
        check_size(name, "groups observed", group.observed.size(), patterns);
        for (Eigen::Index g = 0; g < patterns; ++g) {
            const double m = group.observed(g);
            if (!(m >= 0.0 && m <= 1e6 && m == std::floor(m))) {
                throw DomainError(name, "groups observed", g, std::nullopt, m, "whole, >= 0 and at most 1e6");
            }
            if (m == 0.0 && (group.loglik.row(g) != 0.0).any()) {
                throw DomainError(name, "groups loglik", g, std::nullopt, group.loglik.row(g).minCoeff(),
                                  "0 where none was observed");
            }
        }
    }
}

/// The log likelihood of the final causes with its gradient and expected information in the rho of all
/// groups.
struct Likelihood {
    double value = 0.0;
    Eigen::VectorXd gradient;
    Eigen::MatrixXd information;
};

/// The rows in which some rho acts, and what the others add.
class Problem {
  public:
    explicit Problem(const GroupedEvidence& evidence)
        : evidence_(evidence), estimable_(evidence.groups.size(), false) {
        ExactSum fixed;
        for (Eigen::Index g = 0; g < evidence.count.rows(); ++g) {
            if (!(evidence.count.row(g).sum() > 0.0)) {
                continue;
            }
            bool acts = false;
            for (std::size_t h = 0; h < evidence.groups.size(); ++h) {
                const GroupEvidence& group = evidence.groups[h];
                const bool here = group.observed(g) >= 2.0 &&
                                  group.loglik.row(g).maxCoeff() > group.loglik.row(g).minCoeff();
                estimable_[h] = estimable_[h] || here;
                acts = acts || here;
            }
            if (acts) {
                rows_.push_back(g);
            } else {
                fixed.add(row(g, Eigen::VectorXd::Zero(groups()), nullptr));
            }
        }
        fixed_ = fixed.value();
    }

    Eigen::Index groups() const { return static_cast<Eigen::Index>(evidence_.groups.size()); }
    bool estimable(Eigen::Index h) const { return estimable_[static_cast<std::size_t>(h)]; }

    Likelihood at(const Eigen::VectorXd& rho) const {
        Likelihood sum{0.0, Eigen::VectorXd::Zero(groups()), Eigen::MatrixXd::Zero(groups(), groups())};
        ExactSum value(fixed_);
        for (const Eigen::Index g : rows_) {
            value.add(row(g, rho, &sum));
        }
        sum.value = value.value();
        return sum;
    }

    double value(const Eigen::VectorXd& rho) const {
        ExactSum value(fixed_);
        for (const Eigen::Index g : rows_) {
            value.add(row(g, rho, nullptr));
        }
        return value.value();
    }

  private:
    /// Log likelihood of one pattern's patients; derivatives are added to `sum` when it is given.
    double row(Eigen::Index g, const Eigen::VectorXd& rho, Likelihood* sum) const {
        Eigen::ArrayXd score = evidence_.log_prior + evidence_.ungrouped.row(g).transpose();
        for (Eigen::Index h = 0; h < groups(); ++h) {
            const GroupEvidence& group = evidence_.groups[static_cast<std::size_t>(h)];
            score += group.loglik.row(g).transpose() / (1.0 + excess(group, g) * rho(h));
        }
        score -= score.maxCoeff();
        const double log_total = std::log(score.exp().sum());
        const Eigen::ArrayXd count = evidence_.count.row(g).transpose();
        const double patients = count.sum();
        if (sum != nullptr) {
            const Eigen::ArrayXd p = (score - log_total).exp();
            // Row h: how the score of each cause moves with rho_h, from its mean under p.
            Eigen::MatrixXd moves(groups(), score.size());
            for (Eigen::Index h = 0; h < groups(); ++h) {
                const GroupEvidence& group = evidence_.groups[static_cast<std::size_t>(h)];
                const double size = 1.0 + excess(group, g) * rho(h);
                const Eigen::ArrayXd move =
                    group.loglik.row(g).transpose() * (-excess(group, g) / (size * size));
                moves.row(h) = (move - (p * move).sum()).matrix().transpose();
            }
            sum->gradient += moves * count.matrix();
            sum->information += patients * moves * p.matrix().asDiagonal() * moves.transpose();
        }
        return (count * score).sum() - patients * log_total;
    }

    static double excess(const GroupEvidence& group, Eigen::Index g) {
        return std::max(0.0, group.observed(g) - 1.0);
    }

    const GroupedEvidence& evidence_;
    std::vector<bool> estimable_;
    std::vector<Eigen::Index> rows_;
    double fixed_ = 0.0;
};

struct Maximum {
    Eigen::VectorXd rho;
    double value = 0.0;
};

/// Fisher scoring within [0, 1] from `rho`; groups that are not free keep their value. At a border a group
/// rests while the likelihood falls inwards.
Maximum climb(const Problem& problem, Eigen::VectorXd rho, const std::vector<bool>& free) {
    Likelihood here = problem.at(rho);
    for (int steps = 0; steps < 500; ++steps) {
        std::vector<Eigen::Index> moving;
        for (Eigen::Index h = 0; h < rho.size(); ++h) {
            const bool held =
                (rho(h) == 0.0 && here.gradient(h) <= 0.0) || (rho(h) == 1.0 && here.gradient(h) >= 0.0);
            if (free[static_cast<std::size_t>(h)] && !held) {
                moving.push_back(h);
            }
        }
        const auto size = static_cast<Eigen::Index>(moving.size());
        if (size == 0) {
            break;
        }
        Eigen::VectorXd gradient(size);
        Eigen::MatrixXd information(size, size);
        for (Eigen::Index i = 0; i < size; ++i) {
            gradient(i) = here.gradient(moving[static_cast<std::size_t>(i)]);
            for (Eigen::Index j = 0; j < size; ++j) {
                information(i, j) = here.information(moving[static_cast<std::size_t>(i)],
                                                     moving[static_cast<std::size_t>(j)]);
            }
        }
        const Eigen::VectorXd step = Eigen::LDLT<Eigen::MatrixXd>(information).solve(gradient);
        if (!step.allFinite()) {
            break;
        }
        Eigen::VectorXd next = rho;
        double value = here.value;
        double share = 1.0;
        for (; share > 1e-12; share /= 2.0) {
            for (Eigen::Index i = 0; i < size; ++i) {
                const Eigen::Index h = moving[static_cast<std::size_t>(i)];
                next(h) = std::clamp(rho(h) + share * step(i), 0.0, 1.0);
            }
            value = problem.value(next);
            if (value >= here.value) {
                break;
            }
        }
        const double moved = (next - rho).lpNorm<Eigen::Infinity>();
        if (!(value >= here.value) || moved == 0.0) {
            break;
        }
        rho = next;
        here = problem.at(rho);
        if (moved <= 1e-11) {
            break;
        }
    }
    return {rho, here.value};
}

/// A start near the highest point: each group in turn put to the best of a few values, twice over.
Eigen::VectorXd coarse(const Problem& problem, const std::vector<bool>& free) {
    constexpr std::array<double, 6> grid = {0.0, 0.1, 0.25, 0.5, 0.75, 1.0};
    Eigen::VectorXd best = Eigen::VectorXd::Zero(problem.groups());
    double highest = problem.value(best);
    for (int sweep = 0; sweep < 2; ++sweep) {
        for (Eigen::Index h = 0; h < problem.groups(); ++h) {
            for (const double rho : grid) {
                if (free[static_cast<std::size_t>(h)]) {
                    Eigen::VectorXd tried = best;
                    tried(h) = rho;
                    const double value = problem.value(tried);
                    if (value > highest) {
                        highest = value;
                        best = tried;
                    }
                }
            }
        }
    }
    return best;
}

GroupCorrelation profile(const Problem& problem, const Maximum& maximum, Eigen::Index h,
                         std::vector<bool> free) {
    free[static_cast<std::size_t>(h)] = false;
    const auto above = [&](double rho) {
        Eigen::VectorXd start = maximum.rho;
        start(h) = rho;
        return climb(problem, start, free).value - (maximum.value - drop);
    };
    GroupCorrelation result;
    result.rho = maximum.rho(h);
    result.at_lower_border = result.rho == 0.0;
    result.at_upper_border = result.rho == 1.0;
    result.low_open = above(0.0) > 0.0;
    result.high_open = above(1.0) > 0.0;
    result.low = result.low_open
                     ? 0.0
                     : result.rho - detail::root_between([&](double t) { return above(result.rho - t); }, 0.0,
                                                         result.rho);
    result.high = result.high_open ? 1.0 : detail::root_between(above, result.rho, 1.0);
    return result;
}

}  // namespace

GroupCorrelations fit_group_correlations(const GroupedEvidence& evidence) {
    check_evidence(evidence);
    const Problem problem(evidence);
    std::vector<bool> free;
    for (Eigen::Index h = 0; h < problem.groups(); ++h) {
        free.push_back(problem.estimable(h));
    }
    const Maximum maximum = climb(problem, coarse(problem, free), free);
    GroupCorrelations result;
    result.loglik = maximum.value;
    result.loglik_independent = problem.value(Eigen::VectorXd::Zero(problem.groups()));
    for (Eigen::Index h = 0; h < problem.groups(); ++h) {
        result.group.push_back(problem.estimable(h) ? std::optional(profile(problem, maximum, h, free))
                                                    : std::nullopt);
    }
    return result;
}

}  // namespace steelyard::engine
