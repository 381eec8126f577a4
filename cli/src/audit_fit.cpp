// SPDX-License-Identifier: Apache-2.0
// Whether patients whose final cause was not on the list stand out: for every pattern, the largest chance
// under any cause of findings at least as unusual. Patterns of the same findings share one law of chances, so
// that it is worked out once for each set of findings and not for each pattern.
#include <algorithm>
#include <cmath>
#include <limits>
#include <map>

#include "audit_cells.hpp"
#include "steelyard/engine/counter_random.hpp"
#include "steelyard/engine/parallel.hpp"
#include "steelyard/engine/proportion.hpp"
#include "steelyard/engine/surprise_law.hpp"

namespace steelyard::cli {
namespace {

using likelihoods::FindingReading;
using likelihoods::Pattern;
using likelihoods::Use;

constexpr std::uint32_t fit_streams = 0xe0000000U;  // as for single cases
// Sets of findings looked at, those of most patients first, so that the time has a bound.
constexpr std::size_t most_sets = 2000;
constexpr double most_outcomes = 4096.0;  // of all findings of a set together; beyond it patterns are drawn
constexpr std::uint64_t draws = 4096;

/// The findings read, and of half-known joint tables which cells: what decides the law.
std::string findings_read(const Pattern& pattern) {
    std::string key;
    for (const FindingReading& reading : pattern.findings) {
        if (reading.use != Use::read) {
            continue;
        }
        key += std::to_string(reading.table);
        if (reading.cells.size() > 1) {
            for (const Eigen::Index cell : reading.cells) {
                key += '+' + std::to_string(cell);
            }
        }
        key += ' ';
    }
    return key;
}

/// Patterns of the same findings.
struct FindingSet {
    std::vector<Eigen::Index> patterns;
    std::uint64_t patients = 0;
};

/// For each pattern the largest chance under any cause; NaN where it was not looked at.
class Chances {
  public:
    Chances(const CaseModel& model, const AuditCells& cells, const AuditAsked& asked)
        : model_(model),
          cells_(cells),
          seed_(asked.seed),
          threads_(asked.threads),
          largest_(Eigen::ArrayXd::Constant(static_cast<Eigen::Index>(cells.codes.size()),
                                            std::numeric_limits<double>::quiet_NaN())) {}

    void work_out(const std::function<void(double)>& progress) {
        std::vector<FindingSet> sets = finding_sets();
        if (sets.size() > most_sets) {
            std::stable_sort(sets.begin(), sets.end(), [](const FindingSet& a, const FindingSet& b) {
                return a.patients > b.patients;
            });
            sets.resize(most_sets);
        }
        draw_tables();
        std::vector<char> exact(sets.size(), 1);
        engine::run_in_parallel(
            static_cast<Eigen::Index>(sets.size()), threads_,
            [&](Eigen::Index job) {
                const auto at = static_cast<std::size_t>(job);
                exact[at] = one_set(sets[at]) ? 1 : 0;
            },
            progress);
        exact_ = std::find(exact.begin(), exact.end(), 0) == exact.end();
    }

    const Eigen::ArrayXd& largest() const noexcept { return largest_; }
    bool exact() const noexcept { return exact_; }

  private:
    std::vector<FindingSet> finding_sets() const {
        std::vector<std::uint64_t> patients(cells_.codes.size());
        for (const AuditCell& cell : cells_.cells) {
            if (cell.cause != no_cause) {
                patients[static_cast<std::size_t>(cell.pattern)] += cell.patients;
            }
        }
        std::map<std::string, std::size_t> known;
        std::vector<FindingSet> sets;
        for (std::size_t g = 0; g < cells_.codes.size(); ++g) {
            if (patients[g] == 0) {
                continue;
            }
            const std::string key = findings_read(likelihoods::pattern_of(model_.tables(), cells_.codes[g]));
            const auto [place, is_new] = known.emplace(key, sets.size());
            if (is_new) {
                sets.emplace_back();
            }
            FindingSet& set = sets[place->second];
            set.patterns.push_back(static_cast<Eigen::Index>(g));
            set.patients += patients[g];
        }
        return sets;
    }

    /// A table's own number for a draw, the same in every set of findings that holds it.
    std::function<double(std::uint64_t)> numbers_of(std::size_t table) const {
        return [this, table](std::uint64_t draw) {
            return engine::uniform(seed_, fit_streams + static_cast<std::uint32_t>(table), draw);
        };
    }

    void draw_tables() {
        drawn_.resize(model_.tables().tables.size());
        engine::run_in_parallel(static_cast<Eigen::Index>(drawn_.size()), threads_, [&](Eigen::Index job) {
            const auto t = static_cast<std::size_t>(job);
            drawn_[t] = engine::drawn_log_shares(model_.shares(t), numbers_of(t), draws);
        });
    }

    /// Of a half-known joint table: what was seen, and the rest.
    Eigen::ArrayXXd seen_and_rest(const FindingReading& reading) const {
        Eigen::ArrayXXd two = Eigen::ArrayXXd::Zero(2, model_.shares(reading.table).cols());
        for (const Eigen::Index cell : reading.cells) {
            two.row(0) += model_.shares(reading.table).row(cell);
        }
        two.row(0) = two.row(0).min(1.0);
        two.row(1) = 1.0 - two.row(0);
        return two;
    }

    engine::SurpriseLaw law_of(const Pattern& pattern) const {
        std::vector<Eigen::ArrayXXd> tables;
        std::vector<std::size_t> places;
        double outcomes = 1.0;
        for (const FindingReading& reading : pattern.findings) {
            if (reading.use == Use::read) {
                tables.push_back(reading.cells.size() == 1 ? model_.shares(reading.table)
                                                           : seen_and_rest(reading));
                places.push_back(reading.table);
                outcomes *= static_cast<double>(tables.back().rows());
            }
        }
        if (outcomes <= most_outcomes) {
            return engine::SurpriseLaw(tables);
        }
        std::vector<const Eigen::ArrayXXd*> log_shares;
        for (std::size_t f = 0; f < tables.size(); ++f) {
            if (tables[f].rows() == model_.shares(places[f]).rows()) {
                log_shares.push_back(&drawn_[places[f]]);
            } else {
                tables[f] = engine::drawn_log_shares(tables[f], numbers_of(places[f]), draws);
                log_shares.push_back(&tables[f]);
            }
        }
        return engine::SurpriseLaw::of_draws(log_shares);
    }

    /// @returns  whether the chances are exact
    bool one_set(const FindingSet& set) {
        const auto pattern_at = [&](Eigen::Index g) {
            return likelihoods::pattern_of(model_.tables(), cells_.codes[static_cast<std::size_t>(g)]);
        };
        const Pattern first = pattern_at(set.patterns.front());
        if (std::none_of(first.findings.begin(), first.findings.end(),
                         [](const FindingReading& reading) { return reading.use == Use::read; })) {
            for (const Eigen::Index g : set.patterns) {
                largest_(g) = 1.0;  // nothing known is nothing unusual
            }
            return true;
        }
        const engine::SurpriseLaw law = law_of(first);
        for (const Eigen::Index g : set.patterns) {
            CaseModel::Evidence seen = model_.evidence(pattern_at(g));
            seen.weight.setOnes();
            largest_(g) = law.probability(seen.log_likelihood().min(0.0)).maxCoeff();
        }
        return law.exact();
    }

    const CaseModel& model_;
    const AuditCells& cells_;
    std::uint64_t seed_;
    int threads_;
    Eigen::ArrayXd largest_;
    std::vector<Eigen::ArrayXXd> drawn_;  ///< of each table
    bool exact_ = true;
};

void count(FlaggedPatients& of, const AuditCell& cell, double chance, double leader) {
    const auto patients = static_cast<double>(cell.patients);
    of.mean_leader += patients * leader;
    of.patients += cell.patients;
    if (!std::isnan(chance)) {
        of.judged += cell.patients;
        of.flagged += chance < unexplained_below ? cell.patients : 0;
    }
}

void finish(FlaggedPatients& of, double level) {
    if (of.patients > 0) {
        of.mean_leader /= static_cast<double>(of.patients);
    }
    if (of.judged > 0) {
        of.share =
            engine::wilson_interval(static_cast<double>(of.flagged), static_cast<double>(of.judged), level);
    }
}

/// How well the chance tells the two apart: the area of a sample of two causes, outside and inside, whose
/// forecast falls with the chance.
std::optional<engine::AreaUnderCurve> area_of(const AuditCells& cells, const Eigen::ArrayXd& chance,
                                              double level) {
    std::vector<Eigen::Index> rows;
    for (Eigen::Index g = 0; g < chance.size(); ++g) {
        if (!std::isnan(chance(g))) {
            rows.push_back(g);
        }
    }
    std::vector<Eigen::Index> place(cells.codes.size(), -1);
    engine::AuditSample sample;
    const auto count = static_cast<Eigen::Index>(rows.size());
    sample.log_forecast.resize(count, 2);
    sample.count.setZero(count, 2);
    for (Eigen::Index row = 0; row < count; ++row) {
        const Eigen::Index g = rows[static_cast<std::size_t>(row)];
        place[static_cast<std::size_t>(g)] = row;
        // Odds of 1 to the chance: only their order counts.
        const double log_total = std::log1p(std::max(chance(g), 1e-300));
        sample.log_forecast(row, 0) = -log_total;
        sample.log_forecast(row, 1) = std::log(std::max(chance(g), 1e-300)) - log_total;
    }
    for (const AuditCell& cell : cells.cells) {
        const Eigen::Index row = place[static_cast<std::size_t>(cell.pattern)];
        if (row >= 0 && cell.cause != no_cause) {
            sample.count(row, cell.cause == outside_cause ? 0 : 1) += static_cast<double>(cell.patients);
        }
    }
    const Eigen::ArrayXd totals = count > 0 ? sample.cause_counts() : Eigen::ArrayXd::Zero(2);
    if (totals.minCoeff() <= 0.0) {
        return std::nullopt;
    }
    return engine::area_under_curve(sample, 0, level);
}

}  // namespace

AuditedFit fit_of_tally(const CaseModel& model, const AuditCells& cells, const Eigen::ArrayXXd& log_posterior,
                        const AuditAsked& asked, const std::function<void(double)>& progress) {
    Chances chances(model, cells, asked);
    chances.work_out(progress);
    AuditedFit fit;
    fit.exact = chances.exact();
    for (const std::string& cause : cells.outside) {
        fit.causes.emplace_back().cause = cause;
    }
    for (const AuditCell& cell : cells.cells) {
        if (cell.cause == no_cause) {
            continue;
        }
        const double chance = chances.largest()(cell.pattern);
        const double leader = std::exp(log_posterior.row(cell.pattern).maxCoeff());
        count(cell.cause == outside_cause ? fit.outside : fit.inside, cell, chance, leader);
        if (cell.cause == outside_cause) {
            count(fit.causes[cell.outside], cell, chance, leader);
        }
    }
    finish(fit.inside, asked.level);
    finish(fit.outside, asked.level);
    for (FlaggedPatients& cause : fit.causes) {
        finish(cause, asked.level);
    }
    std::sort(fit.causes.begin(), fit.causes.end(), [](const FlaggedPatients& a, const FlaggedPatients& b) {
        return a.patients != b.patients ? a.patients > b.patients : a.cause < b.cause;
    });
    fit.area = area_of(cells, chances.largest(), asked.level);
    return fit;
}

}  // namespace steelyard::cli
