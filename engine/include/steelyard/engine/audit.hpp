// SPDX-License-Identifier: Apache-2.0
#pragma once
// All figures of an audit of one sample or one stratum of it, with their intervals. docs/method.md, "Audit".

#include <Eigen/Core>
#include <cstdint>
#include <functional>
#include <optional>
#include <vector>

#include "steelyard/engine/audit_bootstrap.hpp"
#include "steelyard/engine/audit_sample.hpp"
#include "steelyard/engine/brier_decomposition.hpp"
#include "steelyard/engine/calibration.hpp"
#include "steelyard/engine/discrimination.hpp"
#include "steelyard/engine/net_benefit.hpp"
#include "steelyard/engine/proper_scores.hpp"
#include "steelyard/engine/recalibration.hpp"
#include "steelyard/engine/reliability.hpp"
#include "steelyard/engine/top_call.hpp"

namespace steelyard::engine {

struct AuditOptions {
    double level = 0.95;  ///< of all intervals; in (0, 1)
    Eigen::Index replicates =
        2000;  ///< of the bootstrap, in [20, 2^28); 0 for none: then `intervals` is empty
    std::uint64_t seed = 1;
    int threads = 1;
    Eigen::Index bins = 10;                          ///< of reliability curves, in [1, 1000]
    Eigen::Index reference = 0;                      ///< cause that recalibration takes as its reference
    std::vector<ActionThreshold> thresholds = {};    ///< for net benefit
    std::function<void(double done)> progress = {};  ///< called from the calling thread only
};

/// What concerns one cause against the rest.
struct CauseFigures {
    double cases = 0.0;
    std::optional<AreaUnderCurve> area;
    CauseCalibration calibration;
    std::optional<CalibrationTest> spiegelhalter;
    BrierDecomposition by_forecast, by_bin;
    Reliability reliability;
};

struct AuditFigures {
    double patients = 0.0;
    ProperScores scores;
    TopCall calls;
    PairwiseAreas pairs;
    std::vector<CauseFigures> cause;  ///< K entries
    Reliability leader;               ///< of the leading cause
    std::optional<CalibrationTest> spiegelhalter, log_score_test;
    Recalibration recalibration;
    TemperatureFit temperature;
    std::vector<NetBenefit> net_benefit;      ///< one per threshold asked for
    std::optional<AuditIntervals> intervals;  ///< by resampling; empty without replicates
};

/// Works on any sample with at least one patient: what a stratum is too small for comes out empty or with a
/// status. The result depends on the sample, the seed and the options, not on the number of threads.
/// @param sample  counts whole when there are replicates   @throws DomainError
[[nodiscard]] AuditFigures audit(const AuditSample& sample, const AuditOptions& options = {});

}  // namespace steelyard::engine
