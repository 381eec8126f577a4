// SPDX-License-Identifier: Apache-2.0
#pragma once
// The reliability curve: forecasts in bins of equal width beside the share in which they came true, and the
// expected calibration error (ECE) with what it must be measured against. docs/method.md, "Audit".

#include <Eigen/Core>
#include <cstdint>
#include <optional>
#include <vector>

#include "steelyard/engine/audit_sample.hpp"
#include "steelyard/engine/proportion.hpp"

namespace steelyard::engine {

/// Bin b of B holds b/B <= p < (b + 1)/B, p = 1 in the last. The index is floor(p B + 1e-9), so that 0.29 of
/// 100 bins is in bin 29, where its product in binary is 28.999...
struct ReliabilityBin {
    Eigen::Index index = 0;
    double low = 0.0, high = 0.0;  ///< edges [1]
    double count = 0.0;            ///< patients, > 0
    double mean_forecast = 0.0;
    IntervalEstimate observed;  ///< share in which it came true, Wilson's interval
};

/// ECE = sum over bins of n_b / n |mean forecast - observed share|. It is never 0 by chance alone: even a
/// perfectly calibrated forecaster shows one (Roelofs et al. 2022, Kumar et al. 2019, abstracts seen), most
/// with few patients and many bins. So it comes with what such a forecaster with the same forecasts would
/// show.
///
/// That is the law of sum over bins of |X_b - sum p| / n, where X_b is the number of successes of independent
/// trials with the bin's own forecasts. The law of X_b is computed exactly, trial by trial, while its
/// variance is below 400, and as normal beyond (error of the mean then below 0.1 %). The mean is a sum over
/// bins; the 95th percentile is of `draws` independent draws of the bins by inversion (Philox streams
/// 0xb0000000 on), the same for any thread count.
struct CalibrationError {
    double value = 0.0;
    double expected_if_calibrated = 0.0;
    double percentile_95_if_calibrated = 0.0;
};

struct Reliability {
    std::vector<ReliabilityBin> bins;  ///< those with patients, in order
    CalibrationError error;
    double largest_gap = 0.0;  ///< largest |mean forecast - observed share| of a bin
};

struct ReliabilityOptions {
    Eigen::Index bins = 10;      ///< in [1, 1000]
    double level = 0.95;         ///< of Wilson's intervals; in (0, 1)
    Eigen::Index draws = 20000;  ///< for the 95th percentile; in [20, 10 million]
    std::uint64_t seed = 1;
};

/// Of one cause: its forecast, and whether it was the final cause. @param cause  0-based   @throws
/// DomainError
[[nodiscard]] Reliability reliability(const AuditSample& sample, Eigen::Index cause,
                                      const ReliabilityOptions& options = {});

/// Of the leader ("top label"): its forecast, and whether it was right. @throws DomainError
[[nodiscard]] Reliability leader_reliability(const AuditSample& sample,
                                             const ReliabilityOptions& options = {});

}  // namespace steelyard::engine
