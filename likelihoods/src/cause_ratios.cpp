// SPDX-License-Identifier: Apache-2.0
#include "steelyard/likelihoods/cause_ratios.hpp"

#include <algorithm>
#include <cmath>

#include "steelyard/engine/domain_error.hpp"
#include "steelyard/engine/row_ratio.hpp"

namespace steelyard::likelihoods {
namespace {

/// A row, the row its ratios refer to, the row that one's refer to, and so on. The reader refuses rings.
std::vector<const EvidenceRow*> chain_of(const EvidenceTable& table, const EvidenceRow& row) {
    std::vector<const EvidenceRow*> chain = {&row};
    while (!chain.back()->against.empty()) {
        const auto found = std::find_if(table.rows.begin(), table.rows.end(), [&](const EvidenceRow& other) {
            return other.cause == chain.back()->against;
        });
        if (found == table.rows.end()) {
            break;
        }
        chain.push_back(&*found);
    }
    return chain;
}

/// One side of a ratio: a row with what is uncertain of it and does not cancel.
class Side {
  public:
    /// @param own  how many rows of the chain count: those before the first that the other side stands on too
    Side(const std::vector<const EvidenceRow*>& chain, std::size_t own)
        : row_(chain.front()->compiled), certain_(own == 0) {
        auto* law = std::get_if<engine::RatioLaw>(&row_.law);
        if (law == nullptr || certain_) {
            return;
        }
        // ln p is a sum of independent ln ratios down the chain, so their variances add.
        Eigen::ArrayXd variance = Eigen::ArrayXd::Zero(row_.probability.size());
        for (std::size_t i = 0; i < own; ++i) {
            if (const auto* ratio = std::get_if<engine::RatioLaw>(&chain[i]->compiled.law)) {
                variance += ratio->log_sd.square();
            } else {
                root_ = &chain[i]->compiled;
            }
        }
        law->log_sd = variance.sqrt();
    }

    engine::LogShareLaw law(Eigen::Index band) const {
        return certain_ ? engine::LogShareLaw::fixed(row_.probability(band))
                        : engine::LogShareLaw(row_, band, root_);
    }

  private:
    engine::CompiledRow row_;
    bool certain_;
    const engine::CompiledRow* root_ = nullptr;  // the row at the chain's end, with a law of its own
};

bool has_range(const EvidenceRow& row) {
    return std::any_of(row.published.begin(), row.published.end(),
                       [](const engine::IntervalEstimate& ratio) { return ratio.low < ratio.high; });
}

/// With two causes the rest of the one is the other, so the published ratio is the ratio asked for. The two
/// rows are one piece of knowledge: their uncertainties must not be added.
std::vector<engine::IntervalEstimate> published_ratios(const EvidenceRow& first, const EvidenceRow& second,
                                                       double level) {
    // Published ranges are of 95 %; another level stretches them as a log-normal's.
    const double stretch =
        level == 0.95 ? 1.0
                      : engine::two_sided_normal_quantile(level) / engine::two_sided_normal_quantile(0.95);
    const bool turned = !has_range(first) && has_range(second);
    const bool raised = first.least_acted || second.least_acted;
    std::vector<engine::IntervalEstimate> ratios = turned ? second.published : first.published;
    for (std::size_t band = 0; band < ratios.size(); ++band) {
        engine::IntervalEstimate& ratio = ratios[band];
        if (turned) {
            ratio = {1.0 / ratio.value, 1.0 / ratio.high, 1.0 / ratio.low};
        }
        const auto i = static_cast<Eigen::Index>(band);
        const double used = first.compiled.probability(i) / second.compiled.probability(i);
        const double moved = raised ? used / ratio.value : 1.0;
        const auto end = [&](double published) {
            return stretch == 1.0 ? published : ratio.value * std::pow(published / ratio.value, stretch);
        };
        ratio = {ratio.value * moved, end(ratio.low) * moved, end(ratio.high) * moved};
    }
    return ratios;
}

}  // namespace

std::vector<engine::IntervalEstimate> cause_ratios(const TableSet& set, const EvidenceTable& table,
                                                   std::string_view a, std::string_view b, double level) {
    const EvidenceRow& first = row_of(set, table, a);
    const EvidenceRow& second = row_of(set, table, b);
    engine::check_between("cause_ratios", "level", level, 0.0, 1.0);
    if (&first == &second) {
        return std::vector<engine::IntervalEstimate>(static_cast<std::size_t>(table.bands()),
                                                     {1.0, 1.0, 1.0});
    }
    if (first.form == RowForm::ratio_to_rest && table.rows.size() == 2) {
        return published_ratios(first, second, level);
    }
    const std::vector<const EvidenceRow*> first_chain = chain_of(table, first);
    const std::vector<const EvidenceRow*> second_chain = chain_of(table, second);
    // From the first row that both stand on, everything cancels.
    const auto meeting =
        std::find_first_of(first_chain.begin(), first_chain.end(), second_chain.begin(), second_chain.end());
    const auto place = meeting == first_chain.end()
                           ? second_chain.end()
                           : std::find(second_chain.begin(), second_chain.end(), *meeting);
    const Side above(first_chain, static_cast<std::size_t>(meeting - first_chain.begin()));
    const Side below(second_chain, static_cast<std::size_t>(place - second_chain.begin()));
    std::vector<engine::IntervalEstimate> ratios;
    for (Eigen::Index band = 0; band < table.bands(); ++band) {
        ratios.push_back(engine::row_ratio_interval(above.law(band), below.law(band), level));
    }
    return ratios;
}

}  // namespace steelyard::likelihoods
