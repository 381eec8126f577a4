// SPDX-License-Identifier: Apache-2.0
#pragma once
// How good forecasts are in one number, by the two proper scores in use: a forecaster does best by saying
// what he believes. Brier, Mon Weather Rev 1950;78:1, and Good, JRSS B 1952;14:107 (both from memory).
// docs/method.md, "Audit".

#include "steelyard/engine/audit_sample.hpp"

namespace steelyard::engine {

/// Lower is better in all but the skills.
struct ProperScores {
    double log_score = 0.0;  ///< mean of -ln p_y [nats]
    double brier = 0.0;  ///< mean of sum over causes of (p_k - d_k)^2 [1], in [0, 2]; for two causes twice
                         ///< the one that sums over one cause only
    double log_score_of_base_rates =
        0.0;  ///< of a forecast that says the sample's own shares to everyone [nats]
    double brier_of_base_rates = 0.0;
    double log_skill = 0.0;    ///< 1 - log_score / log_score_of_base_rates; NaN when all have one cause
    double brier_skill = 0.0;  ///< 1 - brier / brier_of_base_rates; NaN when all have one cause
    double expected_log_score = 0.0;  ///< what the forecasts themselves expect: mean of -sum p ln p [nats]
    double expected_brier = 0.0;      ///< mean of 1 - sum p^2 [1]
};

/// @throws DomainError  as check_audit_sample()
[[nodiscard]] ProperScores proper_scores(const AuditSample& sample);

}  // namespace steelyard::engine
