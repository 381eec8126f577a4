// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/posterior_spread.hpp"

#include <algorithm>
#include <cmath>
#include <limits>
#include <string>
#include <vector>

#include "guards.hpp"
#include "steelyard/engine/domain_error.hpp"
#include "steelyard/engine/parallel.hpp"

namespace steelyard::engine {
namespace {

constexpr Eigen::Index first_draws = 16'384;
constexpr Eigen::Index most_draws_unasked = 262'144;
constexpr double fewest_draws = 1e3;
constexpr double most_draws = 1e6;

void check_options(const SpreadOptions& options) {
    constexpr const char* function = "posterior_spread";
    if (options.draws) {
        check_between(function, "draws", static_cast<double>(*options.draws), fewest_draws, most_draws);
    }
    check_between(function, "threads", options.threads, 1.0, 256.0);
    check_positive(function, "aim", options.aim);
    if (!(options.level > 0.0 && options.level < 1.0)) {
        throw DomainError(function, "level", std::nullopt, std::nullopt, options.level, "in (0, 1)");
    }
}

/// Posteriors of draws 0 to N - 1, one column a cause, extended as more are wanted.
class Draws {
  public:
    Draws(const UncertainPosterior& problem, const SpreadOptions& options)
        : problem_(problem), options_(options) {}

    void extend_to(Eigen::Index count) {
        const Eigen::Index done = posterior_.rows();
        posterior_.conservativeResize(count, problem_.causes());
        const Eigen::Index from = done / UncertainPosterior::block;
        const Eigen::Index to = (count + UncertainPosterior::block - 1) / UncertainPosterior::block;
        run_in_parallel(
            to - from, options_.threads,
            [&](Eigen::Index job) {
                const Eigen::Index first = (from + job) * UncertainPosterior::block;
                const Eigen::Index wanted = std::min(UncertainPosterior::block, count - first);
                posterior_.middleRows(first, wanted) =
                    problem_.draw(options_.seed, static_cast<std::uint64_t>(first), wanted);
            },
            options_.progress);
    }

    PosteriorSpread summary() const {
        const Eigen::Index causes = posterior_.cols();
        PosteriorSpread spread;
        spread.draws = posterior_.rows();
        const auto count = static_cast<double>(spread.draws);
        for (Eigen::ArrayXd* array :
             {&spread.low, &spread.high, &spread.low_error, &spread.high_error, &spread.median, &spread.mean,
              &spread.sd, &spread.leads, &spread.leads_error}) {
            array->setZero(causes);
        }
        for (Eigen::Index i = 0; i < posterior_.rows(); ++i) {
            const double largest = posterior_.row(i).maxCoeff();
            const auto tied = static_cast<double>((posterior_.row(i) == largest).count());
            for (Eigen::Index k = 0; k < causes; ++k) {
                spread.leads(k) += posterior_(i, k) == largest ? 1.0 / tied : 0.0;
            }
        }
        spread.leads /= count;
        const double tail = (1.0 - options_.level) / 2.0;
        run_in_parallel(causes, options_.threads, [&](Eigen::Index k) {
            const double p = spread.leads(k);
            spread.leads_error(k) = std::sqrt(std::max(p * (1.0 - p), 0.5 / count) / count);
            std::vector<double> sample(posterior_.col(k).data(),
                                       posterior_.col(k).data() + posterior_.rows());
            spread.mean(k) = posterior_.col(k).mean();
            spread.sd(k) = std::sqrt((posterior_.col(k) - spread.mean(k)).square().mean());
            const std::vector<SampleQuantile> points = sample_quantiles(sample, {tail, 0.5, 1.0 - tail});
            spread.low(k) = points[0].value;
            spread.low_error(k) = points[0].error;
            spread.median(k) = points[1].value;
            spread.high(k) = points[2].value;
            spread.high_error(k) = points[2].error;
        });
        return spread;
    }

  private:
    const UncertainPosterior& problem_;
    const SpreadOptions& options_;
    Eigen::ArrayXXd posterior_;  // shape (draws, causes)
};

/// Puts the order statistics of some places where they belong, the middle one first, so that each pass halves
/// the sample.
/// @param sample  the elements from `offset` on   @param places  increasing
void put_in_place(std::span<double> sample, std::size_t offset, std::span<const std::size_t> places) {
    if (places.empty() || sample.size() < 2) {
        return;
    }
    const std::size_t middle = places.size() / 2;
    const std::size_t at = places[middle] - offset;
    std::nth_element(sample.begin(), sample.begin() + static_cast<std::ptrdiff_t>(at), sample.end());
    put_in_place(sample.first(at), offset, places.first(middle));
    put_in_place(sample.subspan(at + 1), offset + at + 1, places.subspan(middle + 1));
}

}  // namespace

std::vector<SampleQuantile> sample_quantiles(std::span<double> sample, const std::vector<double>& q) {
    check_size_at_least("sample_quantiles", "sample", static_cast<Eigen::Index>(sample.size()), 2);
    const auto size = static_cast<double>(sample.size());
    std::vector<double> ranks;  // three for each q: of the quantile, and of those beside it
    std::vector<std::size_t> places;
    for (const double level : q) {
        if (!(level > 0.0 && level < 1.0)) {
            throw DomainError("sample_quantiles", "q", std::nullopt, std::nullopt, level, "in (0, 1)");
        }
        const double spread = std::sqrt(size * level * (1.0 - level));
        for (const double away : {0.0, -spread, spread}) {
            const double rank = std::clamp(level * (size - 1.0) + away, 0.0, size - 1.0);
            ranks.push_back(rank);
            places.push_back(static_cast<std::size_t>(rank));
            places.push_back(std::min(static_cast<std::size_t>(rank) + 1, sample.size() - 1));
        }
    }
    std::sort(places.begin(), places.end());
    places.erase(std::unique(places.begin(), places.end()), places.end());
    put_in_place(sample, 0, places);

    const auto value_at = [&](double rank) {
        const auto whole = static_cast<std::size_t>(rank);
        const double way = rank - static_cast<double>(whole);
        return way == 0.0 ? sample[whole] : sample[whole] + way * (sample[whole + 1] - sample[whole]);
    };
    std::vector<SampleQuantile> result;
    for (std::size_t i = 0; i < ranks.size(); i += 3) {
        result.push_back({value_at(ranks[i]), 0.5 * (value_at(ranks[i + 2]) - value_at(ranks[i + 1]))});
    }
    return result;
}

PosteriorSpread posterior_spread(const UncertainPosterior& problem, const SpreadOptions& options) {
    check_options(options);
    Draws draws(problem, options);
    Eigen::Index wanted = options.draws.value_or(first_draws);
    draws.extend_to(wanted);
    PosteriorSpread spread = draws.summary();
    while (!options.draws && wanted < most_draws_unasked) {
        const double error = std::max(spread.low_error.maxCoeff(), spread.high_error.maxCoeff());
        if (error <= options.aim) {
            break;
        }
        // The error falls with the root of the number; a tenth more, because it is itself an estimate.
        const double factor = std::clamp(1.1 * (error / options.aim) * (error / options.aim), 1.25, 16.0);
        const auto blocks = static_cast<Eigen::Index>(
            std::ceil(factor * static_cast<double>(wanted) / static_cast<double>(UncertainPosterior::block)));
        wanted = std::min(blocks * UncertainPosterior::block, most_draws_unasked);
        draws.extend_to(wanted);
        spread = draws.summary();
    }
    return spread;
}

}  // namespace steelyard::engine
