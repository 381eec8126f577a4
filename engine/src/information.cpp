// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/information.hpp"

#include <algorithm>
#include <cmath>
#include <limits>
#include <numbers>
#include <string_view>
#include <utility>

#include "band_table.hpp"
#include "guards.hpp"
#include "steelyard/engine/domain_error.hpp"
#include "steelyard/engine/log_math.hpp"

namespace steelyard::engine {
namespace {

constexpr double infinity = std::numeric_limits<double>::infinity();
constexpr double leader_tie = 1e-12;     // relative
constexpr double least_weight = 1e-200;  // below this a sum of shifted exponentials may have lost its terms

double p_log_p(double p) {
    return p > 0.0 ? p * std::log(p) : 0.0;
}

/// Entropy in nats of probabilities in any array.
double entropy(const Eigen::Ref<const Eigen::ArrayXXd>& probability) {
    double sum = 0.0;
    for (Eigen::Index column = 0; column < probability.cols(); ++column) {
        for (Eigen::Index row = 0; row < probability.rows(); ++row) {
            sum -= p_log_p(probability(row, column));
        }
    }
    return sum;
}

/// H(F | cause) of each cause [nats]; shape (K).
Eigen::ArrayXd entropy_given_cause(const Eigen::Ref<const Eigen::ArrayXXd>& rows) {
    Eigen::ArrayXd result(rows.cols());
    for (Eigen::Index k = 0; k < rows.cols(); ++k) {
        result(k) = entropy(rows.col(k));
    }
    return result;
}

Eigen::ArrayXd predictive(const Eigen::Ref<const Eigen::ArrayXd>& now,
                          const Eigen::Ref<const Eigen::ArrayXXd>& rows) {
    return (rows.matrix() * now.matrix()).array();
}

/// P(b, c) = sum_k now_k first(b, k) second(c, k); shape (B1, B2).
Eigen::ArrayXXd joint_predictive(const Eigen::Ref<const Eigen::ArrayXd>& now,
                                 const Eigen::Ref<const Eigen::ArrayXXd>& first,
                                 const Eigen::Ref<const Eigen::ArrayXXd>& second) {
    const Eigen::ArrayXXd weighed = first.rowwise() * now.transpose();
    return weighed.matrix().lazyProduct(second.matrix().transpose()).array();
}

double bits_not_negative(double nats) {
    return std::max(0.0, nats / std::numbers::ln2);
}

/// I(C; F) [nats], up to round-off: the mutual information is symmetric, and H(F) - H(F | C) takes fewer
/// logarithms than the entropies of the posteriors.
double information(const Eigen::Ref<const Eigen::ArrayXd>& now,
                   const Eigen::Ref<const Eigen::ArrayXd>& band_probability,
                   const Eigen::Ref<const Eigen::ArrayXd>& given_cause) {
    return entropy(band_probability) - (now * given_cause).sum();
}

/// @param given_cause  H(F | cause) + H(G | cause) [nats]; shape (K)
double pair_bits(const Eigen::Ref<const Eigen::ArrayXd>& now, const Eigen::Ref<const Eigen::ArrayXXd>& first,
                 const Eigen::Ref<const Eigen::ArrayXXd>& second,
                 const Eigen::Ref<const Eigen::ArrayXd>& given_cause) {
    return bits_not_negative(entropy(joint_predictive(now, first, second)) - (now * given_cause).sum());
}

/// Where the first entry within information_tie of the largest stands.
Eigen::Index place_of_best(const Eigen::Ref<const Eigen::ArrayXd>& bits) {
    const double enough = bits.maxCoeff() - information_tie;
    Eigen::Index place = 0;
    while (bits(place) < enough) {
        ++place;
    }
    return place;
}

void check_findings(std::string_view function, const Eigen::Ref<const Eigen::ArrayXd>& now,
                    const std::vector<Eigen::ArrayXXd>& findings) {
    check_causes(function, "now", now);
    check_size_at_least(function, "findings", static_cast<Eigen::Index>(findings.size()), 2);
    for (const Eigen::ArrayXXd& rows : findings) {
        check_band_table(function, "findings", rows, now.size());
    }
}

/// H(F | cause) of every finding, one column each; shape (K, F).
Eigen::ArrayXXd entropies_given_cause(const std::vector<Eigen::ArrayXXd>& findings, Eigen::Index causes) {
    Eigen::ArrayXXd result(causes, static_cast<Eigen::Index>(findings.size()));
    for (std::size_t f = 0; f < findings.size(); ++f) {
        result.col(static_cast<Eigen::Index>(f)) = entropy_given_cause(findings[f]);
    }
    return result;
}

double chance_of_change(const Eigen::Ref<const Eigen::ArrayXd>& band_probability,
                        const Eigen::Ref<const Eigen::ArrayXXd>& after, CauseIndex leader) {
    double chance = 0.0;
    for (Eigen::Index band = 0; band < after.cols(); ++band) {
        if (after.col(band).maxCoeff() > after(leader.value, band) * (1.0 + leader_tie)) {
            chance += band_probability(band);
        }
    }
    return std::min(chance, 1.0);
}

/// Log-scores of a finding's bands in two parts: the largest of each band, and what the others are below it.
struct ShiftedScores {
    explicit ShiftedScores(Eigen::ArrayXXd scores) : below(std::move(scores)) {  // shape (K, B)
        below.rowwise() -= below.colwise().maxCoeff().eval();
        weight = below.exp();
    }
    Eigen::ArrayXXd below;   ///< [nats], <= 0
    Eigen::ArrayXXd weight;  ///< exp(below)
};

/// Entropy [nats] of the posterior proportional to the product of two columns of weights, without a logarithm
/// a cause: ln S - sum w s / S with w = exp(s), S = sum w.
double entropy_of_product(const ShiftedScores& first, Eigen::Index b, const ShiftedScores& second,
                          Eigen::Index c) {
    double sum = 0.0;
    double moment = 0.0;
    for (Eigen::Index k = 0; k < first.weight.rows(); ++k) {
        const double weight = first.weight(k, b) * second.weight(k, c);
        sum += weight;
        moment += weight > 0.0 ? weight * (first.below(k, b) + second.below(k, c)) : 0.0;
    }
    if (sum >= least_weight) {
        return std::log(sum) - moment / sum;
    }
    // The two findings exclude each other's causes so strongly that the products underflow.
    return entropy(softmax(first.below.col(b) + second.below.col(c)));
}

}  // namespace

double entropy_bits(const Eigen::Ref<const Eigen::ArrayXd>& probability) {
    check_causes("entropy_bits", "probability", probability);
    return bits_not_negative(entropy(probability));
}

double divergence_bits(const Eigen::Ref<const Eigen::ArrayXd>& p, const Eigen::Ref<const Eigen::ArrayXd>& q) {
    check_causes("divergence_bits", "p", p);
    check_size("divergence_bits", "q", q.size(), p.size());
    check_causes("divergence_bits", "q", q);
    double sum = 0.0;
    for (Eigen::Index k = 0; k < p.size(); ++k) {
        if (p(k) > 0.0) {
            if (!(q(k) > 0.0)) {
                return infinity;  // q excludes what p allows
            }
            sum += p(k) * (std::log(p(k)) - std::log(q(k)));
        }
    }
    return bits_not_negative(sum);
}

ExpectedInformation expected_information(const Eigen::Ref<const Eigen::ArrayXd>& now,
                                         const Eigen::Ref<const Eigen::ArrayXXd>& rows) {
    check_causes("expected_information", "now", now);
    check_band_table("expected_information", "rows", rows, now.size());
    ExpectedInformation result;
    result.band_probability = predictive(now, rows);
    result.bits = bits_not_negative(information(now, result.band_probability, entropy_given_cause(rows)));
    result.after.resize(now.size(), rows.rows());
    for (Eigen::Index band = 0; band < rows.rows(); ++band) {
        result.after.col(band) = now * rows.row(band).transpose();
        const double sum = result.after.col(band).sum();
        if (sum > 0.0) {
            result.after.col(band) /= sum;
        } else {
            result.after.col(band) = now;
        }
    }
    return result;
}

double leader_change_chance(const Eigen::Ref<const Eigen::ArrayXd>& band_probability,
                            const Eigen::Ref<const Eigen::ArrayXXd>& after, CauseIndex leader) {
    check_causes("leader_change_chance", "band_probability", band_probability);
    check_size_at_least("leader_change_chance", "after rows", after.rows(), 1);
    check_size("leader_change_chance", "after columns", after.cols(), band_probability.size());
    check_columns_sum_to_one("leader_change_chance", "after", after);
    check_index("leader_change_chance", "leader", leader.value, after.rows());
    return chance_of_change(band_probability, after, leader);
}

ReweightedInformation reweighted_information(const Eigen::Ref<const Eigen::ArrayXd>& now,
                                             const Eigen::Ref<const Eigen::ArrayXXd>& rows,
                                             const Eigen::Ref<const Eigen::ArrayXXd>& after,
                                             CauseIndex leader) {
    check_causes("reweighted_information", "now", now);
    check_band_table("reweighted_information", "rows", rows, now.size());
    check_size("reweighted_information", "after rows", after.rows(), now.size());
    check_size("reweighted_information", "after columns", after.cols(), rows.rows());
    check_columns_sum_to_one("reweighted_information", "after", after);
    check_index("reweighted_information", "leader", leader.value, now.size());
    ReweightedInformation result;
    result.band_probability = predictive(now, rows);
    double expected = 0.0;
    for (Eigen::Index band = 0; band < after.cols(); ++band) {
        expected += result.band_probability(band) * entropy(after.col(band));
    }
    result.bits = bits_not_negative(entropy(now) - expected);
    result.leader_changes = chance_of_change(result.band_probability, after, leader);
    return result;
}

double pair_information(const Eigen::Ref<const Eigen::ArrayXd>& now,
                        const Eigen::Ref<const Eigen::ArrayXXd>& first,
                        const Eigen::Ref<const Eigen::ArrayXXd>& second) {
    check_causes("pair_information", "now", now);
    check_band_table("pair_information", "first", first, now.size());
    check_band_table("pair_information", "second", second, now.size());
    return pair_bits(now, first, second, entropy_given_cause(first) + entropy_given_cause(second));
}

PairEntropy reweighted_pair_entropy(const Eigen::Ref<const Eigen::ArrayXd>& now,
                                    const Eigen::Ref<const Eigen::ArrayXd>& log_base,
                                    const Eigen::Ref<const Eigen::ArrayXXd>& first_loglik,
                                    const Eigen::Ref<const Eigen::ArrayXXd>& second_loglik,
                                    const Eigen::Ref<const Eigen::ArrayXXd>& first_rows,
                                    const Eigen::Ref<const Eigen::ArrayXXd>& second_rows) {
    constexpr std::string_view name = "reweighted_pair_entropy";
    check_causes(name, "now", now);
    check_size(name, "log_base", log_base.size(), now.size());
    check_all_between(name, "log_base", log_base, -infinity, infinity);
    check_band_table(name, "first_rows", first_rows, now.size());
    check_band_table(name, "second_rows", second_rows, now.size());
    check_size(name, "first_loglik rows", first_loglik.rows(), first_rows.rows());
    check_size(name, "first_loglik columns", first_loglik.cols(), now.size());
    check_size(name, "second_loglik rows", second_loglik.rows(), second_rows.rows());
    check_size(name, "second_loglik columns", second_loglik.cols(), now.size());
    check_all_between(name, "first_loglik", first_loglik, -infinity, infinity);
    check_all_between(name, "second_loglik", second_loglik, -infinity, infinity);

    const Eigen::ArrayXXd base_and_first = first_loglik.transpose().colwise() + log_base;
    const ShiftedScores first(base_and_first);
    const ShiftedScores second(second_loglik.transpose());
    const Eigen::ArrayXXd joint = joint_predictive(now, first_rows, second_rows);
    PairEntropy left{Eigen::ArrayXd::Zero(joint.rows()), Eigen::ArrayXd::Zero(joint.cols())};
    for (Eigen::Index c = 0; c < joint.cols(); ++c) {
        for (Eigen::Index b = 0; b < joint.rows(); ++b) {
            const double entropy = joint(b, c) * entropy_of_product(first, b, second, c) / std::numbers::ln2;
            left.by_first(b) += entropy;
            left.by_second(c) += entropy;
        }
    }
    return left;
}

double reweighted_pair_information(const Eigen::Ref<const Eigen::ArrayXd>& now,
                                   const Eigen::Ref<const Eigen::ArrayXd>& log_base,
                                   const Eigen::Ref<const Eigen::ArrayXXd>& first_loglik,
                                   const Eigen::Ref<const Eigen::ArrayXXd>& second_loglik,
                                   const Eigen::Ref<const Eigen::ArrayXXd>& first_rows,
                                   const Eigen::Ref<const Eigen::ArrayXXd>& second_rows) {
    const PairEntropy left =
        reweighted_pair_entropy(now, log_base, first_loglik, second_loglik, first_rows, second_rows);
    return std::max(0.0, entropy(now) / std::numbers::ln2 - left.by_first.sum());
}

FindingIndex first_best(const Eigen::Ref<const Eigen::ArrayXd>& bits) {
    check_size_at_least("first_best", "bits", bits.size(), 1);
    check_all_between("first_best", "bits", bits, -infinity, infinity);
    return FindingIndex{place_of_best(bits)};
}

FindingPair best_pair(const Eigen::Ref<const Eigen::ArrayXd>& now,
                      const std::vector<Eigen::ArrayXXd>& findings) {
    check_findings("best_pair", now, findings);
    const Eigen::ArrayXXd given_cause = entropies_given_cause(findings, now.size());
    const Eigen::Index count = given_cause.cols();
    std::vector<FindingPair> pairs;
    pairs.reserve(static_cast<std::size_t>(count * (count - 1) / 2));
    for (Eigen::Index f = 0; f < count; ++f) {
        for (Eigen::Index g = f + 1; g < count; ++g) {
            const double bits =
                pair_bits(now, findings[static_cast<std::size_t>(f)], findings[static_cast<std::size_t>(g)],
                          given_cause.col(f) + given_cause.col(g));
            pairs.push_back({FindingIndex{f}, FindingIndex{g}, bits});
        }
    }
    Eigen::ArrayXd bits(static_cast<Eigen::Index>(pairs.size()));
    std::transform(pairs.begin(), pairs.end(), bits.data(),
                   [](const FindingPair& pair) { return pair.bits; });
    return pairs[static_cast<std::size_t>(place_of_best(bits))];
}

TwoStepPlan two_step_plan(const Eigen::Ref<const Eigen::ArrayXd>& now,
                          const std::vector<Eigen::ArrayXXd>& findings, FindingIndex first) {
    check_findings("two_step_plan", now, findings);
    const auto count = static_cast<Eigen::Index>(findings.size());
    check_index("two_step_plan", "first", first.value, count);
    const Eigen::ArrayXXd given_cause = entropies_given_cause(findings, now.size());
    const ExpectedInformation step =
        expected_information(now, findings[static_cast<std::size_t>(first.value)]);

    TwoStepPlan plan;
    plan.bits = step.bits;
    Eigen::ArrayXd bits(count);
    for (Eigen::Index band = 0; band < step.after.cols(); ++band) {
        if (!(step.band_probability(band) > 0.0)) {
            plan.second.emplace_back();
            continue;
        }
        const Eigen::ArrayXd after = step.after.col(band);
        for (Eigen::Index f = 0; f < count; ++f) {
            const Eigen::ArrayXd outcome = predictive(after, findings[static_cast<std::size_t>(f)]);
            bits(f) = f == first.value ? -infinity
                                       : bits_not_negative(information(after, outcome, given_cause.col(f)));
        }
        const Eigen::Index best = place_of_best(bits);
        plan.second.emplace_back(FindingIndex{best});
        plan.bits += step.band_probability(band) * bits(best);
    }
    return plan;
}

}  // namespace steelyard::engine
