// SPDX-License-Identifier: Apache-2.0
#pragma once
// What the draws of an uncertain posterior say: an interval for each cause, how often each leads, and how far
// off each of these may be for want of draws. docs/method.md, "Draws".

#include <Eigen/Core>
#include <cstdint>
#include <functional>
#include <optional>
#include <span>
#include <vector>

#include "steelyard/engine/uncertain_posterior.hpp"

namespace steelyard::engine {

struct SpreadOptions {
    std::uint64_t seed = 1;
    /// How many draws, in [1000, 1e6]. Empty: 16,384, and as many more as bring every end to
    /// `aim`, at most 2^18.
    std::optional<Eigen::Index> draws;
    double level = 0.95;  ///< of the intervals, in (0, 1)
    double aim = 0.005;   ///< Monte-Carlo error of an end that is small enough [1], > 0
    int threads = 1;      ///< in [1, 256]; no result depends on it
    /// Told, from the calling thread, how much of the draws wanted so far is done; may be empty.
    std::function<void(double done)> progress;
};

struct PosteriorSpread {
    Eigen::Index draws = 0;
    Eigen::ArrayXd low, high;              ///< shape (K): ends of the equal-tailed interval of the posterior
    Eigen::ArrayXd low_error, high_error;  ///< shape (K): their Monte-Carlo standard errors
    Eigen::ArrayXd median, mean,
        sd;  ///< shape (K), over the draws; the mean is not "the" posterior (docs/method.md)
    /// Shape (K): share of draws in which the cause has the largest posterior, a draw divided among those
    /// that tie; sums to 1.
    Eigen::ArrayXd leads;
    Eigen::ArrayXd
        leads_error;  ///< shape (K): binomial standard error, never 0: at least that of half a draw
};

/// @throws DomainError  an option is out of its domain
[[nodiscard]] PosteriorSpread posterior_spread(const UncertainPosterior& problem,
                                               const SpreadOptions& options);

/// A sample quantile and its standard error.
struct SampleQuantile {
    double value = 0.0;
    double error = 0.0;
};

/// Quantiles of a sample: between order statistics in proportion (Hyndman and Fan's type 7; from memory). The
/// error of each is half the distance of the order statistics one binomial standard deviation sqrt(N q (1 -
/// q)) of rank to either side.
/// @param sample  finite, at least 2; its order is changed   @param q  each in (0, 1)
/// @returns       one for each q   @throws DomainError
[[nodiscard]] std::vector<SampleQuantile> sample_quantiles(std::span<double> sample,
                                                           const std::vector<double>& q);

}  // namespace steelyard::engine
