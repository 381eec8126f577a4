// SPDX-License-Identifier: Apache-2.0
#pragma once
// Whether acting on forecasts of a cause does more good than treating everybody or nobody: net benefit
// (Vickers and Elkin, Med Decis Making 2006;26:565, from memory; Vickers, van Calster and Steyerberg, Diagn
// Progn Res 2019;3:18, abstract seen). docs/method.md, "Audit".

#include <Eigen/Core>

#include "steelyard/engine/audit_sample.hpp"

namespace steelyard::engine {

/// In true positives per patient, not standardised (divided by the base rate it would be at most 1). Treating
/// nobody has 0.
struct NetBenefit {
    double threshold = 0.5;  ///< forecast from which one acts
    double value = 0.0;  ///< TP/n - FP/n t/(1 - t); a patient is treated when p >= t (within 1e-12 of ln p)
    double treat_all = 0.0;  ///< base rate - (1 - base rate) t/(1 - t)
    double treated = 0.0;    ///< share of patients treated
};

/// @param cause  0-based   @param threshold  t [1]; in [1e-6, 1 - 1e-6]   @throws DomainError
[[nodiscard]] NetBenefit net_benefit(const AuditSample& sample, Eigen::Index cause, double threshold);

}  // namespace steelyard::engine
