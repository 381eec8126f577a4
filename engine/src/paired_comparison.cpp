// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/paired_comparison.hpp"

#include <cmath>
#include <limits>
#include <string_view>

#include "area_order.hpp"
#include "cells.hpp"
#include "exact_sum.hpp"
#include "hand_till.hpp"
#include "placements.hpp"
#include "resampler.hpp"
#include "steelyard/engine/audit_sample.hpp"
#include "steelyard/engine/distributions.hpp"

namespace steelyard::engine {
namespace {

constexpr std::string_view name = "compare_paired";
constexpr double nan = std::numeric_limits<double>::quiet_NaN();

/// Scores of each cell under one forecast.
struct CellScores {
    Eigen::ArrayXd log_score, brier, hit;  // shape (M)

    CellScores(const AuditSample& sample, const Cells& cells)
        : log_score(cells.size()), brier(cells.size()), hit(cells.size()) {
        const Eigen::ArrayXi leader = leaders(sample);
        for (Eigen::Index c = 0; c < cells.size(); ++c) {
            const Eigen::Index g = cells.pattern(c);
            const double log_p = sample.log_forecast(g, cells.cause(c));
            log_score(c) = -log_p;
            brier(c) = (2.0 * sample.log_forecast.row(g)).exp().sum() - 2.0 * std::exp(log_p) + 1.0;
            hit(c) = leader(g) == cells.cause(c) ? 1.0 : 0.0;
        }
    }
};

double mean_of(const Eigen::ArrayXd& value, const Eigen::ArrayXd& count) {
    ExactSum sum;
    for (Eigen::Index c = 0; c < value.size(); ++c) {
        sum.add_product(count(c), value(c));
    }
    return sum.value() / count.sum();
}

PairedDifference paired(const Eigen::ArrayXd& first, const Eigen::ArrayXd& second,
                        const Eigen::ArrayXd& count) {
    const double n = count.sum();
    const Eigen::ArrayXd off = first - second;
    PairedDifference result;
    result.first = mean_of(first, count);
    result.second = mean_of(second, count);
    result.difference = mean_of(off, count);
    if (n >= 2.0) {
        const double square = mean_of((off - result.difference).square(), count) * n / (n - 1.0);
        const double error = std::sqrt(square / n);
        result.standard_error = error;
        // Below, what varies is rounding of the scores.
        if (error > 1e-14 * (1.0 + std::abs(result.first))) {
            result.t = result.difference / error;
            result.p_two_sided = 2.0 * student_t_upper(std::abs(*result.t), n - 1.0);
        }
    }
    return result;
}

std::optional<AreaDifference> area_difference(const AuditSample& first, const AuditSample& second,
                                              Eigen::Index cause) {
    const Eigen::ArrayXd cases = first.count.col(cause);
    const Eigen::ArrayXd others = first.pattern_counts() - cases;
    const double m = cases.sum();
    const double n = others.sum();
    if (!(m > 0.0 && n > 0.0)) {
        return std::nullopt;
    }
    const Placements one = placements(log_odds_against_rest(first, cause), cases, others);
    const Placements two = placements(log_odds_against_rest(second, cause), cases, others);
    AreaDifference result;
    result.first = one.area;
    result.second = two.area;
    result.difference = one.area - two.area;
    if (m >= 2.0 && n >= 2.0) {
        const Eigen::ArrayXd of_case = one.of_case - two.of_case;
        const Eigen::ArrayXd of_other = one.of_other - two.of_other;
        const double variance = sample_covariance(of_case, of_case, cases) / m +
                                sample_covariance(of_other, of_other, others) / n;
        if (variance > 1e-28) {
            result.standard_error = std::sqrt(variance);
            result.z = result.difference / *result.standard_error;
            result.p_two_sided = 2.0 * normal_upper(std::abs(*result.z));
        }
    }
    return result;
}

}  // namespace

PairedComparison compare_paired(const PairedSample& sample, const ResamplingOptions& options) {
    const AuditSample first{sample.log_forecast, sample.count};
    const AuditSample second{sample.other_log_forecast, sample.count};
    check_audit_sample(name, first);
    check_audit_sample(name, second);
    check_resampling(name, sample.count.reshaped(), options);
    const Eigen::Index causes = first.causes();
    const Cells cells(sample.count);
    const CellScores one(first, cells);
    const CellScores two(second, cells);
    PairedComparison result;
    result.log_score = paired(one.log_score, two.log_score, cells.count);
    result.brier = paired(one.brier, two.brier, cells.count);
    result.top_1 = paired(one.hit, two.hit, cells.count);
    for (Eigen::Index k = 0; k < causes; ++k) {
        result.area.push_back(area_difference(first, second, k));
    }
    const AreaOrder order_one(first, cells);
    const AreaOrder order_two(second, cells);
    Eigen::ArrayXXd wins;
    order_one.wins(cells.count, wins);
    const HandTill of_one = hand_till(wins, first.cause_counts());
    order_two.wins(cells.count, wins);
    const HandTill of_two = hand_till(wins, first.cause_counts());
    if (of_one.pairs > 0) {
        result.hand_till = HandTillDifference{of_one.mean, of_two.mean, of_one.mean - of_two.mean, {}};
    }

    Eigen::MatrixXd off(3, cells.size());
    off << (one.log_score - two.log_score).matrix().transpose(), (one.brier - two.brier).matrix().transpose(),
        (one.hit - two.hit).matrix().transpose();
    const auto evaluate = [&](const Eigen::MatrixXd& weights, Eigen::Ref<Eigen::ArrayXXd> figures) {
        figures.topRows(3) = (off * weights / cells.count.sum()).array();
        Eigen::ArrayXXd wins_one, wins_two;
        for (Eigen::Index r = 0; r < weights.cols(); ++r) {
            Eigen::ArrayXd cases = Eigen::ArrayXd::Zero(causes);
            for (Eigen::Index c = 0; c < cells.size(); ++c) {
                cases(cells.cause(c)) += weights(c, r);
            }
            order_one.wins(weights.col(r).array(), wins_one);
            order_two.wins(weights.col(r).array(), wins_two);
            for (Eigen::Index k = 0; k < causes; ++k) {
                const double possible = cases(k) * (cases.sum() - cases(k));
                figures(4 + k, r) =
                    possible > 0.0 ? (wins_one.row(k) - wins_two.row(k)).sum() / possible : nan;
            }
            const HandTill mean_one = hand_till(wins_one, cases);
            const HandTill mean_two = hand_till(wins_two, cases);
            figures(3, r) = mean_one.pairs == of_one.pairs ? mean_one.mean - mean_two.mean : nan;
        }
    };
    const Eigen::ArrayXXd replicates = resample(cells.count, options, 4 + causes, evaluate);
    const auto interval = [&](Eigen::Index figure) {
        return percentile_interval(replicates.col(figure), options.level);
    };
    result.log_score.interval = interval(0);
    result.brier.interval = interval(1);
    result.top_1.interval = interval(2);
    if (result.hand_till) {
        result.hand_till->interval = interval(3);
    }
    for (Eigen::Index k = 0; k < causes; ++k) {
        if (auto& area = result.area[static_cast<std::size_t>(k)]) {
            area->interval = interval(4 + k);
        }
    }
    return result;
}

}  // namespace steelyard::engine
