// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/resampling.hpp"

#include <algorithm>
#include <cmath>
#include <optional>
#include <vector>

#include "guards.hpp"
#include "multinomial_sampler.hpp"
#include "resampler.hpp"
#include "steelyard/engine/parallel.hpp"
#include "steelyard/engine/proportion.hpp"

namespace steelyard::engine {
namespace {

constexpr std::uint32_t replicate_streams = 0xc0000000U;
constexpr double most_replicates = 268435456.0;  // 2^28: the next stream belongs to the Sobol' shifts
constexpr double most_patients = 2147483648.0;   // 2^31

void check_counts(std::string_view function, const Eigen::Ref<const Eigen::ArrayXd>& count) {
    check_size_at_least(function, "count", count.size(), 1);
    for (Eigen::Index c = 0; c < count.size(); ++c) {
        if (!(count(c) >= 0.0 && count(c) < most_patients && count(c) == std::floor(count(c)))) {
            throw DomainError(function, "count", c, std::nullopt, count(c), "whole, >= 0 and below 2^31");
        }
    }
    const double sum = count.sum();
    if (!(sum >= 1.0 && sum < most_patients)) {
        throw DomainError(function, "count sum", std::nullopt, std::nullopt, sum,
                          "at least 1 and below 2^31");
    }
}

std::uint32_t stream_of(Eigen::Index replicate) {
    return replicate_streams + static_cast<std::uint32_t>(replicate);
}

}  // namespace

void check_resampling(std::string_view function, const Eigen::Ref<const Eigen::ArrayXd>& count,
                      const ResamplingOptions& options) {
    check_counts(function, count);
    check_between(function, "replicates", static_cast<double>(options.replicates), 20.0,
                  most_replicates - 1.0);
    check_between(function, "threads", options.threads, 1.0, 4096.0);
    static_cast<void>(two_sided_normal_quantile(options.level));
}

Eigen::ArrayXd resample_counts(const Eigen::Ref<const Eigen::ArrayXd>& count, std::uint64_t seed,
                               Eigen::Index replicate) {
    check_counts("resample_counts", count);
    check_between("resample_counts", "replicate", static_cast<double>(replicate), 0.0, most_replicates - 1.0);
    Eigen::VectorXd drawn(count.size());
    MultinomialSampler(count).draw(seed, stream_of(replicate), drawn);
    return drawn.array();
}

Eigen::ArrayXXd resample(const Eigen::ArrayXd& count, const ResamplingOptions& options, Eigen::Index figures,
                         const ReplicateFigures& evaluate) {
    const MultinomialSampler sampler(count);
    // Blocks of about a million weights: enough replicates to share the reading of the features, and bounded.
    const Eigen::Index block = std::clamp<Eigen::Index>((Eigen::Index{1} << 20) / count.size(), 1, 32);
    const Eigen::Index blocks = (options.replicates + block - 1) / block;
    Eigen::ArrayXXd result(figures, options.replicates);
    run_in_parallel(
        blocks, options.threads,
        [&](Eigen::Index b) {
            const Eigen::Index first = b * block;
            const Eigen::Index size = std::min(block, options.replicates - first);
            Eigen::MatrixXd weights(count.size(), size);
            for (Eigen::Index r = 0; r < size; ++r) {
                sampler.draw(options.seed, stream_of(first + r), weights.col(r));
            }
            evaluate(weights, result.middleCols(first, size));
        },
        options.progress);
    return result.transpose();
}

std::optional<BootstrapInterval> percentile_interval(const Eigen::Ref<const Eigen::ArrayXd>& replicate,
                                                     double level) {
    static_cast<void>(two_sided_normal_quantile(level));  // checks it
    std::vector<double> values;
    values.reserve(static_cast<std::size_t>(replicate.size()));
    for (Eigen::Index r = 0; r < replicate.size(); ++r) {
        if (!std::isnan(replicate(r))) {
            values.push_back(replicate(r));
        }
    }
    const auto defined = static_cast<Eigen::Index>(values.size());
    if (defined < 2 || 10 * defined < 9 * replicate.size()) {
        return std::nullopt;
    }
    std::sort(values.begin(), values.end());
    const auto quantile = [&](double q) {
        const double place = q * static_cast<double>(defined - 1);
        const auto below = static_cast<std::size_t>(place);
        const std::size_t above = std::min(below + 1, values.size() - 1);
        return values[below] + (place - static_cast<double>(below)) * (values[above] - values[below]);
    };
    const Eigen::Map<const Eigen::ArrayXd> all(values.data(), defined);
    const double mean = all.mean();
    BootstrapInterval interval;
    interval.low = quantile(0.5 * (1.0 - level));
    interval.high = quantile(0.5 * (1.0 + level));
    interval.standard_error = std::sqrt((all - mean).square().sum() / static_cast<double>(defined - 1));
    interval.replicates = defined;
    return interval;
}

}  // namespace steelyard::engine
