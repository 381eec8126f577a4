// SPDX-License-Identifier: Apache-2.0
#pragma once
// Small uncertain problems for tests.

#include <Eigen/Core>
#include <cmath>
#include <vector>

#include "steelyard/engine/posterior_spread.hpp"

namespace steelyard::test {

/// Priors that are known, in any scale.
inline engine::UncertainProblem known_priors(const std::vector<double>& weights) {
    engine::UncertainProblem problem;
    for (const double weight : weights) {
        problem.priors.push_back({std::log(weight), engine::KnownPrior{}, 0});
    }
    problem.row_of.resize(0, static_cast<Eigen::Index>(weights.size()));
    return problem;
}

/// Adds a finding with one row a cause, each read at `cell`.
inline void add_finding(engine::UncertainProblem& problem, const std::vector<engine::CompiledRow>& rows,
                        Eigen::Index cell, double weight = 1.0) {
    const Eigen::Index finding = problem.row_of.rows();
    problem.row_of.conservativeResize(finding + 1, Eigen::NoChange);
    problem.weight.conservativeResize(finding + 1);
    problem.weight(finding) = weight;
    for (std::size_t k = 0; k < rows.size(); ++k) {
        engine::UncertainRow row;
        row.law = rows[k].law;
        row.cells = {cell};
        row.log_share = std::log(rows[k].probability(cell));
        row.stream = static_cast<std::uint32_t>(problem.rows.size());
        problem.row_of(finding, static_cast<Eigen::Index>(k)) = static_cast<int>(problem.rows.size());
        problem.rows.push_back(row);
    }
}

/// All draws 0 to count - 1.
inline Eigen::ArrayXXd all_draws(const engine::UncertainPosterior& posterior, std::uint64_t seed,
                                 Eigen::Index count) {
    Eigen::ArrayXXd all(count, posterior.causes());
    for (Eigen::Index first = 0; first < count; first += engine::UncertainPosterior::block) {
        const Eigen::Index here = std::min(engine::UncertainPosterior::block, count - first);
        all.middleRows(first, here) = posterior.draw(seed, static_cast<std::uint64_t>(first), here);
    }
    return all;
}

}  // namespace steelyard::test
