// SPDX-License-Identifier: Apache-2.0
#pragma once
// The bootstrap on a table of counts: drawing n patients with replacement is drawing the cells of the table
// from the multinomial law with the observed shares, so that its cost grows with the cells and not with the
// patients (Efron, Ann Stat 1979;7:1, from memory). docs/method.md, "Audit".
//
// Replicate r has the Philox stream 0xc0000000 + r of its seed and nothing else, so that no replicate depends
// on threads, on blocks, or on how many replicates there are. Streams in use elsewhere: rows below
// 0x80000000, calibrated forecasters 0xb0000000, Sobol' shifts 0xd0000000, fit 0xe0000000, priors 0xf0000000.

#include <Eigen/Core>
#include <cstdint>
#include <functional>
#include <optional>

namespace steelyard::engine {

struct ResamplingOptions {
    Eigen::Index replicates = 2000;  ///< in [20, 2^28)
    std::uint64_t seed = 1;
    int threads = 1;                                 ///< >= 1
    double level = 0.95;                             ///< of the percentile intervals; in (0, 1)
    std::function<void(double done)> progress = {};  ///< called from the calling thread only
};

/// One replicate: counts ~ Multinomial(n, count / n), n = sum of count, exactly. docs/method.md, "Audit",
/// says how.
/// @param count      patients per cell; shape (M), M >= 1; whole, >= 0; their sum in [1, 2^31)
/// @param replicate  in [0, 2^28)
/// @returns          shape (M), same sum   @throws DomainError
[[nodiscard]] Eigen::ArrayXd resample_counts(const Eigen::Ref<const Eigen::ArrayXd>& count,
                                             std::uint64_t seed, Eigen::Index replicate);

/// What the replicates of one figure say.
struct BootstrapInterval {
    double low = 0.0, high = 0.0;  ///< percentiles (1 -/+ level) / 2, interpolated between order statistics
    double standard_error = 0.0;   ///< standard deviation of the replicates
    Eigen::Index replicates = 0;   ///< in which the figure was defined
};

/// @param replicate  values of the figure; NaN where it was not defined; shape (R)
/// @returns empty when it was undefined (a cause without cases, a fit without maximum) in more than a tenth
/// of them:
///          the others then are a selection, and their percentiles no interval   @throws DomainError  `level`
[[nodiscard]] std::optional<BootstrapInterval> percentile_interval(
    const Eigen::Ref<const Eigen::ArrayXd>& replicate, double level = 0.95);

}  // namespace steelyard::engine
