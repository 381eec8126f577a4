// SPDX-License-Identifier: Apache-2.0
#include "steelyard/likelihoods/cause_ratios.hpp"

#include <algorithm>

#include "steelyard/engine/domain_error.hpp"
#include "steelyard/engine/row_ratio.hpp"

namespace steelyard::likelihoods {
namespace {

/// The law of one row's band. Ratios carry the uncertainty of the row they refer to, one step deep; a longer
/// chain is held fixed there, since the engine's law of a ratio row needs a reference that is none.
engine::LogShareLaw law_of(const EvidenceTable& table, const EvidenceRow& row, Eigen::Index band,
                           bool with_reference) {
    const engine::CompiledRow* reference = nullptr;
    if (with_reference && !row.against.empty()) {
        const auto found = std::find_if(table.rows.begin(), table.rows.end(),
                                        [&](const EvidenceRow& other) { return other.cause == row.against; });
        if (found != table.rows.end() && !std::holds_alternative<engine::RatioLaw>(found->compiled.law)) {
            reference = &found->compiled;
        }
    }
    return engine::LogShareLaw(row.compiled, band, reference);
}

}  // namespace

std::vector<engine::IntervalEstimate> cause_ratios(const TableSet& set, const EvidenceTable& table,
                                                   std::string_view a, std::string_view b, double level) {
    const EvidenceRow& first = row_of(set, table, a);
    const EvidenceRow& second = row_of(set, table, b);
    engine::check_between("cause_ratios", "level", level, 0.0, 1.0);
    std::vector<engine::IntervalEstimate> ratios;
    for (Eigen::Index band = 0; band < table.bands(); ++band) {
        if (&first == &second) {
            ratios.push_back({1.0, 1.0, 1.0});
            continue;
        }
        const bool shared = first.against == second.cause || second.against == first.cause;
        const auto side = [&](const EvidenceRow& row, const EvidenceRow& other) {
            return shared && other.against == row.cause
                       ? engine::LogShareLaw::fixed(row.compiled.probability(band))
                       : law_of(table, row, band, !shared);
        };
        ratios.push_back(engine::row_ratio_interval(side(first, second), side(second, first), level));
    }
    return ratios;
}

}  // namespace steelyard::likelihoods
