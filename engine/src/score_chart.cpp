// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/score_chart.hpp"

#include <algorithm>
#include <cmath>
#include <string_view>

#include "exact_sum.hpp"
#include "guards.hpp"
#include "steelyard/engine/domain_error.hpp"

namespace steelyard::engine {
namespace {

constexpr std::string_view name = "score_chart";

/// Sums over the patients of one period.
struct Sums {
    double patients = 0.0;
    ExactSum score, expected, variance;

    void add(const AuditSample& sample) {
        for (Eigen::Index g = 0; g < sample.patterns(); ++g) {
            const Eigen::ArrayXd log_p = sample.log_forecast.row(g).transpose();
            const Eigen::ArrayXd p = log_p.exp();
            const double here = sample.count.row(g).sum();
            const double entropy = -(p * log_p).sum();
            patients += here;
            for (Eigen::Index k = 0; k < log_p.size(); ++k) {
                score.add_product(sample.count(g, k), -log_p(k));
            }
            expected.add_product(here, entropy);
            variance.add_product(here, (p * (log_p + entropy).square()).sum());
        }
    }
};

bool is_empty(const AuditSample& period) {
    return period.log_forecast.rows() == 0 ||
           (period.count.rows() == period.log_forecast.rows() && (period.count == 0.0).all());
}

}  // namespace

ScoreChart score_chart(const std::vector<AuditSample>& periods) {
    check_size_at_least(name, "periods", static_cast<Eigen::Index>(periods.size()), 1);
    std::vector<Sums> sums(periods.size());
    Eigen::Index causes = 0;
    Sums all;
    for (std::size_t t = 0; t < periods.size(); ++t) {
        if (!is_empty(periods[t])) {
            check_audit_sample(name, periods[t]);
            causes = causes == 0 ? periods[t].causes() : causes;
            check_size(name, "periods log_forecast columns", periods[t].causes(), causes);
            sums[t].add(periods[t]);
            all.add(periods[t]);
        }
    }
    check_positive(name, "patients", all.patients);
    ScoreChart chart;
    chart.mean = all.score.value() / all.patients;
    chart.expected = all.expected.value() / all.patients;
    ExactSum square;
    for (std::size_t t = 0; t < periods.size(); ++t) {
        if (sums[t].patients > 0.0) {
            const Eigen::ArrayXXd off = -periods[t].log_forecast - chart.mean;
            square.add((periods[t].count * off.square()).sum());
        }
    }
    chart.sd = all.patients > 1.0 ? std::sqrt(std::max(0.0, square.value()) / (all.patients - 1.0)) : 0.0;
    for (const Sums& sum : sums) {
        ScorePeriod period;
        period.patients = sum.patients;
        if (sum.patients > 0.0) {
            const double half = 3.0 * chart.sd / std::sqrt(sum.patients);
            period.log_score = sum.score.value() / sum.patients;
            period.expected = sum.expected.value() / sum.patients;
            period.low = std::max(0.0, chart.mean - half);
            period.high = chart.mean + half;
            // One period alone is its own mean; rounding must not put it outside.
            const double rounding = 1e-12 * (1.0 + chart.mean);
            period.outside =
                *period.log_score < *period.low - rounding || *period.log_score > *period.high + rounding;
            if (sum.variance.value() > 0.0) {
                period.z_against_expected =
                    (sum.score.value() - sum.expected.value()) / std::sqrt(sum.variance.value());
            }
        }
        chart.periods.push_back(period);
    }
    return chart;
}

}  // namespace steelyard::engine
