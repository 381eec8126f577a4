// SPDX-License-Identifier: Apache-2.0
#pragma once
// A clinic's prior odds over the causes, with the range of each and what it rests on.
//
// Three forms are read. Odds against the rest, o: p = o / (1 + o), which must sum to 1 within 0.02 and are
// then divided by their sum. Weights w: p = w / sum(w). Counts n of N patients over K causes: p = (n + 1/2) /
// (N + K/2), Jeffreys' start of half a patient for every cause, as for counts in evidence tables: a prior of
// 0 could never be undone.

#include <Eigen/Core>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "steelyard/document/digest.hpp"
#include "steelyard/document/sources.hpp"

namespace steelyard::priors {

enum class GivenAs { odds_against_rest, weights, counts };
std::string_view to_string(GivenAs form) noexcept;

struct PriorCause {
    std::string id;
    double given = 0.0;                           ///< the odds, weight or count as given
    std::string as_given;                         ///< as written: `1:3`
    std::optional<double> range_low, range_high;  ///< same scale as `given`
    std::string range_as_given;                   ///< `1:6 to 1:2`; may be empty
    double probability = 0.0;                     ///< prior probability, normalised over the set
    std::optional<document::Grounds> grounds;     ///< empty when the file states neither basis nor source
    std::string note;
    document::SourcePosition where;  ///< of its key
};

struct PriorSet {
    std::string title;
    std::string name;  ///< `shipped:renal-clinic` or the file as given
    std::string digest;
    GivenAs given_as = GivenAs::weights;
    std::vector<PriorCause> causes;  ///< in order of the file; at least two
    double worth = 0.0;      ///< weights: patients the set is worth; 0 when not given. counts: their sum N
    double given_sum = 1.0;  ///< odds_against_rest: sum of the probabilities before normalising
    std::string note;
    document::Sources sources;

    const PriorCause* find(std::string_view id) const noexcept;
    std::vector<std::string> ids() const;
    /// ln prior probability [nats] in the order of `causes`; shape (K); finite.
    Eigen::ArrayXd log_prior() const;
};

/// The set without some causes; the rest keep their proportions.
///
/// Odds against the rest are restated against the smaller rest, each with its range multiplied by the same
/// factor, so that `given` and `as_given` agree with the new probabilities. The worth of weights shrinks to
/// the share that stays (part of a Dirichlet is a Dirichlet), that of counts to the patients that stay. Name
/// and digest stay the file's.
/// @param causes  ids to leave out; none gives the set as it is
/// @throws std::invalid_argument  a cause is not of the set, or fewer than two would remain
PriorSet without(const PriorSet& set, const std::vector<std::string>& causes);

/// Reads a prior set (`steelyard.prior-set/1`, YAML or JSON). Which causes exist is the table set's to say:
/// pass its ids to have others refused at their line, or none to accept any.
/// @param file  name for messages, for `PriorSet::name`, and (without folder) for the digest
/// @returns     at least two causes, probabilities in (0, 1) that sum to 1 within K * 2^-52
/// @throws document::LoadError  with every fault of the text
PriorSet read_prior_set(std::string_view text, const std::string& file,
                        const std::vector<std::string>& known_causes = {});
/// The same from a file, or from standard input for `-`. @throws document::LoadError
PriorSet load_prior_set(const std::string& path, const std::vector<std::string>& known_causes = {});

/// Names of the sets built into the program, the default first.
std::vector<std::string> shipped_prior_sets();
/// The text of a shipped set, with or without `shipped:` before its name. @throws std::invalid_argument  no
/// such set
std::string shipped_prior_text(std::string_view name);
/// A shipped set by name (with or without `shipped:`), or else a file; a file of the same name is opened by
/// `./name`.
/// @throws document::LoadError
PriorSet open_prior_set(const std::string& name_or_path, const std::vector<std::string>& known_causes = {});

}  // namespace steelyard::priors
