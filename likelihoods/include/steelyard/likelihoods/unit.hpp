// SPDX-License-Identifier: Apache-2.0
#pragma once
// Units of measurement as laboratories print them: UCUM codes and the trade's spellings. A unit here is a
// run-time value, because it comes from files; values are made canonical once, when a panel is built.

#include <optional>
#include <span>
#include <string>
#include <string_view>
#include <vector>

namespace steelyard::likelihoods {

/// What kind of quantity a unit measures. Two units convert only within a kind, or between amount and mass
/// (or equivalents) of a substance whose molar mass (or charge) is known.
enum class Dimension {
    amount_concentration,      // mmol/L
    equivalent_concentration,  // meq/L
    mass_concentration,        // g/L
    amount_rate,               // mmol/d
    equivalent_rate,           // meq/d
    mass_rate,                 // mg/d
    pressure,                  // mm[Hg]
    osmolality,                // mosm/kg
    ph,                        // [pH]
    indexed_filtration,        // mL/min/{1.73_m2}
    fraction,                  // %
    ratio,                     // 1
    amount_ratio,              // mmol/mmol
    time,                      // a
    enzyme_rate,               // ng/mL/h
    arbitrary_concentration    // m[IU]/L
};

struct Unit {
    std::string_view ucum;   ///< the UCUM code, `mmol/L`
    std::string_view shown;  ///< as shown to people, `mmHg` for `mm[Hg]`
    Dimension dimension{};
    double to_base = 1.0;  ///< factor to the base unit of the dimension

    bool operator==(const Unit& other) const noexcept { return ucum == other.ucum; }
};

/// What a text means as a unit. `why_not` says, in words, why a recognisable text is refused (`mosm/L` is an
/// osmolarity, `mL/min` is not indexed to body surface); both are empty for a text that is unknown.
/// `mmol/mmol{creat}` is a unit, a ratio: it converts to no concentration.
struct UnitReading {
    std::optional<Unit> unit;
    std::string why_not;
};

/// Every unit the program knows, dimension by dimension.
std::span<const Unit> units() noexcept;

/// Reads a UCUM code or one of the trade's spellings (`mEq/L`, `mmHg`, micro signs U+00B5 and U+03BC).
UnitReading read_unit(std::string_view text);

/// What is needed to pass between amount, mass and equivalents of one substance.
struct Substance {
    double molar_mass = 0.0;  ///< [g/mol]; 0 when no mass unit is accepted
    int charge = 0;           ///< equivalents a mole; 0 when meq/L is not accepted
};

/// The factor by which a value in `from` is multiplied to give `to`; empty when they do not convert for this
/// substance.
std::optional<double> conversion_factor(const Unit& from, const Unit& to, const Substance& substance);

/// The units in which a quantity may be given: its canonical one first, then all that convert to it.
std::vector<Unit> accepted_units(const Unit& canonical, const Substance& substance);

}  // namespace steelyard::likelihoods
