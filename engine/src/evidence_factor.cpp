// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/evidence_factor.hpp"

#include <algorithm>
#include <limits>

#include "guards.hpp"
#include "steelyard/engine/domain_error.hpp"

namespace steelyard::engine {

std::optional<TieFactor> factor_to_tie(const Eigen::Ref<const Eigen::ArrayXd>& log_scores,
                                       const std::vector<bool>& takes, double weight, CauseIndex leader) {
    constexpr const char* function = "factor_to_tie";
    constexpr double infinity = std::numeric_limits<double>::infinity();
    check_size_at_least(function, "log_scores", log_scores.size(), 2);
    check_all_between(function, "log_scores", log_scores, -infinity, infinity);
    check_size(function, "takes", static_cast<Eigen::Index>(takes.size()), log_scores.size());
    check_index(function, "leader", leader.value, log_scores.size());
    if (!(weight > 0.0 && weight <= 1.0)) {
        throw DomainError(function, "weight", std::nullopt, std::nullopt, weight, "in (0, 1]");
    }
    const bool leader_takes = takes[static_cast<std::size_t>(leader.value)];
    std::optional<CauseIndex> rival;
    for (Eigen::Index k = 0; k < log_scores.size(); ++k) {
        const bool parted = takes[static_cast<std::size_t>(k)] != leader_takes;
        if (parted && (!rival || log_scores(k) > log_scores(rival->value))) {
            rival = CauseIndex{k};
        }
    }
    if (!rival) {
        return std::nullopt;
    }
    const double gap = std::max(0.0, log_scores(leader.value) - log_scores(rival->value)) / weight;
    return TieFactor{leader_takes ? -gap : gap, *rival};
}

}  // namespace steelyard::engine
