// SPDX-License-Identifier: Apache-2.0
#pragma once
// Forecasts that are held against final causes, grouped by pattern: patients with the same forecast stand in
// one row, counted by their final cause. Every figure of an audit is a function of this table, so that its
// cost grows with the patterns and not with the patients. docs/method.md, "Audit".

#include <Eigen/Core>
#include <string_view>

namespace steelyard::engine {

/// G patterns, K causes. Rows with the same forecast may be given apart or together; no figure depends on it,
/// but for rounding.
///
/// Forecasts are given as logarithms, so that one that underflows still has a finite log score, and log odds
/// near p = 1 come from the other causes and not from 1 - p. A forecast of 0 (ln p = -inf) is refused: its
/// log score would be infinite or hidden by clipping. Two forecasts count as equal when their log odds differ
/// by no more than 1e-11 max(1, |log odds|): the same posterior reached by two sums is a tie.
struct AuditSample {
    Eigen::ArrayXXd
        log_forecast;       ///< ln p; shape (G, K) [nats]; finite; log-sum-exp of a row is 0 within 1e-9
    Eigen::ArrayXXd count;  ///< patients of pattern g whose final cause is k; shape (G, K); finite, >= 0.
                            ///< Point figures take counts that are not whole; resampling needs whole ones.

    Eigen::Index patterns() const { return log_forecast.rows(); }
    Eigen::Index causes() const { return log_forecast.cols(); }
    /// All patients [1].
    double patients() const { return count.sum(); }
    /// Patients per final cause; shape (K).
    Eigen::ArrayXd cause_counts() const { return count.colwise().sum().transpose(); }
    /// Patients per pattern; shape (G).
    Eigen::ArrayXd pattern_counts() const { return count.rowwise().sum(); }
};

/// @throws DomainError in the name of `function`: shapes differ, G < 1, K < 2, an entry is out of its domain,
/// a
///                     row of log_forecast does not add up, or there are no patients
void check_audit_sample(std::string_view function, const AuditSample& sample);

/// ln(p_k / (1 - p_k)) of each pattern for cause k, the complement summed over the other causes where p_k is
/// above 1/2. @returns shape (G) [nats]   @throws DomainError  `cause` points nowhere
[[nodiscard]] Eigen::ArrayXd log_odds_against_rest(const AuditSample& sample, Eigen::Index cause);

/// The cause with the largest forecast in each pattern; of several within 1e-12 nats of it the first.
/// @returns shape (G), 0-based
[[nodiscard]] Eigen::ArrayXi leaders(const AuditSample& sample);

}  // namespace steelyard::engine
