// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/top_call.hpp"

#include <algorithm>

#include "causes_before.hpp"

namespace steelyard::engine {
namespace {

std::optional<IntervalEstimate> share(double x, double n, double level) {
    return n > 0.0 ? std::optional(wilson_interval(std::min(x, n), n, level)) : std::nullopt;
}

}  // namespace

TopCall top_call(const AuditSample& sample, double level) {
    check_audit_sample("top_call", sample);
    const Eigen::Index causes = sample.causes();
    const double n = sample.patients();
    TopCall result;
    result.confusion.setZero(causes, causes);
    Eigen::ArrayXd place = Eigen::ArrayXd::Zero(causes);  // patients by how many causes stand before theirs
    const Eigen::ArrayXi leader = leaders(sample);
    for (Eigen::Index g = 0; g < sample.patterns(); ++g) {
        for (Eigen::Index k = 0; k < causes; ++k) {
            if (sample.count(g, k) > 0.0) {
                result.confusion(k, leader(g)) += sample.count(g, k);
                place(causes_before(sample.log_forecast, leader(g), g, k)) += sample.count(g, k);
            }
        }
    }
    double within = 0.0;
    for (Eigen::Index t = 0; t < causes; ++t) {
        within += place(t);
        result.top.push_back(wilson_interval(std::min(within, n), n, level));
    }
    for (Eigen::Index k = 0; k < causes; ++k) {
        const double hit = result.confusion(k, k);
        const double cases = result.confusion.row(k).sum();
        const double called = result.confusion.col(k).sum();
        const double others = n - cases;
        const double cleared = others - (called - hit);  // neither have it nor are called
        result.cause.push_back({share(hit, cases, level), share(cleared, others, level),
                                share(hit, called, level), share(cleared, n - called, level)});
    }
    return result;
}

}  // namespace steelyard::engine
