// SPDX-License-Identifier: Apache-2.0
#include "steelyard/cli/audit.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "audit_cells.hpp"
#include "steelyard/cli/terminal.hpp"

namespace steelyard::cli {
namespace {

constexpr double most_resampled = 2147483648.0;  // 2^31, the engine's limit
constexpr int most_months = 1200;                // a century; more is a slip in a date

/// Shares of the work, for the progress line.
class Steps {
  public:
    explicit Steps(const AuditAsked& asked) : asked_(asked) {}
    std::function<void(double)> step(const std::string& what, double weight) {
        const double before = begun_;
        begun_ += weight;
        if (!asked_.progress) {
            return {};
        }
        return [this, what, before, weight](double done) {
            asked_.progress(what, std::min(before + weight * done, 1.0));
        };
    }

  private:
    const AuditAsked& asked_;
    double begun_ = 0.0;
};

engine::AuditOptions options_for(const Audit& audit, const engine::AuditSample& sample,
                                 std::function<void(double)> progress) {
    engine::AuditOptions options;
    options.level = audit.asked.level;
    options.replicates = sample.patients() < most_resampled ? audit.asked.replicates : 0;
    options.seed = audit.asked.seed;
    options.threads = audit.asked.threads;
    options.bins = audit.asked.bins;
    for (std::size_t k = 0; k < audit.causes.size(); ++k) {
        if (audit.causes[k].id == audit.asked.cause) {
            for (const double threshold : audit.asked.thresholds) {
                options.thresholds.push_back({static_cast<Eigen::Index>(k), threshold});
            }
        }
    }
    options.progress = std::move(progress);
    return options;
}

void check_reading(const Tally& tally, const likelihoods::TableSet& tables) {
    if (tally.head().reading_digest != likelihoods::reading_digest(tables)) {
        throw TallyError(
            fmt::format("the cases of this tally were read with other bands, conditions or gate limits "
                        "(\"{}\") than those "
                        "of the tables \"{}\", so its patterns mean nothing here",
                        visible(tally.head().tables_title), visible(tables.title)));
    }
}

std::vector<AuditedCause> audited_causes(const likelihoods::TableSet& tables,
                                         const priors::PriorSet& priors) {
    std::vector<AuditedCause> causes;
    for (const likelihoods::Cause& cause : tables.causes) {
        if (const priors::PriorCause* prior = priors.find(cause.id)) {
            causes.push_back({cause.id, cause.title, prior->probability, 0});
        }
    }
    return causes;
}

std::vector<AuditedStratum> audited_strata(const Audit& audit, const AuditCells& cells,
                                           const Eigen::ArrayXXd& log_posterior,
                                           const std::function<void(double)>& progress) {
    std::vector<AuditedStratum> strata;
    for (std::size_t s = 0; s < cells.strata.size(); ++s) {
        const CellFilter filter = [s](const AuditCell& cell) { return cell.stratum == s; };
        AuditedStratum stratum{cells.strata[s], count_patients(cells, filter), std::nullopt};
        if (const auto sample = sample_of(cells, log_posterior, filter)) {
            stratum.figures = engine::audit(*sample, options_for(audit, *sample, {}));
        }
        strata.push_back(std::move(stratum));
        if (progress) {
            progress(static_cast<double>(s + 1) / static_cast<double>(cells.strata.size()));
        }
    }
    std::sort(strata.begin(), strata.end(),
              [](const AuditedStratum& a, const AuditedStratum& b) { return a.stratum < b.stratum; });
    return strata;
}

int month_number(const std::string& month) {
    return std::stoi(month.substr(0, 4)) * 12 + std::stoi(month.substr(5, 2)) - 1;
}
std::string month_name(int number) {
    return fmt::format("{:04}-{:02}", number / 12, number % 12 + 1);
}

/// Consecutive months from the first to the last with a diagnosed patient.
std::optional<AuditedMonths> audited_months(const AuditCells& cells, const Eigen::ArrayXXd& log_posterior) {
    AuditedMonths result;
    int first = 0, last = -1;
    for (const AuditCell& cell : cells.cells) {
        if (cell.cause < 0) {
            continue;
        }
        if (cells.months[cell.month].empty()) {
            result.without_month += cell.patients;
            continue;
        }
        const int month = month_number(cells.months[cell.month]);
        first = last < 0 ? month : std::min(first, month);
        last = std::max(last, month);
    }
    if (last < 0) {
        return std::nullopt;
    }
    if (last - first >= most_months) {
        throw TallyError(fmt::format("the months of the tally run from {} to {}: one of them must be wrong",
                                     month_name(first), month_name(last)));
    }
    std::vector<engine::AuditSample> periods;
    for (int month = first; month <= last; ++month) {
        result.months.push_back(month_name(month));
        const auto place = std::find(cells.months.begin(), cells.months.end(), result.months.back());
        const auto index = static_cast<std::size_t>(place - cells.months.begin());
        std::optional<engine::AuditSample> sample =
            sample_of(cells, log_posterior, [index](const AuditCell& cell) { return cell.month == index; });
        periods.push_back(
            sample ? std::move(*sample)
                   : engine::AuditSample{Eigen::ArrayXXd(0, cells.causes), Eigen::ArrayXXd(0, cells.causes)});
    }
    result.chart = engine::score_chart(periods);
    return result;
}

AuditComparison compared(const Audit& audit, const AuditCells& cells, const engine::AuditSample& sample,
                         const likelihoods::TableSet& tables, const priors::PriorSet& priors,
                         const std::function<void(double)>& progress) {
    const CaseModel other = model_of(tables, priors);
    std::vector<std::string> codes;
    for (const Eigen::Index g : diagnosed_patterns(cells)) {
        codes.push_back(cells.codes[static_cast<std::size_t>(g)]);
    }
    // The other tables may list the same causes in another order.
    const Eigen::ArrayXXd theirs = log_posteriors(other, codes, audit.asked.threads, {});
    engine::PairedSample paired;
    paired.log_forecast = sample.log_forecast;
    paired.other_log_forecast.resize(sample.patterns(), sample.causes());
    for (std::size_t k = 0; k < audit.causes.size(); ++k) {
        const auto place = std::find(other.causes().begin(), other.causes().end(), audit.causes[k].id);
        if (place == other.causes().end() || other.causes().size() != audit.causes.size()) {
            throw TallyError("what is compared must weigh the same causes");
        }
        paired.other_log_forecast.col(static_cast<Eigen::Index>(k)) =
            theirs.col(place - other.causes().begin());
    }
    paired.count = sample.count;
    engine::ResamplingOptions options;
    options.replicates = audit.asked.replicates;
    options.seed = audit.asked.seed;
    options.threads = audit.asked.threads;
    options.level = audit.asked.level;
    options.progress = progress;
    return {provenance_of(tables, priors), engine::compare_paired(paired, options)};
}

}  // namespace

Audit audit_of(const Tally& tally, const likelihoods::TableSet& tables, const priors::PriorSet& priors,
               const AuditAsked& asked, const std::optional<AuditAgainst>& against) {
    check_reading(tally, tables);
    Audit audit;
    audit.asked = asked;
    audit.provenance = provenance_of(tables, priors);
    audit.head = tally.head();
    audit.flow = tally.flow();
    audit.lost = tally.lost();
    audit.out_of_scope.assign(tally.out_of_scope().begin(), tally.out_of_scope().end());
    std::stable_sort(audit.out_of_scope.begin(), audit.out_of_scope.end(),
                     [](const auto& a, const auto& b) { return a.second > b.second; });
    audit.causes = audited_causes(tables, priors);
    audit.tables_caution = tables.caution;

    Steps steps(asked);
    const CaseModel model = model_of(tables, priors);
    const AuditCells cells = cells_of(tally, model.causes());
    audit.patients = count_patients(cells);
    for (const AuditCell& cell : cells.cells) {
        if (cell.cause >= 0) {
            audit.causes[static_cast<std::size_t>(cell.cause)].patients += cell.patients;
        }
    }
    const Eigen::ArrayXXd log_posterior =
        log_posteriors(model, cells.codes, asked.threads, steps.step("posteriors", 0.1));
    audit.fit = fit_of_tally(model, cells, log_posterior, asked, steps.step("fit", 0.2));
    const std::optional<engine::AuditSample> sample = sample_of(cells, log_posterior);
    if (!sample) {
        return audit;
    }
    audit.too_many_to_resample = sample->patients() >= most_resampled;
    audit.figures = engine::audit(*sample, options_for(audit, *sample, steps.step("intervals", 0.3)));
    if (!tally.head().by.empty()) {
        audit.strata = audited_strata(audit, cells, log_posterior, steps.step("strata", 0.2));
    }
    if (tally.head().months) {
        audit.months = audited_months(cells, log_posterior);
    }
    if (against) {
        const likelihoods::TableSet& other_tables = against->tables != nullptr ? *against->tables : tables;
        check_reading(tally, other_tables);
        if (audit.too_many_to_resample) {
            throw TallyError("2^31 patients and more cannot be compared in pairs");
        }
        audit.against =
            compared(audit, cells, *sample, other_tables,
                     against->priors != nullptr ? *against->priors : priors, steps.step("comparison", 0.15));
    }
    if (asked.dependence) {
        audit.groups = group_estimates(model, cells);
    }
    return audit;
}

}  // namespace steelyard::cli
