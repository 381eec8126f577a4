// SPDX-License-Identifier: Apache-2.0
#pragma once
// How often the leading cause is the right one: confusion matrix, top-1 to top-t, and for each cause
// sensitivity, specificity and predictive values of being called, with Wilson's intervals. These depend on
// the priors used: they are properties of tables and clinic together. docs/method.md, "Audit".

#include <Eigen/Core>
#include <optional>
#include <vector>

#include "steelyard/engine/audit_sample.hpp"
#include "steelyard/engine/proportion.hpp"

namespace steelyard::engine {

/// What a call of one cause is worth. Empty where nobody is in the denominator.
struct CallAccuracy {
    std::optional<IntervalEstimate> sensitivity;                ///< called, of those who have it
    std::optional<IntervalEstimate> specificity;                ///< not called, of those who do not
    std::optional<IntervalEstimate> positive_predictive_value;  ///< have it, of those called
    std::optional<IntervalEstimate> negative_predictive_value;  ///< do not, of those not called
};

struct TopCall {
    Eigen::ArrayXXd confusion;  ///< patients; shape (K, K): row final cause, column called cause
    std::vector<IntervalEstimate>
        top;  ///< top[t - 1]: share whose final cause is among the t highest; K entries
    std::vector<CallAccuracy> cause;  ///< K entries
};

/// The called cause is the leader. A final cause is among the top t when fewer than t causes stand before it;
/// of causes with equal forecasts (within 1e-12 nats) the earlier stands before the later, for the leader as
/// well.
/// @param level  coverage of the intervals [1]; in (0, 1)   @throws DomainError
[[nodiscard]] TopCall top_call(const AuditSample& sample, double level = 0.95);

}  // namespace steelyard::engine
