// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/discrimination.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

#include "area_order.hpp"
#include "cells.hpp"
#include "guards.hpp"
#include "hand_till.hpp"
#include "placements.hpp"

namespace steelyard::engine {

std::optional<AreaUnderCurve> area_under_curve(const AuditSample& sample, Eigen::Index cause, double level) {
    check_audit_sample("area_under_curve", sample);
    check_index("area_under_curve", "cause", cause, sample.causes());
    const double z = two_sided_normal_quantile(level);
    const Eigen::ArrayXd cases = sample.count.col(cause);
    const Eigen::ArrayXd others = sample.pattern_counts() - cases;
    if (!(cases.sum() > 0.0 && others.sum() > 0.0)) {
        return std::nullopt;
    }
    const Placements placed = placements(log_odds_against_rest(sample, cause), cases, others);
    AreaUnderCurve result;
    result.value = placed.area;
    if (cases.sum() >= 2.0 && others.sum() >= 2.0) {
        const double variance = sample_covariance(placed.of_case, placed.of_case, cases) / cases.sum() +
                                sample_covariance(placed.of_other, placed.of_other, others) / others.sum();
        if (variance > 1e-28) {  // rounding leaves about 1e-32 where the placements are all alike
            const double half = z * std::sqrt(variance);
            result.variance = variance;
            result.interval = {placed.area, std::max(0.0, placed.area - half),
                               std::min(1.0, placed.area + half)};
        }
    }
    return result;
}

PairwiseAreas pairwise_areas(const AuditSample& sample) {
    check_audit_sample("pairwise_areas", sample);
    const Cells cells(sample.count);
    PairwiseAreas result;
    AreaOrder(sample, cells).wins(cells.count, result.area);
    const HandTill pairs = hand_till(result.area, sample.cause_counts());
    result.pairs = pairs.pairs;
    if (pairs.pairs > 0) {
        result.hand_till = pairs.mean;
    }
    return result;
}

}  // namespace steelyard::engine
