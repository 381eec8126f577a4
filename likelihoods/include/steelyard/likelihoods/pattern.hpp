// SPDX-License-Identifier: Apache-2.0
#pragma once
// From the quantities and features of a panel to bands: which evidence is read, which is set aside and why,
// and what is missing. Nothing is dropped without a word.

#include <optional>
#include <string>
#include <vector>

#include "steelyard/likelihoods/table_set.hpp"

namespace steelyard::likelihoods {

enum class Use { read, set_aside, missing };

/// What became of one finding of the set.
struct FindingReading {
    std::size_t table = 0;  ///< index into TableSet::tables
    Use use = Use::missing;
    std::optional<Interval> value;  ///< of a quantity, canonical
    std::string level;              ///< of a feature
    std::vector<Eigen::Index>
        cells;            ///< bands whose probabilities add up: one; several for a half-known joint table
    std::string band;     ///< the band's name
    std::string why_not;  ///< set aside: the reason; missing: what is lacking
    /// Missing: why giving it would add nothing to what is read, in words: one of its conditions fails, or an
    /// alternative is read in its place. Empty otherwise.
    std::string barred;
    std::vector<std::string>
        remarks;  ///< what a reader should know: a dipstick near an edge, a computed input
    std::vector<std::string>
        unchecked;             ///< subjects of conditions that could not be checked: nothing is known of them
    double weight = 1.0;       ///< dependence factor d of its group
    std::string group;         ///< name of its group when it weighs less than 1
    bool passed_over = false;  ///< it, or a value of it, would be read but for a preferred alternative
};

/// Values of the case that nothing in this set reads.
struct Pattern {
    std::vector<FindingReading> findings;  ///< one per table, in the order of the set
    std::vector<std::string>
        unread;  ///< ids of measured or observed entries that no table, condition or gate used
};

Pattern read_pattern(const TableSet& set, const Panel& panel, const Quantities& quantities);

/// What another case would be like in which one finding is known otherwise.
struct ReadingChange {
    std::size_t table = 0;             ///< index into TableSet::tables
    std::optional<Eigen::Index> cell;  ///< the band read; empty: the finding is not known
};

/// The pattern with some findings known otherwise, all else as it is: preference among alternatives and the
/// weights of groups are settled anew. Conditions of use are not checked again.
/// @throws std::out_of_range  a table or cell that is not of the set
Pattern reread(const TableSet& set, const Pattern& pattern, const std::vector<ReadingChange>& changes);

/// ln of probabilities of what was seen, one by one: the same bits wherever and in whatever array they stand.
/// A margin is a sum of probabilities and may pass 1 by a rounding; its logarithm is not above 0.
Eigen::ArrayXd log_probability(const Eigen::Ref<const Eigen::ArrayXd>& seen);

/// ln P(what was seen | cause) for the findings read: shape (read findings, causes), rows in the order of the
/// set.
Eigen::ArrayXXd log_likelihood_rows(const TableSet& set, const Pattern& pattern,
                                    const std::vector<std::string>& causes);
/// The dependence factors of the same rows.
Eigen::ArrayXd row_weights(const Pattern& pattern);

}  // namespace steelyard::likelihoods
