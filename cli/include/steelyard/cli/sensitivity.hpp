// SPDX-License-Identifier: Apache-2.0
#pragma once
// How sure the answer of one case is, what would overturn it, whether any cause fits, and what to look at
// next. All numbers are the engine's; here the case, its tables and its priors are laid out for it.

#include <cstdint>
#include <functional>
#include <optional>
#include <string>
#include <vector>

#include "steelyard/cli/weighing.hpp"
#include "steelyard/engine/posterior_spread.hpp"
#include "steelyard/likelihoods/variation.hpp"

namespace steelyard::cli {

struct SensitivityOptions {
    std::uint64_t seed = 1;
    std::optional<Eigen::Index> draws;  ///< empty: as many as the interval ends need
    int threads = 1;
    std::optional<double> epsilon;       ///< share of the prior that may be anything, in [0, 1]
    std::optional<double> until;         ///< posterior for the leader to reach, in (0, 1)
    std::string burden = "specialised";  ///< of next tests, at most this
    std::function<void(double done)> progress;
};

/// All arrays have one entry for each weighed cause, in the order of Weighing::causes.
using PerCause = std::vector<double>;

struct WithoutFinding {
    std::string finding;
    std::size_t leader = 0;
    PerCause posterior;
};

struct Tipping {
    std::size_t rival = 0;
    double prior = 0.0;        ///< the rival's prior probability at which it ties, the others in proportion
    double odds_factor = 1.0;  ///< on the rival's prior odds against the leader
};

/// The leader's prior at which its posterior is the target.
struct Until {
    double target = 0.0;
    std::optional<double> prior;  ///< empty when the target lies below both its prior and its posterior
};

struct PriorSweep {
    std::size_t cause = 0;
    std::vector<double> priors;
    std::vector<PerCause> posterior;  ///< one for each prior
};

struct RowFactor {
    std::string finding;
    std::vector<std::size_t> causes;  ///< that take the row
    std::size_t rival = 0;            ///< that ties with the leader
    double factor = 1.0;              ///< on P(band seen | cause)
    double low = 1.0, high = 1.0;     ///< the row's own 95 % interval, as factors on the share used
    bool inside = false;              ///< the factor lies within that interval
    bool possible = true;             ///< the share would not exceed 1
};

struct ValueEdge {
    std::string finding;
    double value = 0.0;
    likelihoods::NearestEdge nearest;
    std::string band;  ///< beyond the edge
    std::size_t leader = 0;
    PerCause posterior;
    std::optional<double> chance;  ///< that a repeat sample lies beyond it
    std::optional<double>
        chance_other;  ///< that a repeat sample falls into any band in which another cause leads
    std::optional<Eigen::Index> other_band;  ///< of those the likeliest
    std::size_t other_leader = 0;            ///< the cause that leads there
    std::string why_no_chance;
    std::optional<document::Basis> weakest;  ///< of what the chance rests on
    std::vector<std::string> remarks;
};

struct CauseRange {
    std::size_t cause = 0;
    double low = 0.0, high = 1.0;
};

struct VarianceSource {
    std::string source;  ///< `prior`, or a finding
    double first = 0.0, first_error = 0.0, total = 0.0, total_error = 0.0;
};

struct Fit {
    double conflict_bits = 0.0;
    PerCause surprise;        ///< probability under the cause of findings at least as unusual as these
    PerCause surprise_error;  ///< 0 when exact
    bool exact = true;
    bool explained = true;  ///< some cause gives at least `unexplained_below`
};
/// A cause under which findings this unusual are rarer than this does not explain them. Judgement:
/// docs/method.md, "Fit".
inline constexpr double unexplained_below = 0.01;

struct AfterBand {
    std::string band;
    double probability = 0.0;
    PerCause posterior;
};

struct NextTest {
    std::string finding;
    double bits = 0.0;
    double leader_changes = 0.0;
    std::vector<AfterBand> after;
};

/// Two findings made together, and made one after the other.
struct NextPair {
    std::string first, second;
    double bits = 0.0;
};
struct NextPlan {
    std::string first;
    double bits = 0.0;
    std::vector<std::string> second;  ///< for each band of the first; empty where it is best to stop
};

struct Sensitivity {
    std::uint64_t seed = 1;
    engine::PosteriorSpread spread;
    std::vector<WithoutFinding> without;
    std::vector<Tipping> tipping;  ///< most probable rival first
    std::optional<Until> until;
    std::vector<PriorSweep> sweeps;
    std::vector<RowFactor> rows;  ///< nearest to overturning the answer first
    std::vector<ValueEdge> edges;
    std::vector<CauseRange> range;  ///< empty when the priors state no range
    bool range_narrowed = false;    ///< some stated ranges cannot be reached, since probabilities add up to 1
    std::optional<double> epsilon;
    std::vector<CauseRange> contamination;
    std::vector<VarianceSource> variance;  ///< of the leader's posterior, largest total first
    Fit fit;
    double bits_now = 0.0;                ///< entropy of the posterior
    std::vector<NextTest> next;           ///< most informative first
    std::vector<NextTest> beyond_burden;  ///< those that ask more than the burden asked for, in no order
    std::optional<NextPair> pair;
    std::optional<NextPlan> plan;
};

/// @param weighing  a case that was weighed   @throws engine::DomainError  an option out of its domain
Sensitivity sensitivity_of(const likelihoods::TableSet& tables, const priors::PriorSet& priors,
                           const Weighing& weighing, const SensitivityOptions& options);

/// Sensitivity::edges alone: all of it that depends on the values of a case and not only on its pattern.
std::vector<ValueEdge> value_edges_of(const likelihoods::TableSet& tables, const Weighing& weighing);

}  // namespace steelyard::cli
