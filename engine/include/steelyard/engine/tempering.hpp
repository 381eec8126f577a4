// SPDX-License-Identifier: Apache-2.0
#pragma once
// One exponent on the whole evidence of a case (a power likelihood), fitted by maximum likelihood with the
// priors held fixed: the bluntest correction for findings that overlap, and a measure of how much they do.
// docs/method.md, "Dependence".

#include <Eigen/Core>

namespace steelyard::engine {

/// Patients whose final cause is known, as far as tempering needs them. Equal patients may be given once with
/// their count.
struct LabelledEvidence {
    Eigen::ArrayXd log_prior;  ///< shape (K) [nats], up to a constant; finite
    Eigen::ArrayXXd loglik;    ///< shape (N, K) [nats]: sum over findings of ln P(band seen | cause); finite
    Eigen::ArrayXi cause;      ///< shape (N): 0-based final cause
    Eigen::ArrayXd count;      ///< shape (N): patients; > 0
};

struct TemperingFit {
    double tau = 1.0;             ///< exponent of maximum likelihood; below 1 when findings overlap
    double standard_error = 0.0;  ///< from the information at tau; infinite when tau is held at 0
    double loglik_naive = 0.0;    ///< ln likelihood of the final causes at tau = 1 [nats]
    double loglik = 0.0;          ///< at the fitted tau
};

/// The exponent tau >= 0 on the evidence that makes the final causes likeliest, P_k(tau) proportional to
/// prior_k exp(tau S_k). The prior is not tempered. The likelihood is concave in tau: tau is the one root of
/// sum count [S_y - sum_k P_k(tau) S_k], or 0 where that is negative already at 0 (the evidence misleads).
/// For m copies of one finding tau is 1/m. Fitted on the patients that made the tables it flatters.
/// @throws DomainError  shapes, ranges; the evidence is the same for every cause; or every patient's own
/// cause has the
///                      highest likelihood, so that no finite exponent is best (`evidence`)
[[nodiscard]] TemperingFit fit_tempering(const LabelledEvidence& evidence);

}  // namespace steelyard::engine
