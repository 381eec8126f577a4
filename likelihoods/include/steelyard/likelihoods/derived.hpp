// SPDX-License-Identifier: Apache-2.0
#pragma once
// Quantities computed from analytes: gaps, fractional excretions, filtration. The formulas themselves are in
// chemistry.hpp as plain functions of numbers; here they are tied to the panel, with units and with what they
// need.

#include <map>
#include <span>
#include <string>
#include <string_view>
#include <vector>

#include "steelyard/likelihoods/panel.hpp"

namespace steelyard::likelihoods {

/// Coefficients that a clinic may set (`gate` in set.yaml).
struct ChemistrySettings {
    double albumin_reference = 40.0;       ///< [g/L]
    double albumin_slope = 0.25;           ///< [mmol/g]
    double anion_gap_reference = 10.0;     ///< [mmol/L], centre for the delta ratio
    double bicarbonate_reference = 24.0;   ///< [mmol/L]
    double expected_pco2_slope = 1.5;      ///< [mm[Hg] per mmol/L]
    double expected_pco2_intercept = 8.0;  ///< [mm[Hg]]
};

/// A derived quantity as the program knows it.
struct DerivedQuantity {
    std::string_view id;                   ///< `urine_anion_gap`
    std::string_view title;                ///< `Urine anion gap`
    std::string_view unit;                 ///< UCUM
    std::string_view formula;              ///< in words, `Na + K - Cl`, for reports and docs
    std::string_view source;               ///< citation key or words
    double plausible_low, plausible_high;  ///< for a value given in a case's `derived` section
    Substance substance;                   ///< a gap may be given in meq/L
};

std::span<const DerivedQuantity> derived_quantities();
const DerivedQuantity* find_derived(std::string_view id) noexcept;

enum class Origin { measured, given, computed };

/// A quantity of a panel, measured, given or computed.
struct QuantityValue {
    Interval value;
    std::string_view unit;  ///< canonical UCUM
    Origin origin{};
    std::vector<std::string> from;  ///< analytes it was computed from
    std::vector<std::string> remarks =
        {};  ///< what a reader should know of it, in words: a stand-in used, a term left out
};

/// Every quantity known for one panel by id, and for each derived one that could not be had, what it lacks.
struct Quantities {
    std::map<std::string, QuantityValue, std::less<>> known;
    std::map<std::string, std::vector<std::string>, std::less<>>
        lacking;  ///< derived id -> missing inputs or reason

    const QuantityValue* find(std::string_view id) const noexcept;
};

/// Computes all derived quantities that the panel allows. A value given in the case replaces the computed
/// one. Censored inputs give intervals: every formula is monotone in each input, so the extremes lie at the
/// corners.
Quantities derive(const Panel& panel, const ChemistrySettings& settings = {});

/// The title and UCUM unit of an analyte or derived quantity; empty when the id is neither.
struct QuantityKind {
    std::string_view title;
    std::string_view unit;
    Substance substance;
};
const QuantityKind* find_quantity(std::string_view id) noexcept;

}  // namespace steelyard::likelihoods
