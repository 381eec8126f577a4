// SPDX-License-Identifier: Apache-2.0
#pragma once
// One case from panel to posterior: the one place where tables, priors and the engine meet. No input or
// output here; readers make the panel, report writers show the result.

#include <optional>
#include <string>
#include <utility>
#include <vector>

#include "steelyard/likelihoods/pattern.hpp"
#include "steelyard/priors/prior_set.hpp"

namespace steelyard::cli {

struct WeighedCause {
    std::string id;
    std::string title;
    std::vector<std::string> parts;  ///< of a composite
    double prior = 0.0;              ///< probability
    double posterior = 0.0;          ///< probability
};

/// A cause of the tables that was not weighed, and why, in words.
struct LeftOut {
    std::string id;
    std::string title;
    std::string why;
};

/// A finding of the tables that is not known; `barred` says why it could not be read in this case even if it
/// were.
struct MissingFinding {
    std::string id;
    std::string barred;
};

/// One finding of the ledger.
struct LedgerEntry {
    likelihoods::FindingReading reading;
    const likelihoods::EvidenceTable* table = nullptr;
    std::vector<double>
        log_likelihood;  ///< per weighed cause [nats], before the group's weight; empty when not read
    double nats = 0.0;   ///< group weight times the difference of leader and runner-up
};

/// How much of the weight between leader and runner-up rests on what kind of evidence; shares sum to 1.
struct WeightByBasis {
    std::vector<std::pair<document::Basis, double>> shares;
};

struct Weighing {
    likelihoods::Panel panel;
    likelihoods::Quantities quantities;
    likelihoods::Pattern pattern;
    std::vector<likelihoods::UrgentValue> urgent;
    likelihoods::GateResult gate;
    bool weighed = false;              ///< false: out of scope, and not weighed anyway
    bool weighed_anyway = false;       ///< out of scope, but asked for
    std::vector<WeighedCause> causes;  ///< in the order of the tables; empty when not weighed
    std::vector<LeftOut> left_out;
    std::vector<LedgerEntry> ledger;      ///< findings read or set aside, in the order of the tables
    std::vector<MissingFinding> missing;  ///< findings not known for this case
    std::vector<std::string> unread;      ///< entries of the case that nothing here reads
    std::vector<std::size_t>
        ranking;              ///< indices into `causes`, most probable first; ties in order of the tables
    double prior_nats = 0.0;  ///< ln of the prior odds of leader against runner-up
    double total_nats = 0.0;  ///< ln of their posterior odds: the sum of prior_nats and all lines
    WeightByBasis by_basis;
};

struct WeighOptions {
    bool weigh_anyway = false;
    std::vector<std::string>
        excluded;  ///< causes excluded on the command line, for the list of those left out
};

/// Causes to weigh, in the order of the tables, their posteriors still 0; those left out are added with the
/// reason. Parameters as weigh_case().
std::vector<WeighedCause> causes_to_weigh(const likelihoods::TableSet& tables, const priors::PriorSet& priors,
                                          const WeighOptions& options, std::vector<LeftOut>& left_out);

/// Indices from the most probable cause to the least, ties in their order. Ranked on the log scale:
/// probabilities near 0 may tie after rounding where their logarithms do not.
/// @param log_scores  as engine::log_scores() gives them
std::vector<std::size_t> ranked(const Eigen::ArrayXd& log_scores);

/// @param priors  names only causes of the tables (its reader has checked) and no excluded one
Weighing weigh_case(const likelihoods::TableSet& tables, const priors::PriorSet& priors,
                    likelihoods::Panel panel, const WeighOptions& options = {});

}  // namespace steelyard::cli
