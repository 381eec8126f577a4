// SPDX-License-Identifier: Apache-2.0
#pragma once
// Likelihood ratios from counts, with intervals: the log method (Katz 1978; Simel, Samsa and Matchar 1991)
// and the score methods (Koopman 1984; Miettinen and Nurminen 1985). The same formulas serve LR+, LR- and
// every band of a table cut into several bands. docs/method.md, "Likelihood ratios from counts".

#include <Eigen/Core>
#include <vector>

#include "steelyard/engine/proportion.hpp"

namespace steelyard::engine {

/// Counts of one band in two groups. The ratio is (x1 / n1) / (x0 / n0).
struct RatioCounts {
    double x1 = 0.0;  ///< in the band, of those with the cause
    double n1 = 0.0;  ///< all with the cause
    double x0 = 0.0;  ///< in the band, of those without
    double n0 = 0.0;  ///< all without
};

/// Counts of a test with two outcomes.
struct TwoByTwo {
    double true_positive = 0.0;
    double false_positive = 0.0;
    double false_negative = 0.0;
    double true_negative = 0.0;
};

/// The counts behind LR+: those with a positive result.
[[nodiscard]] RatioCounts positive_counts(const TwoByTwo& table);
/// The counts behind LR-: those with a negative result. LR- has its own interval, not that of LR+ turned
/// over.
[[nodiscard]] RatioCounts negative_counts(const TwoByTwo& table);

/// Adds 1/2 to every one of `bands` cells of both groups: x + 1/2, n + bands / 2. With two bands this is the
/// usual half count of Haldane and Anscombe; with B bands the ratio becomes that of Jeffreys' posterior
/// means.
/// @param counts  each x in [0, n]; n > 0   @param bands  >= 2   @throws DomainError
[[nodiscard]] RatioCounts with_half_counts(const RatioCounts& counts, int bands = 2);

/// Standard error of ln LR: sqrt(1/x1 - 1/n1 + 1/x0 - 1/n0) [nats].
/// @param counts  each x in (0, n]   @throws DomainError  also for a zero count: this method has no answer
/// there
[[nodiscard]] double log_ratio_standard_error(const RatioCounts& counts);

/// The log method: exp(ln LR -/+ z se). Needs both counts above zero.
/// @param counts  each x in (0, n]   @param level  in (0, 1)   @throws DomainError
[[nodiscard]] IntervalEstimate ratio_log_interval(const RatioCounts& counts, double level = 0.95);

/// Whether the variance of the score is taken as it stands (Koopman) or times N / (N - 1) (Miettinen and
/// Nurminen).
enum class ScoreVariance { koopman, miettinen_nurminen };

/// The score method: the ratios r with (x1/n1 - r x0/n0)^2 <= z^2 V(r), V at the maximum likelihood under
/// that ratio. The limits are roots of that equation, found to the last few digits; zero cells need no
/// correction.
/// @param counts  each x in [0, n]; n > 0; x1 and x0 not both 0
/// @param level   in (0, 1)
/// @returns       low is 0 when x1 = 0; value and high are infinite when x0 = 0
/// @throws DomainError
[[nodiscard]] IntervalEstimate ratio_score_interval(const RatioCounts& counts,
                                                    ScoreVariance variance = ScoreVariance::koopman,
                                                    double level = 0.95);

/// One ratio with its score interval per band of a table. A band empty in both groups gives 0 to infinity and
/// a ratio that is not a number: nothing is known of it.
/// @param with     patients with the cause per band; shape (B), B >= 2; finite, >= 0; sum > 0
/// @param without  patients without; shape (B); the same
/// @throws DomainError
[[nodiscard]] std::vector<IntervalEstimate> band_ratios(const Eigen::Ref<const Eigen::ArrayXd>& with,
                                                        const Eigen::Ref<const Eigen::ArrayXd>& without,
                                                        ScoreVariance variance = ScoreVariance::koopman,
                                                        double level = 0.95);

enum class ProportionMethod { wilson, exact };

/// What a two-by-two table says of a test. Predictive values hold at the study's own mix only.
struct TestAccuracy {
    IntervalEstimate sensitivity;
    IntervalEstimate specificity;
    IntervalEstimate positive_predictive_value;
    IntervalEstimate negative_predictive_value;
};

/// @param table  finite, >= 0; no row and no column of it empty   @param level  in (0, 1)   @throws
/// DomainError
[[nodiscard]] TestAccuracy test_accuracy(const TwoByTwo& table,
                                         ProportionMethod method = ProportionMethod::wilson,
                                         double level = 0.95);

/// Diagnostic odds ratio TP TN / (FP FN) with the log method (Woolf): se = sqrt of the sum of the
/// reciprocals.
/// @param table  finite, every cell > 0   @param level  in (0, 1)   @throws DomainError
[[nodiscard]] IntervalEstimate diagnostic_odds_ratio(const TwoByTwo& table, double level = 0.95);

}  // namespace steelyard::engine
