// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/proper_scores.hpp"

#include <cmath>

#include "exact_sum.hpp"

namespace steelyard::engine {

ProperScores proper_scores(const AuditSample& sample) {
    check_audit_sample("proper_scores", sample);
    const double n = sample.patients();
    ExactSum log_score, brier, expected_log_score, expected_brier;
    for (Eigen::Index g = 0; g < sample.patterns(); ++g) {
        double square = 0.0;
        double entropy = 0.0;
        double patients = 0.0;
        for (Eigen::Index k = 0; k < sample.causes(); ++k) {
            const double log_p = sample.log_forecast(g, k);
            const double p = std::exp(log_p);
            square += p * p;
            entropy -= p * log_p;
            patients += sample.count(g, k);
        }
        for (Eigen::Index k = 0; k < sample.causes(); ++k) {
            const double count = sample.count(g, k);
            if (count > 0.0) {
                const double log_p = sample.log_forecast(g, k);
                log_score.add_product(count, -log_p);
                brier.add_product(count, square - 2.0 * std::exp(log_p) + 1.0);
            }
        }
        expected_log_score.add_product(patients, entropy);
        expected_brier.add_product(patients, 1.0 - square);
    }
    ProperScores scores;
    scores.log_score = log_score.value() / n;
    scores.brier = brier.value() / n;
    scores.expected_log_score = expected_log_score.value() / n;
    scores.expected_brier = expected_brier.value() / n;
    const Eigen::ArrayXd share = sample.cause_counts() / n;
    for (Eigen::Index k = 0; k < share.size(); ++k) {
        scores.log_score_of_base_rates -= share(k) > 0.0 ? share(k) * std::log(share(k)) : 0.0;
        scores.brier_of_base_rates += share(k) * (1.0 - share(k));
    }
    const bool one_cause = share.maxCoeff() == 1.0;
    const double nan = std::nan("");
    scores.log_skill = one_cause ? nan : 1.0 - scores.log_score / scores.log_score_of_base_rates;
    scores.brier_skill = one_cause ? nan : 1.0 - scores.brier / scores.brier_of_base_rates;
    return scores;
}

}  // namespace steelyard::engine
