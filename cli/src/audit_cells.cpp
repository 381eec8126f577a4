// SPDX-License-Identifier: Apache-2.0
#include "audit_cells.hpp"

#include <algorithm>
#include <cmath>
#include <map>

#include "steelyard/engine/log_math.hpp"
#include "steelyard/engine/parallel.hpp"
#include "steelyard/engine/posterior.hpp"

namespace steelyard::cli {
namespace {

using likelihoods::GateStatus;

/// Words in the order in which they were first met; the cells come sorted, so equal tallies agree.
class Numbers {
  public:
    explicit Numbers(std::vector<std::string>& words) : words_(words) {}
    std::size_t of(std::string_view word) {
        const auto found = numbers_.find(word);
        if (found != numbers_.end()) {
            return found->second;
        }
        words_.emplace_back(word);
        return numbers_.emplace(word, words_.size() - 1).first->second;
    }

  private:
    std::vector<std::string>& words_;
    std::map<std::string, std::size_t, std::less<>> numbers_;
};

}  // namespace

CaseModel model_of(const likelihoods::TableSet& tables, const priors::PriorSet& priors) {
    std::vector<WeighedCause> causes;
    for (const likelihoods::Cause& cause : tables.causes) {
        if (const priors::PriorCause* prior = priors.find(cause.id)) {
            causes.push_back({cause.id, cause.title, cause.parts, prior->probability, 0.0});
        }
    }
    return {tables, causes};
}

Eigen::ArrayXXd log_posteriors(const CaseModel& model, const std::vector<std::string>& codes, int threads,
                               const std::function<void(double)>& progress) {
    constexpr Eigen::Index block = 512;
    const auto count = static_cast<Eigen::Index>(codes.size());
    Eigen::ArrayXXd result(count, model.log_prior().size());
    engine::run_in_parallel(
        (count + block - 1) / block, threads,
        [&](Eigen::Index job) {
            for (Eigen::Index g = job * block; g < std::min(count, (job + 1) * block); ++g) {
                const likelihoods::Pattern pattern =
                    likelihoods::pattern_of(model.tables(), codes[static_cast<std::size_t>(g)]);
                const CaseModel::Evidence seen = model.evidence(pattern);
                const Eigen::ArrayXd scores = engine::log_scores(model.log_prior(), seen.loglik, seen.weight);
                result.row(g) = (scores - engine::log_sum_exp(scores)).transpose();
            }
        },
        progress);
    return result;
}

AuditCells cells_of(const Tally& tally, const std::vector<std::string>& causes) {
    AuditCells result;
    result.causes = static_cast<Eigen::Index>(causes.size());
    Numbers outside(result.outside), strata(result.strata), months(result.months);
    tally.for_each([&](const TallyCell& seen) {
        if (result.codes.empty() || result.codes.back() != seen.code) {
            result.codes.emplace_back(seen.code);
        }
        AuditCell cell;
        cell.pattern = static_cast<Eigen::Index>(result.codes.size()) - 1;
        const auto place = std::find(causes.begin(), causes.end(), seen.cause);
        if (seen.cause.empty()) {
            cell.cause = no_cause;
        } else if (place == causes.end()) {
            cell.cause = outside_cause;
            cell.outside = outside.of(seen.cause);
        } else {
            cell.cause = place - causes.begin();
        }
        cell.stratum = strata.of(seen.stratum);
        cell.month = months.of(seen.month);
        cell.caution = seen.gate == GateStatus::caution;
        cell.patients = seen.patients;
        result.cells.push_back(cell);
    });
    return result;
}

std::optional<engine::AuditSample> sample_of(const AuditCells& cells, const Eigen::ArrayXXd& log_posterior,
                                             const CellFilter& filter) {
    // Cells of one pattern stand together.
    std::vector<Eigen::Index> patterns;
    for (const AuditCell& cell : cells.cells) {
        if (cell.cause >= 0 && (!filter || filter(cell)) &&
            (patterns.empty() || patterns.back() != cell.pattern)) {
            patterns.push_back(cell.pattern);
        }
    }
    if (patterns.empty()) {
        return std::nullopt;
    }
    const auto rows = static_cast<Eigen::Index>(patterns.size());
    engine::AuditSample sample;
    sample.log_forecast.resize(rows, cells.causes);
    sample.count.setZero(rows, cells.causes);
    for (Eigen::Index g = 0; g < rows; ++g) {
        sample.log_forecast.row(g) = log_posterior.row(patterns[static_cast<std::size_t>(g)]);
    }
    Eigen::Index row = 0;
    for (const AuditCell& cell : cells.cells) {
        if (cell.cause >= 0 && (!filter || filter(cell))) {
            while (patterns[static_cast<std::size_t>(row)] != cell.pattern) {
                ++row;
            }
            sample.count(row, cell.cause) += static_cast<double>(cell.patients);
        }
    }
    return sample;
}

std::vector<Eigen::Index> diagnosed_patterns(const AuditCells& cells) {
    std::vector<Eigen::Index> patterns;
    for (const AuditCell& cell : cells.cells) {
        if (cell.cause >= 0 && (patterns.empty() || patterns.back() != cell.pattern)) {
            patterns.push_back(cell.pattern);
        }
    }
    return patterns;
}

AuditedPatients count_patients(const AuditCells& cells, const CellFilter& filter) {
    AuditedPatients result;
    Eigen::Index last = -1;
    for (const AuditCell& cell : cells.cells) {
        if (filter && !filter(cell)) {
            continue;
        }
        if (cell.cause == no_cause) {
            result.undiagnosed += cell.patients;
        } else if (cell.cause == outside_cause) {
            result.outside += cell.patients;
        } else {
            result.diagnosed += cell.patients;
            result.caution += cell.caution ? cell.patients : 0;
            result.patterns += cell.pattern != last ? 1U : 0U;
            last = cell.pattern;
        }
    }
    return result;
}

}  // namespace steelyard::cli
