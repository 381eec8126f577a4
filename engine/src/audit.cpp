// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/audit.hpp"

namespace steelyard::engine {

AuditFigures audit(const AuditSample& sample, const AuditOptions& options) {
    check_audit_sample("audit", sample);
    ReliabilityOptions curve;
    curve.bins = options.bins;
    curve.level = options.level;
    curve.seed = options.seed;
    AuditFigures figures;
    figures.patients = sample.patients();
    figures.scores = proper_scores(sample);
    figures.calls = top_call(sample, options.level);
    figures.pairs = pairwise_areas(sample);
    for (Eigen::Index k = 0; k < sample.causes(); ++k) {
        CauseFigures cause;
        cause.cases = sample.count.col(k).sum();
        cause.area = area_under_curve(sample, k, options.level);
        cause.calibration = cause_calibration(sample, k, options.level);
        cause.spiegelhalter = spiegelhalter_test(sample, k);
        cause.by_forecast = brier_by_forecast(sample, k);
        cause.by_bin = brier_by_bin(sample, k, options.bins);
        cause.reliability = reliability(sample, k, curve);
        figures.cause.push_back(cause);
    }
    figures.leader = leader_reliability(sample, curve);
    figures.spiegelhalter = spiegelhalter_test_all(sample);
    figures.log_score_test = log_score_test(sample);
    figures.recalibration = recalibrate(sample, options.reference);
    figures.temperature = temperature(sample, options.level);
    for (const auto& [cause, threshold] : options.thresholds) {
        figures.net_benefit.push_back(net_benefit(sample, cause, threshold));
    }
    if (options.replicates != 0) {
        ResamplingOptions resampling;
        resampling.replicates = options.replicates;
        resampling.seed = options.seed;
        resampling.threads = options.threads;
        resampling.level = options.level;
        resampling.progress = options.progress;
        figures.intervals = audit_intervals(sample, resampling, options.bins, options.thresholds);
    }
    return figures;
}

}  // namespace steelyard::engine
