// SPDX-License-Identifier: Apache-2.0
#include "steelyard/likelihoods/panel.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <span>
#include <utility>

#include "entry_text.hpp"
#include "steelyard/document/strict_map.hpp"
#include "steelyard/likelihoods/derived.hpp"
#include "wording.hpp"

namespace steelyard::likelihoods {
namespace {

using detail::Comparator;
using detail::EntryText;
using document::Code;
using document::Diagnostics;
using document::SourcePosition;

/// What an entry of a number is read against.
struct Target {
    std::string_view id;  ///< under which it is kept
    bool is_derived = false;
    Unit unit;  ///< canonical
    Substance substance;
    double low = 0.0, high = 0.0;
    bool unit_may_be_omitted = false;
};

std::optional<Target> find_target(std::string_view name) {
    std::string_view id = name;
    std::optional<Substance> by_alias;
    for (const EntryAlias& alias : entry_aliases()) {
        if (alias.name == name) {
            id = alias.analyte;
            by_alias = alias.substance;
        }
    }
    if (const Analyte* a = find_analyte(id)) {
        return Target{a->id,
                      false,
                      *read_unit(a->unit).unit,
                      by_alias.value_or(a->substance),
                      a->plausible_low,
                      a->plausible_high,
                      a->unit_may_be_omitted};
    }
    if (const DerivedQuantity* d = find_derived(id)) {
        const Unit unit = *read_unit(d->unit).unit;
        return Target{d->id,
                      true,
                      unit,
                      d->substance,
                      d->plausible_low,
                      d->plausible_high,
                      unit.dimension == Dimension::ratio};
    }
    return std::nullopt;
}

std::string listed(std::span<const std::string> words) {
    std::string text;
    for (std::size_t i = 0; i < words.size(); ++i) {
        text += i == 0 ? "" : i + 1 == words.size() ? " or " : ", ";
        text += words[i];
    }
    return text;
}

/// The accepted units in which a value of this quantity is a number people write: not mol/L of potassium.
std::vector<Unit> customary_units(const Target& target) {
    std::vector<Unit> units = accepted_units(target.unit, target.substance);
    std::erase_if(units, [&](const Unit& unit) {
        const double highest =
            target.high / conversion_factor(unit, target.unit, target.substance).value_or(1.0);
        return !(unit == target.unit) && !(0.5 <= highest && highest <= 60000.0);
    });
    return units;
}

std::string accepted_in_words(const Target& target) {
    std::vector<std::string> codes;
    for (const Unit& unit : customary_units(target)) {
        codes.emplace_back(unit.ucum);
    }
    return "accepted: " + listed(codes);
}

std::string with_unit(double value, const Unit& unit) {
    return detail::shown(value) + detail::unit_after_number(unit.ucum);
}

/// The factor from the unit as written; bad_unit otherwise.
std::optional<double> read_factor(std::string_view name, std::string_view unit_text, const Target& target,
                                  const SourcePosition& where, Diagnostics& faults) {
    if (unit_text.empty()) {
        if (target.unit_may_be_omitted) {
            return 1.0;
        }
        faults.add(where, Code::bad_unit, fmt::format("{} has no unit", name), accepted_in_words(target));
        return std::nullopt;
    }
    const UnitReading reading = read_unit(unit_text);
    if (!reading.unit) {
        faults.add(where, Code::bad_unit,
                   reading.why_not.empty()
                       ? fmt::format("{}: \"{}\" is not a known unit", name, unit_text)
                       : fmt::format("{} cannot be in {}: {}", name, unit_text, reading.why_not),
                   accepted_in_words(target));
        return std::nullopt;
    }
    const std::optional<double> factor = conversion_factor(*reading.unit, target.unit, target.substance);
    if (!factor) {
        std::string why;
        if (reading.unit->dimension == Dimension::amount_ratio) {
            why = ": it is a ratio, to creatinine for instance, not a concentration";
        } else if (reading.unit->dimension == Dimension::amount_rate ||
                   reading.unit->dimension == Dimension::equivalent_rate ||
                   reading.unit->dimension == Dimension::mass_rate) {
            why = ": it is an excretion per time, not a concentration";
        }
        faults.add(where, Code::bad_unit, fmt::format("{} cannot be in {}{}", name, unit_text, why),
                   accepted_in_words(target));
    }
    return factor;
}

/// `74 mg/dL (6542 umol/L)`, or the value alone when no conversion took place.
std::string as_read_and_converted(const EntryText& entry, std::string_view unit_text, double value,
                                  const Target& target) {
    std::string text(entry.as_read);
    text += unit_text.empty() ? "" : " ";
    text += unit_text;
    if (value != entry.number) {
        text += fmt::format(" ({:.4g} {})", value, target.unit.ucum);
    }
    return text;
}

/// What a clinician may have meant: the other units in which the same number would be plausible.
std::string likely_slip(const EntryText& entry, std::string_view unit_text, const Target& target) {
    const UnitReading reading = read_unit(unit_text);
    const std::string_view read_code = reading.unit ? reading.unit->ucum : std::string_view{};
    std::vector<std::string> plausible;
    for (const Unit& unit : customary_units(target)) {
        const double factor = conversion_factor(unit, target.unit, target.substance).value_or(0.0);
        const double value = entry.number * factor;
        if (unit.ucum != read_code && target.low <= value && value <= target.high) {
            plausible.emplace_back(unit.ucum);
        }
    }
    return plausible.empty() || unit_text.empty()
               ? "check the unit and the decimal point"
               : fmt::format("check the unit and the decimal point; {} would be plausible in {}",
                             entry.as_read, listed(plausible));
}

/// The interval of an entry, in the canonical unit. A censored value runs to the end of the plausible range:
/// what no laboratory would believe as a number is no better as a bound. implausible_value or bad_limit
/// otherwise.
std::optional<Interval> read_interval(std::string_view name, const EntryText& entry,
                                      std::string_view unit_text, double factor, const Target& target,
                                      const SourcePosition& where, Diagnostics& faults) {
    const double value = entry.number * factor;
    const bool inside = target.low <= value && value <= target.high;
    if (entry.comparator == Comparator::none) {
        if (!inside) {
            faults.add(where, Code::implausible_value,
                       fmt::format("{} is {}, outside the plausible range {} to {}", name,
                                   as_read_and_converted(entry, unit_text, value, target),
                                   detail::shown(target.low), with_unit(target.high, target.unit)),
                       likely_slip(entry, unit_text, target));
            return std::nullopt;
        }
        return Interval::point(value);
    }
    const bool below = entry.comparator == Comparator::less || entry.comparator == Comparator::at_most;
    const bool open = entry.comparator == Comparator::less || entry.comparator == Comparator::greater;
    const bool nothing_left = open && value == (below ? target.low : target.high);
    if (!inside || nothing_left) {
        faults.add(
            where, Code::bad_limit,
            fmt::format("{} is {}: the limit lies at or beyond the end of the plausible range {} to {}", name,
                        as_read_and_converted(entry, unit_text, value, target), detail::shown(target.low),
                        with_unit(target.high, target.unit)),
            likely_slip(entry, unit_text, target));
        return std::nullopt;
    }
    if (value == (below ? target.low : target.high)) {
        return Interval::point(value);  // `<= 0` of what cannot be below 0
    }
    Interval limit;
    limit.low = below ? target.low : value;
    limit.high = below ? value : target.high;
    limit.low_open = open && !below;
    limit.high_open = open && below;
    limit.low_is_floor = below;
    limit.high_is_ceiling = !below;
    return limit;
}

std::vector<std::string> quantity_names() {
    std::vector<std::string> names;
    for (const Analyte& analyte : analytes()) {
        names.emplace_back(analyte.id);
    }
    for (const EntryAlias& alias : entry_aliases()) {
        names.emplace_back(alias.name);
    }
    for (const DerivedQuantity& derived : derived_quantities()) {
        names.emplace_back(derived.id);
    }
    for (const std::string_view other : {"age", "sex", "urine_method", "final_cause"}) {
        names.emplace_back(other);
    }
    return names;
}

/// Whether an unknown name was meant for a measurement: by its section, or because it has a number.
bool looks_measured(std::string_view name, std::string_view text) {
    constexpr auto sections = std::to_array<std::string_view>(
        {"serum_", "plasma_", "arterial_", "venous_", "urine_", "blood_", "derived_"});
    if (std::any_of(sections.begin(), sections.end(),
                    [&](auto section) { return name.starts_with(section); })) {
        return true;
    }
    EntryText entry;
    detail::EntryFault fault;
    return detail::read_entry_text(text, entry, fault);
}

std::string did_you_mean(std::string_view name, std::span<const std::string> known) {
    const std::string nearest = document::nearest(name, known);
    return nearest.empty() ? std::string() : fmt::format("did you mean {}?", nearest);
}

Target age_target() {
    constexpr double oldest = 130.0;  // [a], elicited
    return {"age", false, *read_unit("a").unit, {}, 0.0, oldest, false};
}

}  // namespace

PanelBuilder::PanelBuilder(const FeatureVocabulary& vocabulary, Diagnostics& faults)
    : vocabulary_(vocabulary), faults_(faults) {}

void PanelBuilder::start(std::string case_id, const SourcePosition& where) {
    panel_ = Panel{};
    seen_.clear();
    panel_.case_id = std::move(case_id);
    panel_.where = where;
}

void PanelBuilder::set(std::string_view flat_name, std::string_view text, const SourcePosition& where) {
    set(flat_name, text, {}, where);
}

void PanelBuilder::set(std::string_view flat_name, std::string_view number, std::string_view unit,
                       const SourcePosition& where) {
    const std::string_view text = detail::trimmed(number);
    const std::string_view unit_apart = detail::trimmed(unit);
    if (text.empty()) {
        faults_.add(where, Code::empty_value, fmt::format("{} is empty", flat_name),
                    "leave the entry out when the value is not known");
        return;
    }
    if (set_number(flat_name, text, unit_apart, where)) {
        return;
    }
    if (flat_name == "age") {
        if (is_new(flat_name, flat_name, where)) {
            set_age(text, unit_apart, where);
        }
        return;
    }
    set_word(flat_name, text, unit_apart, where);
}

Panel PanelBuilder::finish() {
    seen_.clear();
    return std::exchange(panel_, Panel{});
}

bool PanelBuilder::is_new(std::string_view id, std::string_view flat_name, const SourcePosition& where) {
    const auto [found, inserted] = seen_.try_emplace(std::string(id), std::string(flat_name), where);
    if (inserted) {
        return true;
    }
    const auto& [first_name, first_where] = found->second;
    faults_.add(where, Code::conflicting_values,
                first_name == flat_name ? fmt::format("{} is given twice, first at {}", flat_name,
                                                      document::to_string(first_where))
                                        : fmt::format("{} and {} (at {}) give the same quantity", flat_name,
                                                      first_name, document::to_string(first_where)),
                "a case is one sample at one time: keep one of the two");
    return false;
}

bool PanelBuilder::set_number(std::string_view flat_name, std::string_view text, std::string_view unit_apart,
                              const SourcePosition& where) {
    const std::optional<Target> found = find_target(flat_name);
    if (!found) {
        return false;
    }
    const Target& target = *found;
    if (!is_new(target.id, flat_name, where)) {
        return true;
    }
    EntryText entry;
    detail::EntryFault fault;
    if (!detail::read_entry_text(text, entry, fault)) {
        faults_.add(where, fault.code, fmt::format("{}: {}", flat_name, fault.message), fault.hint);
        return true;
    }
    if (!entry.unit.empty() && !unit_apart.empty()) {
        faults_.add(where, Code::bad_unit,
                    fmt::format("{} has a unit twice: {} and {}", flat_name, entry.unit, unit_apart),
                    "write the unit in one place");
        return true;
    }
    const std::string_view unit_text = entry.unit.empty() ? unit_apart : entry.unit;
    const std::optional<double> factor = read_factor(flat_name, unit_text, target, where, faults_);
    if (!factor) {
        return true;
    }
    if (const auto value = read_interval(flat_name, entry, unit_text, *factor, target, where, faults_)) {
        auto& kept = target.is_derived ? panel_.given : panel_.measured;
        kept.insert_or_assign(std::string(target.id),
                              Reading{*value, std::string(entry.as_read), std::string(unit_text), where});
    }
    return true;
}

void PanelBuilder::set_age(std::string_view text, std::string_view unit_apart, const SourcePosition& where) {
    const Target target = age_target();
    EntryText entry;
    detail::EntryFault fault;
    if (!detail::read_entry_text(text, entry, fault)) {
        faults_.add(where, fault.code, fmt::format("age: {}", fault.message), "write years, as in: 47 a");
        return;
    }
    if (entry.comparator != Comparator::none) {
        faults_.add(where, Code::bad_limit, fmt::format("age is {}, but must be one number", entry.as_read),
                    "write years, as in: 47 a");
        return;
    }
    const std::string_view unit_text = entry.unit.empty() ? unit_apart : entry.unit;
    const std::optional<double> factor = read_factor("age", unit_text, target, where, faults_);
    if (!factor) {
        return;
    }
    if (const auto value = read_interval("age", entry, unit_text, *factor, target, where, faults_)) {
        panel_.age = value->low;
    }
}

void PanelBuilder::set_word(std::string_view flat_name, std::string_view text, std::string_view unit_apart,
                            const SourcePosition& where) {
    const auto feature = vocabulary_.levels.find(flat_name);
    const bool is_meta = flat_name == "sex" || flat_name == "urine_method" || flat_name == "final_cause";
    if (feature == vocabulary_.levels.end() && !is_meta) {
        unknown_name(flat_name, text, where);
        return;
    }
    if (!is_new(flat_name, flat_name, where)) {
        return;
    }
    if (!unit_apart.empty()) {
        faults_.add(where, Code::bad_unit,
                    fmt::format("{} takes no unit, but has {}", flat_name, unit_apart));
        return;
    }
    const auto choose = [&](std::span<const std::string> choices, Code code) {
        if (std::find(choices.begin(), choices.end(), text) != choices.end()) {
            return true;
        }
        faults_.add(where, code,
                    fmt::format("{} is \"{}\", but must be {}", flat_name, text, listed(choices)),
                    did_you_mean(text, choices));
        return false;
    };
    if (is_meta) {
        static const std::vector<std::string> sexes{"female", "male", "unknown"};
        if (flat_name == "final_cause") {
            panel_.final_cause = std::string(text);
        } else if (flat_name == "sex" && choose(sexes, Code::bad_choice)) {
            panel_.sex = text == "female" ? Sex::female : text == "male" ? Sex::male : Sex::unknown;
        } else if (flat_name == "urine_method" && choose(methods_of("urine_ph"), Code::bad_choice)) {
            panel_.urine_ph_method = std::string(text);
        }
        return;
    }
    if (choose(feature->second, Code::bad_level)) {
        panel_.observed.insert_or_assign(std::string(flat_name), Observation{std::string(text), where});
    }
}

std::span<const std::string> methods_of(std::string_view quantity) {
    static const std::vector<std::string> of_urine_ph{"electrode", "dipstick"};
    return quantity == "urine_ph" ? std::span<const std::string>(of_urine_ph)
                                  : std::span<const std::string>();
}

std::string_view method_of(const Panel& panel, std::string_view quantity) {
    return quantity == "urine_ph" ? std::string_view(panel.urine_ph_method) : std::string_view();
}

bool names_a_number(std::string_view flat_name) noexcept {
    return flat_name == "age" || find_target(flat_name).has_value();
}

std::optional<EntryScale> entry_scale(std::string_view flat_name, std::string_view unit,
                                      const SourcePosition& where, Diagnostics& faults) {
    const Target target = flat_name == "age" ? age_target() : *find_target(flat_name);
    const std::optional<double> factor = read_factor(flat_name, detail::trimmed(unit), target, where, faults);
    if (!factor) {
        return std::nullopt;
    }
    return EntryScale{target.id, *factor, target.low, target.high};
}

std::string meant_by(std::string_view flat_name, const FeatureVocabulary& vocabulary, std::string_view text) {
    std::vector<std::string> features;
    for (const auto& [id, levels] : vocabulary.levels) {
        features.push_back(id);
    }
    const std::vector<std::string> quantities = quantity_names();
    const bool measured = looks_measured(flat_name, text);
    std::string hint = did_you_mean(flat_name, measured ? quantities : features);
    return hint.empty() ? did_you_mean(flat_name, measured ? features : quantities) : hint;
}

void PanelBuilder::unknown_name(std::string_view flat_name, std::string_view text,
                                const SourcePosition& where) {
    const bool measured = looks_measured(flat_name, text);
    std::string hint = meant_by(flat_name, vocabulary_, text);
    if (measured) {
        faults_.add(where, Code::unknown_analyte,
                    fmt::format("{} is no quantity this program knows", flat_name), std::move(hint));
    } else {
        faults_.add(where, Code::unknown_feature,
                    fmt::format("{} is no feature of this table set", flat_name), std::move(hint));
    }
}

}  // namespace steelyard::likelihoods
