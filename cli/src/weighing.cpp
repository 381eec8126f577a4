// SPDX-License-Identifier: Apache-2.0
#include "steelyard/cli/weighing.hpp"

#include <algorithm>
#include <cmath>
#include <map>
#include <numeric>

#include "steelyard/engine/ledger.hpp"
#include "steelyard/engine/posterior.hpp"

namespace steelyard::cli {
namespace {

using likelihoods::Use;

/// A line is the difference of two rows and rests on the weaker of them: Basis is ordered from study to
/// memory.
WeightByBasis weight_by_basis(const likelihoods::TableSet& tables, const std::vector<LedgerEntry>& ledger,
                              const std::string& leader, const std::string& runner_up) {
    std::map<document::Basis, double> sums;
    double total = 0.0;
    for (const LedgerEntry& entry : ledger) {
        if (entry.reading.use == Use::read) {
            const double weight = std::abs(entry.nats);
            total += weight;
            sums[std::max(likelihoods::row_of(tables, *entry.table, leader).grounds.basis,
                          likelihoods::row_of(tables, *entry.table, runner_up).grounds.basis)] += weight;
        }
    }
    WeightByBasis result;
    if (total > 0.0) {
        for (const auto& [basis, sum] : sums) {
            result.shares.emplace_back(basis, sum / total);
        }
    }
    return result;
}

void weigh_findings(const likelihoods::TableSet& tables, const likelihoods::Pattern& pattern,
                    Weighing& result) {
    std::vector<std::string> ids;
    Eigen::ArrayXd log_prior(static_cast<Eigen::Index>(result.causes.size()));
    for (std::size_t k = 0; k < result.causes.size(); ++k) {
        ids.push_back(result.causes[k].id);
        log_prior(static_cast<Eigen::Index>(k)) = std::log(result.causes[k].prior);
    }
    const Eigen::ArrayXXd loglik = likelihoods::log_likelihood_rows(tables, pattern, ids);
    const Eigen::ArrayXd weights = likelihoods::row_weights(pattern);
    const Eigen::ArrayXd probability = engine::posterior(log_prior, loglik, weights);
    const engine::Ledger ledger = engine::ledger(log_prior, loglik, weights);

    for (std::size_t k = 0; k < result.causes.size(); ++k) {
        result.causes[k].posterior = probability(static_cast<Eigen::Index>(k));
    }
    result.ranking = ranked(engine::log_scores(log_prior, loglik, weights));

    const auto leader = static_cast<Eigen::Index>(result.ranking[0]);
    const auto runner_up = static_cast<Eigen::Index>(result.ranking[1]);
    const engine::Ledger::Pair pair = ledger.pair(leader, runner_up);
    result.prior_nats = pair.prior;
    result.total_nats = pair.total;

    Eigen::Index row = 0;
    for (const likelihoods::FindingReading& reading : pattern.findings) {
        const likelihoods::EvidenceTable& table = tables.tables[reading.table];
        if (reading.use == Use::missing) {
            result.missing.push_back({table.finding, reading.barred});
            continue;
        }
        LedgerEntry entry{reading, &table, {}, 0.0};
        if (reading.use == Use::read) {
            for (Eigen::Index k = 0; k < loglik.cols(); ++k) {
                entry.log_likelihood.push_back(loglik(row, k));
            }
            entry.nats = pair.lines(row);
            ++row;
        }
        result.ledger.push_back(std::move(entry));
    }
    result.by_basis = weight_by_basis(tables, result.ledger, ids[static_cast<std::size_t>(leader)],
                                      ids[static_cast<std::size_t>(runner_up)]);
}

}  // namespace

std::vector<WeighedCause> causes_to_weigh(const likelihoods::TableSet& tables, const priors::PriorSet& priors,
                                          const WeighOptions& options, std::vector<LeftOut>& left_out) {
    std::vector<WeighedCause> causes;
    for (const likelihoods::Cause& cause : tables.causes) {
        if (const priors::PriorCause* prior = priors.find(cause.id)) {
            causes.push_back({cause.id, cause.title, cause.parts, prior->probability, 0.0});
        } else {
            const bool asked = std::find(options.excluded.begin(), options.excluded.end(), cause.id) !=
                               options.excluded.end();
            left_out.push_back({cause.id, cause.title,
                                asked ? "excluded on the command line" : "the prior set does not name it"});
        }
    }
    return causes;
}

std::vector<std::size_t> ranked(const Eigen::ArrayXd& log_scores) {
    std::vector<std::size_t> ranking(static_cast<std::size_t>(log_scores.size()));
    std::iota(ranking.begin(), ranking.end(), std::size_t{0});
    std::stable_sort(ranking.begin(), ranking.end(), [&](std::size_t a, std::size_t b) {
        return log_scores(static_cast<Eigen::Index>(a)) > log_scores(static_cast<Eigen::Index>(b));
    });
    return ranking;
}

Weighing weigh_case(const likelihoods::TableSet& tables, const priors::PriorSet& priors,
                    likelihoods::Panel panel, const WeighOptions& options) {
    Weighing result;
    result.quantities = likelihoods::derive(panel, tables.gate.chemistry);
    result.urgent = likelihoods::urgent_values(result.quantities, tables.urgent);
    result.gate = likelihoods::gate(panel, result.quantities, tables.gate);
    const bool out_of_scope = result.gate.status == likelihoods::GateStatus::out_of_scope;
    result.weighed = !out_of_scope || options.weigh_anyway;
    result.weighed_anyway = out_of_scope && options.weigh_anyway;

    std::vector<WeighedCause> causes = causes_to_weigh(tables, priors, options, result.left_out);
    result.pattern = likelihoods::read_pattern(tables, panel, result.quantities);
    const likelihoods::Pattern& pattern = result.pattern;
    result.unread = pattern.unread;
    if (result.weighed) {
        result.causes = std::move(causes);
        weigh_findings(tables, pattern, result);
    } else {
        for (const likelihoods::FindingReading& reading : pattern.findings) {
            if (reading.use == Use::missing) {
                result.missing.push_back({tables.tables[reading.table].finding, reading.barred});
            }
        }
    }
    result.panel = std::move(panel);
    return result;
}

}  // namespace steelyard::cli
