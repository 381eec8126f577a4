// SPDX-License-Identifier: Apache-2.0
#include "steelyard/cli/sensitivity.hpp"

#include <algorithm>
#include <cmath>
#include <set>

#include "sensitivity_parts.hpp"
#include "steelyard/engine/distributions.hpp"
#include "steelyard/engine/evidence_factor.hpp"
#include "steelyard/engine/information.hpp"
#include "steelyard/engine/posterior.hpp"
#include "steelyard/engine/prior_range.hpp"
#include "steelyard/engine/prior_sensitivity.hpp"

namespace steelyard::cli {
namespace {

using engine::CauseIndex;
using likelihoods::FindingReading;
using likelihoods::Pattern;
using likelihoods::TableSet;
using likelihoods::Use;

CauseIndex cause_index(std::size_t index) {
    return CauseIndex{static_cast<Eigen::Index>(index)};
}

std::vector<WithoutFinding> without_each(const CaseModel& model, const Pattern& pattern) {
    std::vector<WithoutFinding> list;
    for (std::size_t i = 0; i < pattern.findings.size(); ++i) {
        if (pattern.findings[i].use != Use::read) {
            continue;
        }
        const Eigen::ArrayXd posterior =
            model.posterior(likelihoods::reread(model.tables(), pattern, {{i, {}}}));
        list.push_back({model.tables().tables[i].finding, static_cast<std::size_t>(leader_of(posterior)),
                        per_cause(posterior)});
    }
    return list;
}

std::vector<Tipping> tipping_priors(const CaseModel& model, const Weighing& weighing,
                                    const Eigen::ArrayXd& log_likelihood) {
    std::vector<Tipping> list;
    for (std::size_t i = 1; i < weighing.ranking.size(); ++i) {
        const engine::TippingPrior tipping =
            engine::tipping_prior(model.log_prior(), log_likelihood, cause_index(weighing.ranking[0]),
                                  cause_index(weighing.ranking[i]));
        list.push_back(
            {weighing.ranking[i], tipping.prior.to_probability().value(), tipping.odds_factor.to_ratio()});
    }
    return list;
}

/// Priors from rare to nearly certain, evenly spread in odds.
const std::vector<double>& sweep_priors() {
    static const std::vector<double> priors = {0.01, 0.02, 0.05, 0.1,  0.2,  0.3, 0.5,
                                               0.7,  0.8,  0.9,  0.95, 0.98, 0.99};
    return priors;
}

std::vector<PriorSweep> prior_sweeps(const CaseModel& model, const Eigen::ArrayXd& log_likelihood) {
    const std::vector<double>& priors = sweep_priors();
    const Eigen::ArrayXd grid =
        Eigen::Map<const Eigen::ArrayXd>(priors.data(), static_cast<Eigen::Index>(priors.size()));
    std::vector<PriorSweep> list;
    for (std::size_t k = 0; k < model.causes().size(); ++k) {
        const Eigen::ArrayXXd swept =
            engine::prior_sweep(model.log_prior(), log_likelihood, cause_index(k), grid);
        PriorSweep sweep{k, priors, {}};
        for (Eigen::Index g = 0; g < swept.cols(); ++g) {
            sweep.posterior.push_back(per_cause(swept.col(g)));
        }
        list.push_back(std::move(sweep));
    }
    return list;
}

std::vector<RowFactor> row_factors(const CaseModel& model, const Weighing& weighing,
                                   const UncertainCase& uncertain,
                                   const engine::UncertainPosterior& posterior,
                                   const Eigen::ArrayXd& log_scores) {
    const engine::UncertainProblem& problem = uncertain.problem;
    std::vector<RowFactor> list;
    for (Eigen::Index f = 0; f < problem.row_of.rows(); ++f) {
        const FindingReading& reading =
            weighing.pattern.findings[uncertain.findings[static_cast<std::size_t>(f)]];
        std::set<int> seen;
        for (Eigen::Index k = 0; k < problem.row_of.cols(); ++k) {
            const int row = problem.row_of(f, k);
            if (!seen.insert(row).second) {
                continue;
            }
            RowFactor entry;
            std::vector<bool> takes;
            for (Eigen::Index other = 0; other < problem.row_of.cols(); ++other) {
                takes.push_back(problem.row_of(f, other) == row);
                if (takes.back()) {
                    entry.causes.push_back(static_cast<std::size_t>(other));
                }
            }
            const std::optional<engine::TieFactor> tie =
                engine::factor_to_tie(log_scores, takes, problem.weight(f), cause_index(weighing.ranking[0]));
            if (!tie) {
                continue;
            }
            const auto index = static_cast<std::size_t>(row);
            const double log_share = problem.rows[index].log_share;
            const engine::UncertainPosterior::LogInterval own = posterior.row_interval(index);
            entry.finding = model.tables().tables[reading.table].finding;
            entry.rival = static_cast<std::size_t>(tie->rival.value);
            entry.factor = std::exp(tie->log_factor);
            entry.low = std::exp(std::min(own.low - log_share, 0.0));
            entry.high = std::exp(std::max(own.high - log_share, 0.0));
            entry.inside = entry.low <= entry.factor && entry.factor <= entry.high;
            entry.possible = log_share + tie->log_factor <= 0.0;
            list.push_back(std::move(entry));
        }
    }
    // Nearest first: by how far the factor lies out on the row's own interval.
    const auto distance = [](const RowFactor& row) {
        const double end = row.factor < 1.0 ? std::log(row.low) : std::log(row.high);
        return end == 0.0 ? std::numeric_limits<double>::infinity() : std::log(row.factor) / end;
    };
    std::stable_sort(list.begin(), list.end(),
                     [&](const RowFactor& a, const RowFactor& b) { return distance(a) < distance(b); });
    return list;
}

/// The chance that a repeat sample of a value falls into a band in which another cause leads, and where that
/// most likely is. The repeat is normal about the value with the spread of the difference of two samples.
void chance_of_another_leader(const CaseModel& model, const Weighing& weighing, std::size_t index, double sd,
                              ValueEdge& edge) {
    const likelihoods::EvidenceTable& table = model.tables().tables[index];
    double all = 0.0;
    double most = 0.0;
    for (Eigen::Index band = 0; band < table.bands(); ++band) {
        const Eigen::ArrayXd posterior =
            model.posterior(likelihoods::reread(model.tables(), weighing.pattern, {{index, band}}));
        const auto leader = static_cast<std::size_t>(leader_of(posterior));
        if (leader == weighing.ranking[0]) {
            continue;
        }
        const auto at = static_cast<std::size_t>(band);
        const auto below = [&](double limit) {
            return engine::normal_lower((limit - edge.value) / (std::sqrt(2.0) * sd));
        };
        const double chance = (at == table.edges.size() ? 1.0 : below(table.edges[at])) -
                              (at == 0 ? 0.0 : below(table.edges[at - 1]));
        all += chance;
        if (chance > most) {
            most = chance;
            edge.other_band = band;
            edge.other_leader = leader;
        }
    }
    edge.chance_other = all;
}

std::vector<ValueEdge> value_edges(const CaseModel& model, const Weighing& weighing) {
    std::vector<ValueEdge> list;
    const Pattern& pattern = weighing.pattern;
    for (std::size_t i = 0; i < pattern.findings.size(); ++i) {
        const FindingReading& reading = pattern.findings[i];
        const likelihoods::EvidenceTable& table = model.tables().tables[i];
        if (reading.use != Use::read || !reading.value || !reading.value->is_point() || table.edges.empty()) {
            continue;
        }
        ValueEdge edge;
        edge.finding = table.finding;
        edge.value = reading.value->low;
        edge.nearest = likelihoods::nearest_edge(edge.value, table.edges);
        edge.band = table.band_names[static_cast<std::size_t>(edge.nearest.band_beyond)];
        const Eigen::ArrayXd posterior =
            model.posterior(likelihoods::reread(model.tables(), pattern, {{i, edge.nearest.band_beyond}}));
        edge.leader = static_cast<std::size_t>(leader_of(posterior));
        edge.posterior = per_cause(posterior);
        const likelihoods::SpreadResult spread =
            likelihoods::spread_of(model.tables(), weighing.panel, weighing.quantities, table.finding);
        if (spread.spread) {
            edge.chance = likelihoods::chance_on_repeat(edge.value, edge.nearest.edge, spread.spread->sd);
            edge.weakest = spread.spread->weakest;
            edge.remarks = spread.spread->remarks;
            chance_of_another_leader(model, weighing, i, spread.spread->sd, edge);
        } else {
            edge.why_no_chance = spread.why_not;
        }
        list.push_back(std::move(edge));
    }
    return list;
}

}  // namespace

PerCause per_cause(const Eigen::Ref<const Eigen::ArrayXd>& values) {
    return {values.begin(), values.end()};
}

const std::vector<std::string>& burdens() {
    static const std::vector<std::string> list = {"bedside", "routine", "specialised"};
    return list;
}

Sensitivity sensitivity_of(const TableSet& tables, const priors::PriorSet& priors, const Weighing& weighing,
                           const SensitivityOptions& options) {
    const CaseModel model(tables, weighing.causes);
    const Pattern& pattern = weighing.pattern;
    const CaseModel::Evidence evidence = model.evidence(pattern);
    const Eigen::ArrayXd log_likelihood = evidence.log_likelihood();
    const std::size_t leader = weighing.ranking[0];
    const UncertainCase uncertain = uncertain_case(model, priors, pattern);
    const engine::UncertainPosterior drawn(uncertain.problem);

    Sensitivity result;
    result.seed = options.seed;
    engine::SpreadOptions spread;
    spread.seed = options.seed;
    spread.draws = options.draws;
    spread.threads = options.threads;
    spread.progress = options.progress;
    result.spread = engine::posterior_spread(drawn, spread);
    for (std::size_t k = 0; k < weighing.causes.size(); ++k) {
        // The mean of a lopsided law may lie beyond its outer percentile.
        const auto at = static_cast<Eigen::Index>(k);
        result.spread.low(at) = std::min(result.spread.low(at), weighing.causes[k].posterior);
        result.spread.high(at) = std::max(result.spread.high(at), weighing.causes[k].posterior);
    }

    result.without = without_each(model, pattern);
    result.tipping = tipping_priors(model, weighing, log_likelihood);
    if (options.until) {
        result.until = Until{*options.until, {}};
        if (*options.until > std::min(weighing.causes[leader].prior, weighing.causes[leader].posterior)) {
            result.until->prior =
                engine::prior_for_posterior(model.log_prior(), log_likelihood, cause_index(leader),
                                            engine::Probability::of(*options.until))
                    .to_probability()
                    .value();
        }
    }
    result.sweeps = prior_sweeps(model, log_likelihood);
    const Eigen::ArrayXd log_scores = engine::log_scores(model.log_prior(), evidence.loglik, evidence.weight);
    result.rows = row_factors(model, weighing, uncertain, drawn, log_scores);
    result.edges = value_edges(model, weighing);
    StatedRange range = stated_range(model, priors, log_likelihood);
    result.range = std::move(range.range);
    result.range_narrowed = range.narrowed;
    result.epsilon = options.epsilon;
    if (options.epsilon) {
        result.contamination =
            cause_ranges(engine::range_of_contamination(model.log_prior(), *options.epsilon, log_likelihood));
    }
    result.variance = variance_by_source(model, uncertain, drawn, pattern, static_cast<Eigen::Index>(leader),
                                         options.seed, options.threads);
    result.fit = fit_of(model, weighing, options.seed);
    find_next_tests(model, weighing, options.burden, result);
    return result;
}

}  // namespace steelyard::cli
