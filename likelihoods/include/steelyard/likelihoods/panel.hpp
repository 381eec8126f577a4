// SPDX-License-Identifier: Apache-2.0
#pragma once
// One patient's values at one time, made canonical. A value may be known only to lie beyond a limit (`<5
// mmol/L`): it is kept as an interval, never replaced by a number.

#include <map>
#include <optional>
#include <span>
#include <string>
#include <string_view>
#include <utility>
#include <vector>

#include "steelyard/document/diagnostic.hpp"
#include "steelyard/likelihoods/analyte.hpp"

namespace steelyard::likelihoods {

/// A closed or half-open interval of values; a point when low == high.
struct Interval {
    double low = 0.0, high = 0.0;
    bool low_open = false, high_open = false;
    bool low_is_floor = false;     ///< `low` is only the end of the plausible range, as that of `<5`
    bool high_is_ceiling = false;  ///< `high` is only the end of the plausible range, as that of `>5`

    static Interval point(double value) noexcept { return {value, value}; }
    bool is_point() const noexcept { return low == high; }
    bool operator==(const Interval&) const = default;
};

/// A value as it entered the panel.
struct Reading {
    Interval value;            ///< in the canonical unit of its analyte or derived quantity
    std::string as_read;       ///< the number as written, `<5` included
    std::string unit_as_read;  ///< the unit as written; empty when omitted
    document::SourcePosition where;
};

enum class Sex { unknown, female, male };

/// A feature that was looked for: its level, one of those its table or the set's `features` name.
struct Observation {
    std::string level;
    document::SourcePosition where;
};

struct Panel {
    std::string case_id;
    document::SourcePosition where;
    Sex sex = Sex::unknown;
    std::optional<double> age;                                 ///< [a]
    std::map<std::string, Reading, std::less<>> measured;      ///< by analyte id
    std::map<std::string, Reading, std::less<>> given;         ///< derived quantities given as known, by id
    std::map<std::string, Observation, std::less<>> observed;  ///< by feature id
    std::string urine_ph_method;                               ///< `electrode`, `dipstick` or empty
    std::optional<std::string> final_cause;                    ///< only in audits
};

/// The methods of measurement that a case may state for a quantity (`electrode` and `dipstick` for the urine
/// pH); empty where it may state none.
std::span<const std::string> methods_of(std::string_view quantity);
/// The method that this case states for a quantity; empty when it states none.
std::string_view method_of(const Panel& panel, std::string_view quantity);

/// The features a case may mention, and the levels of each: from a table set.
struct FeatureVocabulary {
    std::map<std::string, std::vector<std::string>, std::less<>> levels;
};

/// How a plain number under one flat name and in one unit becomes a value: number x factor, in the canonical
/// unit, if it lies in the plausible range.
struct EntryScale {
    std::string_view quantity;  ///< the analyte or derived quantity; `age` for the age
    double factor = 1.0;
    double low = 0.0, high = 0.0;
};
/// Whether a flat name is that of a number: an analyte, one of their other names, a derived quantity, the
/// age.
bool names_a_number(std::string_view flat_name) noexcept;
/// @returns  empty when the unit is not one of this quantity: bad_unit is added at `where` then
std::optional<EntryScale> entry_scale(std::string_view flat_name, std::string_view unit,
                                      const document::SourcePosition& where, document::Diagnostics& faults);
/// A flat name that may be meant by one that is not known: `did you mean serum_potassium?`, or nothing.
/// @param text  what stands under it; a number makes it the name of a quantity
std::string meant_by(std::string_view flat_name, const FeatureVocabulary& vocabulary,
                     std::string_view text = {});

/// Builds a panel entry by entry, whatever the file format: each reader calls `set` with flat names. Faults
/// are added at the position given; a faulty entry leaves nothing behind.
class PanelBuilder {
  public:
    PanelBuilder(const FeatureVocabulary& vocabulary, document::Diagnostics& faults);

    void start(std::string case_id, const document::SourcePosition& where);
    /// A flat name (`serum_potassium`, `age`, `sex`, `gfr`, `nephrocalcinosis`, `urine_method`,
    /// `final_cause`) and its text with unit (`2.8 mmol/L`, `<5 mmol/L`, `present`).
    void set(std::string_view flat_name, std::string_view text, const document::SourcePosition& where);
    /// The same with the unit apart, as CSV headers and FHIR give it.
    void set(std::string_view flat_name, std::string_view number, std::string_view unit,
             const document::SourcePosition& where);
    Panel finish();

  private:
    /// Whether nothing gave this quantity or feature before; conflicting_values otherwise.
    bool is_new(std::string_view id, std::string_view flat_name, const document::SourcePosition& where);
    /// Whether the name is that of a quantity, which is then dealt with.
    bool set_number(std::string_view flat_name, std::string_view text, std::string_view unit_apart,
                    const document::SourcePosition& where);
    void set_age(std::string_view text, std::string_view unit_apart, const document::SourcePosition& where);
    void set_word(std::string_view flat_name, std::string_view text, std::string_view unit_apart,
                  const document::SourcePosition& where);
    void unknown_name(std::string_view flat_name, std::string_view text,
                      const document::SourcePosition& where);

    const FeatureVocabulary& vocabulary_;
    document::Diagnostics& faults_;
    Panel panel_;
    std::map<std::string, std::pair<std::string, document::SourcePosition>, std::less<>> seen_;
};

}  // namespace steelyard::likelihoods
