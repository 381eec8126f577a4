// SPDX-License-Identifier: Apache-2.0
#pragma once
// What a laboratory measures, as this program knows it: flat name, canonical unit, molar mass, and the range
// outside which a value is taken for a slip of the pen rather than a patient.

#include <span>
#include <string>
#include <string_view>
#include <vector>

#include "steelyard/likelihoods/unit.hpp"

namespace steelyard::likelihoods {

struct Analyte {
    std::string_view id;     ///< `serum_potassium`
    std::string_view title;  ///< `Serum potassium`
    std::string_view unit;   ///< canonical, a UCUM code
    Substance substance;
    double plausible_low;  ///< in the canonical unit; a value outside is an error, never clipped
    double plausible_high;
    bool unit_may_be_omitted;  ///< pH alone: every other value names its unit
};

/// All analytes, in the order in which a report lists them.
std::span<const Analyte> analytes();
const Analyte* find_analyte(std::string_view id) noexcept;

/// Another name under which a case may give an analyte: urea nitrogen is read as urea, by nitrogen's molar
/// mass.
struct EntryAlias {
    std::string_view name;     ///< `serum_urea_nitrogen`
    std::string_view analyte;  ///< `serum_urea`
    Substance substance;       ///< by which a mass under this name converts
};
std::span<const EntryAlias> entry_aliases();

}  // namespace steelyard::likelihoods
