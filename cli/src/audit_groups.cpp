// SPDX-License-Identifier: Apache-2.0
// The correlation of each group of findings, estimated from the final causes, as a suggestion.
#include <fmt/format.h>

#include <algorithm>

#include "audit_cells.hpp"
#include "steelyard/cli/numbers.hpp"
#include "steelyard/cli/terminal.hpp"

namespace steelyard::cli {
namespace {

using likelihoods::FindingReading;
using likelihoods::Use;

/// The group each table of a set belongs to; -1 for none.
std::vector<int> group_of_table(const likelihoods::TableSet& tables) {
    std::vector<int> group(tables.tables.size(), -1);
    for (std::size_t t = 0; t < tables.tables.size(); ++t) {
        for (std::size_t g = 0; g < tables.groups.size(); ++g) {
            const std::vector<std::string>& findings = tables.groups[g].findings;
            if (std::find(findings.begin(), findings.end(), tables.tables[t].finding) != findings.end()) {
                group[t] = static_cast<int>(g);
            }
        }
    }
    return group;
}

}  // namespace

std::vector<GroupEstimate> group_estimates(const CaseModel& model, const AuditCells& cells) {
    const likelihoods::TableSet& tables = model.tables();
    std::vector<GroupEstimate> estimates;
    for (const likelihoods::Group& group : tables.groups) {
        estimates.push_back({group.name, group.findings, group.rho, 0, std::nullopt});
    }
    const std::vector<Eigen::Index> patterns = diagnosed_patterns(cells);
    if (estimates.empty() || patterns.empty()) {
        return estimates;
    }
    const std::vector<int> group_of = group_of_table(tables);
    const auto rows = static_cast<Eigen::Index>(patterns.size());
    const engine::AuditSample sample =
        *sample_of(cells, Eigen::ArrayXXd::Zero(static_cast<Eigen::Index>(cells.codes.size()), cells.causes));
    engine::GroupedEvidence evidence;
    evidence.log_prior = model.log_prior();
    evidence.count = sample.count;
    evidence.ungrouped.setZero(rows, cells.causes);
    evidence.groups.resize(estimates.size());
    for (engine::GroupEvidence& group : evidence.groups) {
        group.loglik.setZero(rows, cells.causes);
        group.observed.setZero(rows);
    }
    for (Eigen::Index row = 0; row < rows; ++row) {
        const auto code = static_cast<std::size_t>(patterns[static_cast<std::size_t>(row)]);
        for (const FindingReading& reading : likelihoods::pattern_of(tables, cells.codes[code]).findings) {
            if (reading.use != Use::read) {
                continue;
            }
            const Eigen::ArrayXd line = model.line(reading);
            const int group = group_of[reading.table];
            if (group < 0) {
                evidence.ungrouped.row(row) += line.transpose();
            } else {
                engine::GroupEvidence& of = evidence.groups[static_cast<std::size_t>(group)];
                of.loglik.row(row) += line.transpose();
                of.observed(row) += 1.0;
            }
        }
    }
    const Eigen::ArrayXd patients = sample.pattern_counts();
    const engine::GroupCorrelations fitted = engine::fit_group_correlations(evidence);
    for (std::size_t g = 0; g < estimates.size(); ++g) {
        estimates[g].fitted = fitted.group[g];
        estimates[g].patients =
            static_cast<std::uint64_t>((evidence.groups[g].observed >= 2.0).select(patients, 0.0).sum());
    }
    return estimates;
}

namespace {

constexpr std::size_t yaml_width = 76;  // so that it stands on a page of 80 with a margin

/// Text folded over lines, as a YAML value of a key that stands at this indent.
std::string folded(const std::string& text, std::size_t indent) {
    const std::string margin(indent + 2, ' ');
    // Control characters cannot stand in YAML; everything else can in a folded block.
    return ">-\n" + wrapped(visible(text), margin, margin, yaml_width);
}

}  // namespace

bool asks_for_change(const GroupEstimate& group) {
    return group.fitted && (group.rho_now < group.fitted->low || group.rho_now > group.fitted->high);
}

std::string groups_yaml(const Audit& audit) {
    std::string text;
    for (const GroupEstimate& group : audit.groups) {
        if (!asks_for_change(group)) {
            continue;
        }
        std::string findings = "[";
        for (const std::string& finding : group.findings) {
            findings += (findings.size() == 1 ? "" : ", ") + finding;
        }
        text += fmt::format("  - name: {}\n", nlohmann::json(group.name).dump()) +
                wrapped("findings: " + findings + "]", "    ", "      ", yaml_width) +
                fmt::format("    rho: {:.2f}\n    basis: study\n    source: own-audit\n    why: ",
                            group.fitted->rho) +
                folded(fmt::format(
                           "It makes the final causes of {} audited patients likeliest; 95 % interval {:.2f} "
                           "to {:.2f}. It was {} before.",
                           group.patients, group.fitted->low, group.fitted->high, plain(group.rho_now)),
                       4);
    }
    if (text.empty()) {
        return text;
    }
    const Provenance& from = audit.provenance;
    return "groups:  # those whose rho was outside the interval; the others stay\n" + text +
           "sources:\n  own-audit: " +
           folded(
               fmt::format("Own audit of {} patients with a final diagnosis; tables {} ({}), priors {} ({}), "
                           "steelyard {}",
                           audit.patients.diagnosed, from.tables_title, from.tables_digest.substr(0, 23),
                           from.priors_title, from.priors_digest.substr(0, 23), from.version),
               2);
}

}  // namespace steelyard::cli
