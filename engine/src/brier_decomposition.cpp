// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/brier_decomposition.hpp"

#include <cmath>
#include <string_view>
#include <vector>

#include "exact_sum.hpp"
#include "forecast_bins.hpp"
#include "guards.hpp"
#include "tie_groups.hpp"

namespace steelyard::engine {
namespace {

/// Forecasts of one cause with the patients of each pattern who have it and who do not.
struct OneCause {
    Eigen::ArrayXd p, cases, others;

    OneCause(std::string_view function, const AuditSample& sample, Eigen::Index cause) {
        check_audit_sample(function, sample);
        check_index(function, "cause", cause, sample.causes());
        p = sample.log_forecast.col(cause).exp();
        cases = sample.count.col(cause);
        others = sample.pattern_counts() - cases;
    }
};

/// Sums over the patients of one group.
struct Group {
    double patients = 0.0, cases = 0.0, forecast = 0.0;

    void add(const OneCause& data, Eigen::Index g) {
        const double here = data.cases(g) + data.others(g);
        patients += here;
        cases += data.cases(g);
        forecast += here * data.p(g);
    }
};

/// The terms that both groupings have: the score itself, and how groups differ.
BrierDecomposition between(const OneCause& data, const std::vector<Group>& groups) {
    const double n = data.cases.sum() + data.others.sum();
    const double base = data.cases.sum() / n;
    ExactSum brier, reliability, resolution;
    for (Eigen::Index g = 0; g < data.p.size(); ++g) {
        const double p = data.p(g);
        brier.add(data.cases(g) * (1.0 - p) * (1.0 - p) + data.others(g) * p * p);
    }
    for (const Group& group : groups) {
        if (group.patients > 0.0) {
            const double observed = group.cases / group.patients;
            const double miss = group.forecast / group.patients - observed;
            reliability.add(group.patients * miss * miss);
            resolution.add(group.patients * (observed - base) * (observed - base));
        }
    }
    BrierDecomposition result;
    result.brier = brier.value() / n;
    result.reliability = reliability.value() / n;
    result.resolution = resolution.value() / n;
    result.uncertainty = base * (1.0 - base);
    return result;
}

}  // namespace

BrierDecomposition brier_by_forecast(const AuditSample& sample, Eigen::Index cause) {
    const OneCause data("brier_by_forecast", sample, cause);
    const TieGroups ties = tie_groups(log_odds_against_rest(sample, cause));
    std::vector<Group> groups(ties.ends.size());
    std::size_t at = 0;
    for (std::size_t t = 0; t < groups.size(); ++t) {
        for (; at < static_cast<std::size_t>(ties.ends[t]); ++at) {
            groups[t].add(data, ties.order[at]);
        }
    }
    return between(data, groups);
}

BrierDecomposition brier_by_bin(const AuditSample& sample, Eigen::Index cause, Eigen::Index bins) {
    constexpr std::string_view name = "brier_by_bin";
    const OneCause data(name, sample, cause);
    check_bins(name, bins);
    std::vector<Group> groups(static_cast<std::size_t>(bins));
    const auto group_of = [&](Eigen::Index g) -> Group& {
        return groups[static_cast<std::size_t>(bin_of(data.p(g), bins))];
    };
    for (Eigen::Index g = 0; g < data.p.size(); ++g) {
        group_of(g).add(data, g);
    }
    BrierDecomposition result = between(data, groups);
    ExactSum variance, covariance;
    for (Eigen::Index g = 0; g < data.p.size(); ++g) {
        const Group& group = group_of(g);
        if (group.patients > 0.0) {
            const double off = data.p(g) - group.forecast / group.patients;
            const double observed = group.cases / group.patients;
            variance.add((data.cases(g) + data.others(g)) * off * off);
            covariance.add(2.0 * off * (data.cases(g) * (1.0 - observed) - data.others(g) * observed));
        }
    }
    const double n = sample.patients();
    result.within_bin_variance = variance.value() / n;
    result.within_bin_covariance = covariance.value() / n;
    return result;
}

}  // namespace steelyard::engine
