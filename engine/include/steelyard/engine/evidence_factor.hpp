// SPDX-License-Identifier: Apache-2.0
#pragma once
// By what factor a figure of the evidence would have to be wrong for the answer to change. docs/method.md,
// "Rows that could overturn the answer".

#include <Eigen/Core>
#include <optional>
#include <vector>

#include "steelyard/engine/index.hpp"

namespace steelyard::engine {

struct TieFactor {
    double log_factor =
        0.0;           ///< ln of the factor on P(band seen | cause) [nats]; < 0 when the leader takes the row
    CauseIndex rival;  ///< the cause that then ties with the leader
};

/// The factor on one row's probability of the band seen at which another cause ties with the leader:
/// exp(-(score_leader - score_rival) / weight) when the leader takes the row, the rival the best cause that
/// does not; exp(+(score_leader - score_rival) / weight) when it does not, the rival the best cause that
/// does. All else is held fixed, the other bands of the row too, which the case does not read.
///
/// @param log_scores  log posterior weights [nats], up to a constant; shape (K), K >= 2; finite
/// @param takes       which causes take the row; size K
/// @param weight      dependence factor of the finding [1], in (0, 1]
/// @param leader      the cause with the largest score; one that lies behind by a rounding counts as tied,
/// factor 1
/// @returns           empty when all causes take the row or none does: then it decides nothing
/// @throws DomainError
[[nodiscard]] std::optional<TieFactor> factor_to_tie(const Eigen::Ref<const Eigen::ArrayXd>& log_scores,
                                                     const std::vector<bool>& takes, double weight,
                                                     CauseIndex leader);

}  // namespace steelyard::engine
