// SPDX-License-Identifier: Apache-2.0
#pragma once
// The Brier score of one cause against the rest, taken apart (Murphy, J Appl Meteorol 1973;12:595, citation
// seen): BS = reliability - resolution + uncertainty is exact when patients are grouped by equal forecasts;
// with bins, two terms within the bins are added (Stephenson, Coelho and Jolliffe, Weather Forecast
// 2008;23:752, citation seen): BS = REL - RES + UNC + WBV - WBC. docs/method.md, "Audit".

#include <Eigen/Core>

#include "steelyard/engine/audit_sample.hpp"

namespace steelyard::engine {

struct BrierDecomposition {
    double brier = 0.0;        ///< mean of (p - d)^2 for this cause alone [1], in [0, 1]
    double reliability = 0.0;  ///< REL: mean squared distance of forecast and observed share; 0 is best
    double resolution = 0.0;   ///< RES: mean squared distance of observed share and base rate
    double uncertainty = 0.0;  ///< UNC: base rate times its complement
    double within_bin_variance = 0.0;  ///< WBV: mean of (p - mean p of its bin)^2; 0 without bins
    double within_bin_covariance =
        0.0;  ///< WBC: twice the mean of (p - mean p)(d - observed share); 0 without bins
};

/// By distinct forecasts. Where nearly all forecasts are distinct, reliability is nearly the whole score and
/// says little. @param cause  0-based   @throws DomainError
[[nodiscard]] BrierDecomposition brier_by_forecast(const AuditSample& sample, Eigen::Index cause);

/// By bins of equal width, as reliability_bins() cuts them.
/// @param bins  in [1, 1000]   @throws DomainError
[[nodiscard]] BrierDecomposition brier_by_bin(const AuditSample& sample, Eigen::Index cause,
                                              Eigen::Index bins = 10);

}  // namespace steelyard::engine
