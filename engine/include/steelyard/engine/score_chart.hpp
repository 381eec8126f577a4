// SPDX-License-Identifier: Apache-2.0
#pragma once
// The log score period by period, with Shewhart's control limits (three standard errors about the pooled
// mean; Shewhart, Economic Control of Quality of Manufactured Product, 1931, from memory), so that one sees
// when tables or priors stop fitting the patients. docs/method.md, "Audit".

#include <Eigen/Core>
#include <optional>
#include <vector>

#include "steelyard/engine/audit_sample.hpp"

namespace steelyard::engine {

struct ScorePeriod {
    double patients = 0.0;
    std::optional<double> log_score;  ///< mean [nats]; empty without patients, as are the next
    std::optional<double> expected;   ///< what the period's own forecasts expect [nats]
    std::optional<double> low, high;  ///< pooled mean -/+ 3 sd / sqrt(patients); low not below 0
    bool outside = false;             ///< log_score outside [low, high]
    /// (log_score - expected) in standard deviations that calibrated forecasts would have; empty where that
    /// is 0.
    std::optional<double> z_against_expected;
};

struct ScoreChart {
    double mean = 0.0;  ///< pooled mean log score [nats]
    double sd =
        0.0;  ///< pooled standard deviation of a patient's log score (n - 1) [nats]; 0 for one patient
    double expected = 0.0;             ///< mean that the forecasts expect [nats]
    std::vector<ScorePeriod> periods;  ///< in the order given
};

/// @param periods  at least one; the same K; a period may be without patients (all counts 0, or no rows), not
/// all
/// @throws DomainError
[[nodiscard]] ScoreChart score_chart(const std::vector<AuditSample>& periods);

}  // namespace steelyard::engine
