// SPDX-License-Identifier: Apache-2.0
// What a finding not yet known may be expected to tell. Every posterior here is the one that weighing the
// case with that finding would give: alternatives and the weights of groups are settled anew, so a finding
// counts for what it adds.
#include <algorithm>
#include <cmath>
#include <limits>
#include <optional>

#include "sensitivity_parts.hpp"
#include "steelyard/engine/information.hpp"
#include "steelyard/engine/uncertain_posterior.hpp"

namespace steelyard::cli {
namespace {

using likelihoods::FindingReading;
using likelihoods::Pattern;
using likelihoods::Use;

/// The case with some more findings known, their bands left open.
struct Opened {
    Eigen::ArrayXd base;  ///< ln prior and all findings but the new ones, shape (K)
    std::vector<Eigen::ArrayXXd>
        weighted;  ///< of each new one: weight times ln P(band | cause), shape (bands, K)
};

/// Empty when a new finding would not be read beside the others.
std::optional<Opened> opened(const CaseModel& model, const Pattern& pattern,
                             const std::vector<Eigen::ArrayXd>& lines,
                             const std::vector<std::size_t>& added) {
    std::vector<likelihoods::ReadingChange> changes;
    changes.reserve(added.size());
    for (const std::size_t table : added) {
        changes.push_back({table, Eigen::Index{0}});  // which band does not matter for weights
    }
    const Pattern changed = likelihoods::reread(model.tables(), pattern, changes);
    Opened result;
    result.base = model.log_prior();
    for (std::size_t i = 0; i < changed.findings.size(); ++i) {
        const FindingReading& reading = changed.findings[i];
        const bool is_new = std::find(added.begin(), added.end(), i) != added.end();
        if (reading.use != Use::read) {
            if (is_new) {
                return std::nullopt;
            }
            continue;
        }
        if (!is_new) {
            result.base += reading.weight * (lines[i].size() > 0 ? lines[i] : model.line(reading));
        }
    }
    for (const std::size_t table : added) {
        result.weighted.emplace_back(changed.findings[table].weight * model.log_shares(table));
    }
    return result;
}

/// Posterior after each band of the one new finding; shape (K, bands).
Eigen::ArrayXXd after_each_band(const Opened& open) {
    const Eigen::ArrayXXd scores = open.weighted[0].rowwise() + open.base.transpose();
    return engine::softmax_rows(scores).transpose();
}

class NextTests {
  public:
    NextTests(const CaseModel& model, const Weighing& weighing, const std::string& burden)
        : model_(model), weighing_(weighing), lines_(weighing.pattern.findings.size()) {
        for (std::size_t i = 0; i < lines_.size(); ++i) {
            if (weighing.pattern.findings[i].use == Use::read) {
                lines_[i] = model.line(weighing.pattern.findings[i]);
            }
        }
        const auto limit = std::find(burdens().begin(), burdens().end(), burden);
        for (std::size_t i = 0; i < lines_.size(); ++i) {
            const FindingReading& reading = weighing.pattern.findings[i];
            if (reading.use == Use::missing && reading.barred.empty()) {
                const auto own =
                    std::find(burdens().begin(), burdens().end(), model.tables().tables[i].burden);
                (own <= limit ? candidates_ : too_heavy_).push_back(i);
            }
        }
        now_.resize(static_cast<Eigen::Index>(weighing.causes.size()));
        for (std::size_t k = 0; k < weighing.causes.size(); ++k) {
            now_(static_cast<Eigen::Index>(k)) = weighing.causes[k].posterior;
        }
        now_ /= now_.sum();
    }

    void write(Sensitivity& result) const {
        result.bits_now = engine::entropy_bits(now_);
        for (const std::size_t table : candidates_) {
            if (std::optional<NextTest> test = value_of(table)) {
                result.next.push_back(std::move(*test));
            }
        }
        for (const std::size_t table : too_heavy_) {
            if (std::optional<NextTest> test = value_of(table)) {
                result.beyond_burden.push_back(std::move(*test));
            }
        }
        std::stable_sort(result.next.begin(), result.next.end(),
                         [](const NextTest& a, const NextTest& b) { return a.bits > b.bits; });
        pairs(result);
    }

  private:
    /// The least entropy [bits] that can be left after a band, times P(band), and the second finding that
    /// leaves it.
    struct Least {
        double entropy = 0.0;
        std::size_t second =
            0;  // index into candidates_; beyond its end: to stop after the first leaves no more
    };

    const std::string& name(std::size_t table) const { return model_.tables().tables[table].finding; }

    /// Empty when the finding would not be read.
    std::optional<NextTest> value_of(std::size_t table) const {
        const std::optional<Opened> open = opened(model_, weighing_.pattern, lines_, {table});
        if (!open) {
            return std::nullopt;
        }
        const engine::CauseIndex leader{static_cast<Eigen::Index>(weighing_.ranking[0])};
        const Eigen::ArrayXXd after = after_each_band(*open);
        const engine::ReweightedInformation information =
            engine::reweighted_information(now_, model_.shares(table), after, leader);
        NextTest test{name(table), information.bits, information.leader_changes, {}};
        for (Eigen::Index band = 0; band < after.cols(); ++band) {
            test.after.push_back({model_.tables().tables[table].band_names[static_cast<std::size_t>(band)],
                                  information.band_probability(band), per_cause(after.col(band))});
        }
        return test;
    }

    /// The best two to make together, and the best to make one after the other: for every first and every
    /// second the entropy that is left after both, by band of the first.
    void pairs(Sensitivity& result) const {
        const std::size_t count = candidates_.size();
        constexpr double tie = engine::information_tie;
        std::vector<std::vector<Least>> left(count);
        for (std::size_t i = 0; i < count; ++i) {
            left[i] = entropy_after(candidates_[i], count);
        }
        for (std::size_t i = 0; i < count; ++i) {
            for (std::size_t j = i + 1; j < count; ++j) {
                const std::optional<Opened> open =
                    opened(model_, weighing_.pattern, lines_, {candidates_[i], candidates_[j]});
                if (!open) {
                    continue;  // alternatives: only one of them would be read
                }
                const engine::PairEntropy entropy = engine::reweighted_pair_entropy(
                    now_, open->base, open->weighted[0], open->weighted[1], model_.shares(candidates_[i]),
                    model_.shares(candidates_[j]));
                const double bits = std::max(0.0, result.bits_now - entropy.by_first.sum());
                if (!result.pair || bits > result.pair->bits + tie) {
                    result.pair = NextPair{name(candidates_[i]), name(candidates_[j]), bits};
                }
                const auto keep_least = [&](std::vector<Least>& bands, std::size_t second,
                                            const Eigen::ArrayXd& entropies) {
                    for (std::size_t band = 0; band < bands.size(); ++band) {
                        const double here = entropies(static_cast<Eigen::Index>(band));
                        if (here < bands[band].entropy - tie) {
                            bands[band] = {here, second};
                        }
                    }
                };
                keep_least(left[i], j, entropy.by_first);
                keep_least(left[j], i, entropy.by_second);
            }
        }
        for (std::size_t i = 0; i < count; ++i) {
            double sum = 0.0;
            for (const Least& band : left[i]) {
                sum += band.entropy;
            }
            const double bits = std::max(0.0, result.bits_now - sum);
            if (!left[i].empty() && result.pair && (!result.plan || bits > result.plan->bits + tie)) {
                result.plan = NextPlan{name(candidates_[i]), bits, {}};
                for (const Least& band : left[i]) {
                    result.plan->second.push_back(band.second == count ? std::string()
                                                                       : name(candidates_[band.second]));
                }
            }
        }
    }

    /// For each band of a finding made alone P(band) times the entropy after it.
    std::vector<Least> entropy_after(std::size_t table, std::size_t none) const {
        std::vector<Least> bands;
        if (const std::optional<NextTest> test = value_of(table)) {
            for (const AfterBand& band : test->after) {
                const Eigen::ArrayXd posterior = Eigen::Map<const Eigen::ArrayXd>(
                    band.posterior.data(), static_cast<Eigen::Index>(band.posterior.size()));
                bands.push_back({band.probability * engine::entropy_bits(posterior), none});
            }
        }
        return bands;
    }

    const CaseModel& model_;
    const Weighing& weighing_;
    std::vector<Eigen::ArrayXd> lines_;  // of the findings read; empty for others
    std::vector<std::size_t> candidates_;
    std::vector<std::size_t> too_heavy_;  // beyond the burden asked for
    Eigen::ArrayXd now_;
};

}  // namespace

void find_next_tests(const CaseModel& model, const Weighing& weighing, const std::string& burden,
                     Sensitivity& sensitivity) {
    NextTests(model, weighing, burden).write(sensitivity);
}

}  // namespace steelyard::cli
