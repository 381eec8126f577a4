// SPDX-License-Identifier: Apache-2.0
#include "uncertain_case.hpp"

#include <algorithm>
#include <cmath>
#include <optional>

namespace steelyard::cli {
namespace {

using likelihoods::EvidenceRow;
using likelihoods::EvidenceTable;

/// The number of a row among all rows of the set: its stream, the same in every case.
std::uint32_t number_of(const likelihoods::TableSet& tables, std::size_t table, const EvidenceRow& row) {
    std::size_t number = 0;
    for (std::size_t i = 0; i < table; ++i) {
        number += tables.tables[i].rows.size();
    }
    return static_cast<std::uint32_t>(number +
                                      static_cast<std::size_t>(&row - tables.tables[table].rows.data()));
}

engine::UncertainPrior uncertain_prior(const priors::PriorSet& set, const priors::PriorCause& cause) {
    engine::UncertainPrior prior;
    const bool odds = set.given_as == priors::GivenAs::odds_against_rest;
    if (cause.range_low && cause.range_high && cause.given > 0.0) {
        prior.log_value = std::log(cause.given);
        prior.law = engine::RangedPrior{std::log(*cause.range_low), std::log(*cause.range_high), odds};
        return prior;
    }
    if (odds) {
        prior.log_value = std::log(cause.given / (1.0 + cause.given));
        return prior;
    }
    if (set.given_as == priors::GivenAs::counts) {
        const double patients = cause.given + 0.5;  // Jeffreys' start, as in the probability itself
        prior.log_value = std::log(patients);
        prior.law = engine::CountedPrior{patients};
        return prior;
    }
    prior.log_value = std::log(cause.given);
    if (set.worth > 0.0) {
        prior.law = engine::CountedPrior{set.worth * cause.probability};
    }
    return prior;
}

/// Adds the row that a cause takes, and first the one its ratios are against; a row already there is used
/// again.
class RowList {
  public:
    RowList(const CaseModel& model, const likelihoods::FindingReading& reading, UncertainCase& result)
        : model_(model), reading_(reading), table_(model.tables().tables[reading.table]), result_(result) {}

    std::size_t index_of(const EvidenceRow& row) {
        const auto found = std::find(result_.rows.begin(), result_.rows.end(), &row);
        if (found != result_.rows.end()) {
            return static_cast<std::size_t>(found - result_.rows.begin());
        }
        std::optional<std::size_t> reference;
        if (!row.against.empty()) {
            reference = index_of(likelihoods::row_of(model_.tables(), table_, row.against));
        }
        double share = 0.0;
        for (const Eigen::Index cell : reading_.cells) {
            share += row.compiled.probability(cell);
        }
        // Nobody knows from judgement that a band cannot happen: a judged share is not drawn below `least`.
        const double least = document::is_judged(row.grounds.basis) ? table_.least : 0.0;
        result_.problem.rows.push_back({row.compiled.law, reading_.cells, std::log(std::min(share, 1.0)),
                                        reference, number_of(model_.tables(), reading_.table, row),
                                        std::min(least, share)});
        result_.rows.push_back(&row);
        return result_.rows.size() - 1;
    }

  private:
    const CaseModel& model_;
    const likelihoods::FindingReading& reading_;
    const EvidenceTable& table_;
    UncertainCase& result_;
};

}  // namespace

UncertainCase uncertain_case(const CaseModel& model, const priors::PriorSet& priors,
                             const likelihoods::Pattern& pattern) {
    UncertainCase result;
    const std::vector<std::string>& ids = model.causes();
    for (const std::string& id : ids) {
        engine::UncertainPrior prior = uncertain_prior(priors, *priors.find(id));
        prior.stream =
            static_cast<std::uint32_t>(model.tables().find_cause(id) - model.tables().causes.data());
        result.problem.priors.push_back(prior);
    }
    std::vector<double> weights;
    for (std::size_t i = 0; i < pattern.findings.size(); ++i) {
        if (pattern.findings[i].use == likelihoods::Use::read) {
            result.findings.push_back(i);
            weights.push_back(pattern.findings[i].weight);
        }
    }
    const auto findings = static_cast<Eigen::Index>(weights.size());
    result.problem.weight = Eigen::Map<const Eigen::ArrayXd>(weights.data(), findings);
    result.problem.row_of.resize(findings, static_cast<Eigen::Index>(ids.size()));
    for (Eigen::Index f = 0; f < findings; ++f) {
        const likelihoods::FindingReading& reading =
            pattern.findings[result.findings[static_cast<std::size_t>(f)]];
        const EvidenceTable& table = model.tables().tables[reading.table];
        RowList rows(model, reading, result);
        for (std::size_t k = 0; k < ids.size(); ++k) {
            result.problem.row_of(f, static_cast<Eigen::Index>(k)) =
                static_cast<int>(rows.index_of(likelihoods::row_of(model.tables(), table, ids[k])));
        }
    }
    return result;
}

}  // namespace steelyard::cli
