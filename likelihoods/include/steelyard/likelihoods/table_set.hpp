// SPDX-License-Identifier: Apache-2.0
#pragma once
// A table set: causes, evidence tables, groups, alternatives, features, gate, urgent limits and
// variation. A value of this type is whole and coherent; read_table_set.hpp makes one from files.

#include <Eigen/Core>
#include <map>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "steelyard/document/sources.hpp"
#include "steelyard/engine/proportion.hpp"
#include "steelyard/engine/row_forms.hpp"
#include "steelyard/likelihoods/gate.hpp"
#include "steelyard/likelihoods/panel.hpp"
#include "steelyard/likelihoods/variation.hpp"

namespace steelyard::likelihoods {

struct Cause {
    std::string id;
    std::string title;
    std::string icd10cm;             ///< may be empty
    std::vector<std::string> parts;  ///< of a composite; empty otherwise
    std::map<std::string, std::string, std::less<>>
        takes;              ///< composite: finding -> the part whose row it takes
    std::string otherwise;  ///< composite: the part whose row it takes for all other findings
    std::string note;       ///< why, in words; may be empty
    document::SourcePosition where;
};

enum class FindingKind { quantity, feature, joint };

/// One condition under which a table may be read.
struct Condition {
    std::string subject;  ///< quantity or feature id
    bool is_feature = false;
    std::optional<double> at_least, at_most, above, below;  ///< quantity: canonical unit
    std::string level;                                      ///< feature: the level it must have
    bool set_aside_when_unknown = false;
    std::string otherwise;                     ///< the reason shown when it fails (`else`)
    std::optional<document::Grounds> grounds;  ///< of the limit, where the file gives them
};

enum class RowForm { counts, share, summary, ratio, ratio_to_rest, joint };
std::string_view to_string(RowForm form) noexcept;

/// The evidence of one cause for one finding, as given and as compiled.
struct EvidenceRow {
    std::string cause;
    RowForm form{};
    document::Grounds grounds;
    std::string note;
    std::string against;  ///< ratio: the cause whose row the ratios refer to; empty otherwise
    std::vector<engine::IntervalEstimate>
        published;  ///< ratio and ratio_to_rest: per band the ratio and its 95 % range as given, the ratio
                    ///< three times without one; empty for other forms
    engine::CompiledRow compiled;     ///< band probabilities as used, and the law of their uncertainty
    bool least_acted = false;         ///< the table's `least` raised a band of this row
    std::string as_given;             ///< in words: `mean 23, SEM 4.1, n 11`
    double effective_patients = 0.0;  ///< how many patients the row is worth; 0 for ratios, which do not say
    document::SourcePosition where;
};

struct EvidenceTable {
    std::string finding;
    FindingKind kind = FindingKind::quantity;
    std::string title;
    std::string unit;                              ///< UCUM; empty for features
    std::vector<double> edges;                     ///< of a quantity; a band includes its lower edge
    std::vector<std::string> levels;               ///< of a feature
    std::vector<std::string> band_names;           ///< one per band, as shown to people
    std::vector<std::string> joint_of;             ///< of a joint table: the two findings
    std::vector<std::vector<double>> joint_edges;  ///< per member; empty for a feature
    std::vector<std::vector<std::string>>
        joint_names;     ///< per member: names of its bands (levels for a feature)
    std::string burden;  ///< bedside, routine, specialised
    std::string caution;
    std::string note;  ///< for those who keep the tables; may be empty
    std::vector<Condition> usable_when;
    std::vector<EvidenceRow> rows;  ///< one per non-composite cause, in the order of the set
    document::Sources sources;
    double least = 0.005;      ///< bands of judged rows are raised to it, then the row is normalised
    Eigen::ArrayXd study_mix;  ///< ratio_to_rest: share of each row's cause, sums to 1; empty otherwise
    bool scale_is_unique =
        true;  ///< ratio_to_rest: whether the ratios fix the rows; ratios between causes always are
    Eigen::ArrayXd incoherence;  ///< ratio_to_rest: |S - 1| per band; empty otherwise
    document::SourcePosition where;

    Eigen::Index bands() const noexcept { return static_cast<Eigen::Index>(band_names.size()); }
};

struct Group {
    std::string name;
    std::vector<std::string> findings;
    std::vector<std::size_t> tables;  ///< the same as indices into TableSet::tables
    double rho = 0.0;
    document::Grounds grounds;
    std::string why;
};

/// Findings that estimate one quantity, in order of preference: the first that is present and usable is read.
struct OneOf {
    std::string name;
    std::vector<std::string> findings;
    std::vector<std::size_t> tables;  ///< the same as indices into TableSet::tables
    std::string why;
};

/// Something seen or asked that no table reads but conditions name.
struct Feature {
    std::string id;
    std::string title;
    std::vector<std::string> levels;
};

/// One key of `gate` as the clinic wrote it, for display; its number is in GateSettings.
struct GateEntry {
    std::string key;
    std::string as_given;
    document::Grounds grounds;
    std::string note;  ///< may be empty
};

struct TableSet {
    std::string title;
    std::string name;  ///< `shipped:adult` or the folder as given
    std::string digest;
    std::vector<Cause> causes;  ///< composites last
    std::vector<EvidenceTable>
        tables;  ///< in the order of `findings` in set.yaml, which is the order of reports
    std::vector<Group> groups;
    std::vector<OneOf> one_of;
    std::vector<Feature> features;
    GateSettings gate;
    std::vector<GateEntry> gate_entries;  ///< in the order of the program's list of keys
    std::vector<UrgentLimit> urgent;
    VariationSettings variation;
    document::Sources sources;
    std::string caution;

    const Cause* find_cause(std::string_view id) const noexcept;
    const EvidenceTable* find_table(std::string_view finding) const noexcept;
    FeatureVocabulary vocabulary() const;
    /// Title of a cause, quantity, feature or finding, for people.
    std::string title_of(std::string_view id) const;
};

/// P(band | cause), one column per cause asked for, composites resolved through their parts. Shape (bands,
/// causes).
/// @throws std::out_of_range  a cause is not of the set (callers check first and report it at its line).
Eigen::ArrayXXd band_probabilities(const TableSet& set, const EvidenceTable& table,
                                   const std::vector<std::string>& causes);

/// The row that a cause takes in a table: its own, or that of the part a composite takes.
const EvidenceRow& row_of(const TableSet& set, const EvidenceTable& table, std::string_view cause);

}  // namespace steelyard::likelihoods
