// SPDX-License-Identifier: Apache-2.0
#pragma once
// A tally laid out for the engine: its patterns with their posteriors, and its cells as numbers.

#include <cstdint>
#include <functional>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "case_model.hpp"
#include "steelyard/cli/audit.hpp"

namespace steelyard::cli {

/// Tables and priors as one model: the causes that the priors name, in the order of the tables.
CaseModel model_of(const likelihoods::TableSet& tables, const priors::PriorSet& priors);

/// ln posterior of patterns; shape (patterns, K) [nats].
Eigen::ArrayXXd log_posteriors(const CaseModel& model, const std::vector<std::string>& codes, int threads,
                               const std::function<void(double)>& progress);

/// A final cause that is not among those weighed, or none.
inline constexpr Eigen::Index outside_cause = -1;
inline constexpr Eigen::Index no_cause = -2;

struct AuditCell {
    Eigen::Index pattern = 0;  ///< index into AuditCells::codes
    Eigen::Index cause = 0;    ///< weighed, or one of the two above
    std::size_t outside = 0;   ///< of an outside cause: index into AuditCells::outside
    std::size_t stratum = 0;   ///< index into AuditCells::strata
    std::size_t month = 0;     ///< index into AuditCells::months
    bool caution = false;
    std::uint64_t patients = 0;
};

struct AuditCells {
    std::vector<std::string> codes;  ///< all patterns of the tally, in its order
    std::vector<AuditCell> cells;    ///< in its order
    std::vector<std::string> outside, strata, months;
    Eigen::Index causes = 0;
};
AuditCells cells_of(const Tally& tally, const std::vector<std::string>& causes);

using CellFilter = std::function<bool(const AuditCell&)>;

/// The diagnosed patients of some cells by pattern and final cause; empty when there are none.
/// @param log_posterior  of AuditCells::codes
std::optional<engine::AuditSample> sample_of(const AuditCells& cells, const Eigen::ArrayXXd& log_posterior,
                                             const CellFilter& filter = {});

/// The rows of AuditCells::codes that sample_of() takes without a filter, in its order.
std::vector<Eigen::Index> diagnosed_patterns(const AuditCells& cells);

AuditedPatients count_patients(const AuditCells& cells, const CellFilter& filter = {});

AuditedFit fit_of_tally(const CaseModel& model, const AuditCells& cells, const Eigen::ArrayXXd& log_posterior,
                        const AuditAsked& asked, const std::function<void(double)>& progress);

std::vector<GroupEstimate> group_estimates(const CaseModel& model, const AuditCells& cells);

}  // namespace steelyard::cli
