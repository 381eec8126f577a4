// SPDX-License-Identifier: Apache-2.0
#pragma once
// Past posteriors held against final causes: what `steelyard audit` says of a tally. All numbers are the
// engine's; here a tally, tables and priors are laid out for it.

#include <cstdint>
#include <functional>
#include <nlohmann/json.hpp>
#include <optional>
#include <string>
#include <vector>

#include "steelyard/cli/report.hpp"
#include "steelyard/cli/tally.hpp"
#include "steelyard/engine/audit.hpp"
#include "steelyard/engine/group_correlation.hpp"
#include "steelyard/engine/paired_comparison.hpp"
#include "steelyard/engine/score_chart.hpp"

namespace steelyard::cli {

/// With fewer patients than this who have a cause, or who have another, an audit does not say whether its
/// probabilities are right. Common practice of one event in ten and more for each number estimated;
/// docs/audit.md.
inline constexpr double least_events = 10.0;

struct AuditAsked {
    double level = 0.95;  ///< of all intervals
    Eigen::Index replicates = 2000;
    std::uint64_t seed = 1;
    int threads = 1;
    Eigen::Index bins = 10;
    std::string cause;               ///< of net benefit; empty: none is worked out
    std::vector<double> thresholds;  ///< probabilities of it from which one would act
    bool dependence = false;         ///< also estimate rho of each group
    std::function<void(const std::string& what, double done)> progress;
};

struct AuditedCause {
    std::string id, title;
    double prior = 0.0;  ///< probability
    std::uint64_t patients = 0;
};

/// Patients in cells of the tally, under the causes weighed here.
struct AuditedPatients {
    std::uint64_t diagnosed = 0;    ///< final cause among those weighed: what is scored
    std::uint64_t outside = 0;      ///< another final cause
    std::uint64_t undiagnosed = 0;  ///< none
    std::uint64_t caution = 0;      ///< of the diagnosed, those the gate marked `caution`
    std::uint64_t patterns = 0;     ///< different patterns of the diagnosed
};

struct AuditedStratum {
    std::string stratum;
    AuditedPatients patients;
    std::optional<engine::AuditFigures> figures;  ///< empty without a diagnosed patient
};

struct AuditedMonths {
    std::vector<std::string> months;  ///< consecutive, those without a diagnosed patient too
    engine::ScoreChart chart;         ///< one period a month
    std::uint64_t without_month = 0;  ///< diagnosed patients whose month is not known
};

/// How often no cause explained the findings: the largest chance under any cause of findings at least as
/// unusual was below `unexplained_below`.
struct FlaggedPatients {
    std::string cause;  ///< as written
    std::uint64_t patients = 0;
    std::uint64_t judged = 0;  ///< whose findings were looked at
    std::uint64_t flagged = 0;
    std::optional<engine::IntervalEstimate> share;  ///< flagged of judged, Wilson's interval
    double mean_leader = 0.0;  ///< mean posterior of the leading cause, which is wrong for all of them
};

struct AuditedFit {
    FlaggedPatients inside;   ///< final cause among those weighed
    FlaggedPatients outside;  ///< another one
    /// Chance that the findings of a patient from outside are more unusual than those of one from inside.
    std::optional<engine::AreaUnderCurve> area;
    std::vector<FlaggedPatients> causes;  ///< outside, one by one, most patients first
    bool exact = true;                    ///< no chance is from drawn patterns
};

struct AuditComparison {
    Provenance other;
    engine::PairedComparison difference;  ///< first: these tables and priors; second: the other
};

struct GroupEstimate {
    std::string name;
    std::vector<std::string> findings;
    double rho_now = 0.0;
    std::uint64_t patients = 0;  ///< diagnosed, with two or more of its findings read
    std::optional<engine::GroupCorrelation> fitted;
};

struct Audit {
    AuditAsked asked;
    Provenance provenance;
    TallyHead head;
    TallyFlow flow;
    TallyLoss lost;
    std::vector<std::pair<std::string, std::uint64_t>> out_of_scope;  ///< by final cause, most first
    std::vector<AuditedCause> causes;                                 ///< weighed, in the order of the tables
    AuditedPatients patients;
    std::optional<engine::AuditFigures> figures;  ///< empty without a diagnosed patient
    bool too_many_to_resample = false;            ///< 2^31 patients and more: no intervals by resampling
    std::vector<AuditedStratum> strata;
    std::optional<AuditedMonths> months;
    AuditedFit fit;
    std::optional<AuditComparison> against;
    std::vector<GroupEstimate> groups;
    std::string tables_caution;
};

/// Other tables or priors to compare with; exactly one differs.
struct AuditAgainst {
    const likelihoods::TableSet* tables = nullptr;
    const priors::PriorSet* priors = nullptr;
};

/// @param tally   read with tables of the same reading digest   @param priors  names only causes of `tables`
/// @param against its prior set weighs the same causes
/// @throws TallyError  the tally is of another reading   @throws engine::DomainError  an option
Audit audit_of(const Tally& tally, const likelihoods::TableSet& tables, const priors::PriorSet& priors,
               const AuditAsked& asked, const std::optional<AuditAgainst>& against = std::nullopt);

/// What an audit comes to, in a word.
enum class AuditVerdict {
    nobody,        ///< no patient has a final cause among those weighed
    too_few,       ///< no cause has enough patients with and without it
    unclear,       ///< nothing speaks against the probabilities, but little could
    fits,          ///< nothing speaks against them, and an error that matters would have shown
    too_sure,      ///< large ones too large, small ones too small
    too_cautious,  ///< the other way round
    shifted        ///< neither, but some cause is commoner or rarer than it was given
};
std::string_view to_string(AuditVerdict verdict) noexcept;

/// The same for one cause.
struct CauseVerdict {
    bool told = false;  ///< `least_events` with it and without it
    bool commoner = false, rarer = false, too_sure = false, too_cautious = false;
};

struct AuditWords {
    AuditVerdict verdict = AuditVerdict::nobody;
    std::vector<CauseVerdict> causes;
    std::string headline;              ///< whether the probabilities can be believed, in one or two sentences
    std::vector<std::string> remarks;  ///< what is over- or under-confident, what cannot be told
    std::vector<std::string> limits;   ///< what no audit of such patients can say
    std::string comparison;            ///< with --against: which is better; may be empty
};
AuditWords words_of(const Audit& audit);

std::string audit_text(const Audit& audit, bool colour);
nlohmann::ordered_json audit_json(const Audit& audit);
/// One long table: table, stratum, cause, item, quantity, value, low, high, patients.
std::string audit_csv(const Audit& audit);
/// Whether what rho is now lies outside the interval of the estimate.
bool asks_for_change(const GroupEstimate& group);
/// Lines for set.yaml of the groups that ask for a change; empty when there are none.
std::string groups_yaml(const Audit& audit);

}  // namespace steelyard::cli
