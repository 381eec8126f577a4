// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/likelihood_ratio.hpp"

#include <cmath>
#include <limits>
#include <optional>
#include <string_view>

#include "monotone_root.hpp"
#include "steelyard/engine/domain_error.hpp"

namespace steelyard::engine {
namespace {

constexpr double infinity = std::numeric_limits<double>::infinity();

void check_counts(std::string_view function, const RatioCounts& counts) {
    check_positive(function, "n1", counts.n1);
    check_positive(function, "n0", counts.n0);
    check_between(function, "x1", counts.x1, 0.0, counts.n1);
    check_between(function, "x0", counts.x0, 0.0, counts.n0);
}

void check_table(std::string_view function, const TwoByTwo& table) {
    check_between(function, "true_positive", table.true_positive, 0.0, infinity);
    check_between(function, "false_positive", table.false_positive, 0.0, infinity);
    check_between(function, "false_negative", table.false_negative, 0.0, infinity);
    check_between(function, "true_negative", table.true_negative, 0.0, infinity);
}

IntervalEstimate log_interval(double log_value, double error, double level) {
    const double half = two_sided_normal_quantile(level) * error;
    return {std::exp(log_value), std::exp(log_value - half), std::exp(log_value + half)};
}

/// (x1/n1 - r x0/n0) / sqrt(V(r)): decreasing in r, 0 at the observed ratio. V is taken at the proportions p1
/// = r p0 of maximum likelihood; p0 is the smaller root of N r p0^2 - (n1 r + x1 + n0 + x0 r) p0 + x1 + x0 =
/// 0.
double score(const RatioCounts& counts, double r, double inflation) {
    const auto [x1, n1, x0, n0] = counts;
    const double square = (n1 + n0) * r;
    const double linear = n1 * r + x1 + n0 + x0 * r;
    const double constant = x1 + x0;
    const double root = std::sqrt(std::max(linear * linear - 4.0 * square * constant, 0.0));
    const double p0 = 2.0 * constant / (linear + root);  // the form of the smaller root that does not cancel
    const double p1 = r * p0;
    const double variance = std::max(0.0, p1 * (1.0 - p1) / n1 + r * r * p0 * (1.0 - p0) / n0) * inflation;
    const double difference = x1 / n1 - r * x0 / n0;
    // Both are 0 together only at the observed ratio of two proportions of 1.
    return difference == 0.0 ? 0.0 : difference / std::sqrt(variance);
}

}  // namespace

RatioCounts positive_counts(const TwoByTwo& table) {
    return {table.true_positive, table.true_positive + table.false_negative, table.false_positive,
            table.false_positive + table.true_negative};
}

RatioCounts negative_counts(const TwoByTwo& table) {
    return {table.false_negative, table.true_positive + table.false_negative, table.true_negative,
            table.false_positive + table.true_negative};
}

RatioCounts with_half_counts(const RatioCounts& counts, int bands) {
    check_counts("with_half_counts", counts);
    if (bands < 2) {
        throw DomainError("with_half_counts", "bands", std::nullopt, std::nullopt, bands, ">= 2");
    }
    const double added = 0.5 * bands;
    return {counts.x1 + 0.5, counts.n1 + added, counts.x0 + 0.5, counts.n0 + added};
}

double log_ratio_standard_error(const RatioCounts& counts) {
    check_counts("log_ratio_standard_error", counts);
    check_positive("log_ratio_standard_error", "x1", counts.x1);
    check_positive("log_ratio_standard_error", "x0", counts.x0);
    return std::sqrt((1.0 / counts.x1 - 1.0 / counts.n1) + (1.0 / counts.x0 - 1.0 / counts.n0));
}

IntervalEstimate ratio_log_interval(const RatioCounts& counts, double level) {
    const double error = log_ratio_standard_error(counts);
    const double ratio = (counts.x1 / counts.n1) / (counts.x0 / counts.n0);
    return log_interval(std::log(ratio), error, level);
}

IntervalEstimate ratio_score_interval(const RatioCounts& counts, ScoreVariance variance, double level) {
    check_counts("ratio_score_interval", counts);
    if (counts.x1 == 0.0 && counts.x0 == 0.0) {
        throw DomainError("ratio_score_interval", "x1 + x0", std::nullopt, std::nullopt, 0.0, "above 0");
    }
    const double z = two_sided_normal_quantile(level);
    const double total = counts.n1 + counts.n0;
    if (variance == ScoreVariance::miettinen_nurminen && !(total > 1.0)) {
        throw DomainError("ratio_score_interval", "n1 + n0", std::nullopt, std::nullopt, total, "above 1");
    }
    const double inflation = variance == ScoreVariance::koopman ? 1.0 : total / (total - 1.0);
    const double ratio = counts.x0 == 0.0 ? infinity : (counts.x1 / counts.n1) / (counts.x0 / counts.n0);
    const double start = ratio > 0.0 && std::isfinite(ratio) ? std::log(ratio) : 0.0;
    // On the log scale the score falls steadily, and an error of the root is a relative error of the limit.
    const auto above = [&](double log_ratio) { return score(counts, std::exp(log_ratio), inflation) - z; };
    const auto below = [&](double log_ratio) { return score(counts, std::exp(log_ratio), inflation) + z; };
    const double low = counts.x1 == 0.0 ? 0.0 : std::exp(detail::root_of_decreasing(above, start, 0.5));
    const double high = counts.x0 == 0.0 ? infinity : std::exp(detail::root_of_decreasing(below, start, 0.5));
    return {ratio, low, high};
}

std::vector<IntervalEstimate> band_ratios(const Eigen::Ref<const Eigen::ArrayXd>& with,
                                          const Eigen::Ref<const Eigen::ArrayXd>& without,
                                          ScoreVariance variance, double level) {
    if (with.size() < 2) {
        throw DomainError("band_ratios", "with size", std::nullopt, std::nullopt,
                          static_cast<double>(with.size()), ">= 2");
    }
    check_size("band_ratios", "without", without.size(), with.size());
    check_all_between("band_ratios", "with", with, 0.0, infinity);
    check_all_between("band_ratios", "without", without, 0.0, infinity);
    const double n1 = with.sum();
    const double n0 = without.sum();
    check_positive("band_ratios", "with sum", n1);
    check_positive("band_ratios", "without sum", n0);
    std::vector<IntervalEstimate> ratios;
    ratios.reserve(static_cast<std::size_t>(with.size()));
    for (Eigen::Index band = 0; band < with.size(); ++band) {
        const RatioCounts counts{with(band), n1, without(band), n0};
        if (counts.x1 == 0.0 && counts.x0 == 0.0) {
            ratios.push_back({std::numeric_limits<double>::quiet_NaN(), 0.0, infinity});
        } else {
            ratios.push_back(ratio_score_interval(counts, variance, level));
        }
    }
    return ratios;
}

TestAccuracy test_accuracy(const TwoByTwo& table, ProportionMethod method, double level) {
    check_table("test_accuracy", table);
    const auto share = [&](std::string_view name, double x, double other) {
        check_positive("test_accuracy", name, x + other);
        return method == ProportionMethod::wilson ? wilson_interval(x, x + other, level)
                                                  : exact_interval(x, x + other, level);
    };
    return {share("true_positive + false_negative", table.true_positive, table.false_negative),
            share("true_negative + false_positive", table.true_negative, table.false_positive),
            share("true_positive + false_positive", table.true_positive, table.false_positive),
            share("true_negative + false_negative", table.true_negative, table.false_negative)};
}

IntervalEstimate diagnostic_odds_ratio(const TwoByTwo& table, double level) {
    check_positive("diagnostic_odds_ratio", "true_positive", table.true_positive);
    check_positive("diagnostic_odds_ratio", "false_positive", table.false_positive);
    check_positive("diagnostic_odds_ratio", "false_negative", table.false_negative);
    check_positive("diagnostic_odds_ratio", "true_negative", table.true_negative);
    const double ratio =
        (table.true_positive / table.false_positive) * (table.true_negative / table.false_negative);
    const double error = std::sqrt(1.0 / table.true_positive + 1.0 / table.false_positive +
                                   1.0 / table.false_negative + 1.0 / table.true_negative);
    return log_interval(std::log(ratio), error, level);
}

}  // namespace steelyard::engine
