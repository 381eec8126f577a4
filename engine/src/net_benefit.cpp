// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/net_benefit.hpp"

#include <cmath>

#include "acts_at.hpp"
#include "guards.hpp"
#include "steelyard/engine/domain_error.hpp"

namespace steelyard::engine {

NetBenefit net_benefit(const AuditSample& sample, Eigen::Index cause, double threshold) {
    check_audit_sample("net_benefit", sample);
    check_index("net_benefit", "cause", cause, sample.causes());
    check_between("net_benefit", "threshold", threshold, 1e-6, 1.0 - 1e-6);
    const double n = sample.patients();
    double treated = 0.0;
    double hit = 0.0;
    for (Eigen::Index g = 0; g < sample.patterns(); ++g) {
        if (acts_at(sample.log_forecast(g, cause), threshold)) {
            treated += sample.count.row(g).sum();
            hit += sample.count(g, cause);
        }
    }
    const double odds = threshold / (1.0 - threshold);
    const double base = sample.count.col(cause).sum() / n;
    return {threshold, hit / n - (treated - hit) / n * odds, base - (1.0 - base) * odds, treated / n};
}

}  // namespace steelyard::engine
