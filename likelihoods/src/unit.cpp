// SPDX-License-Identifier: Apache-2.0
// One fixed table of units and spellings, to be reviewed by eye: no grammar, so nothing is accepted that
// nobody looked at. Factors within a dimension are exact decimals, but for kPa (UCUM: mm[Hg] is 0.133322 kPa
// exactly) and the calendar (UCUM: a is 365.25 d, mo is a twelfth of it, wk is 7 d).

#include "steelyard/likelihoods/unit.hpp"

#include <algorithm>
#include <array>

namespace steelyard::likelihoods {
namespace {

using enum Dimension;

constexpr auto table = std::to_array<Unit>({
    // base mmol/L
    {"mmol/L", "mmol/L", amount_concentration, 1.0},
    {"mol/L", "mol/L", amount_concentration, 1e3},
    {"umol/L", "µmol/L", amount_concentration, 1e-3},
    {"nmol/L", "nmol/L", amount_concentration, 1e-6},
    {"pmol/L", "pmol/L", amount_concentration, 1e-9},
    // base meq/L
    {"meq/L", "mEq/L", equivalent_concentration, 1.0},
    // base g/L
    {"g/L", "g/L", mass_concentration, 1.0},
    {"g/dL", "g/dL", mass_concentration, 10.0},
    {"mg/dL", "mg/dL", mass_concentration, 1e-2},
    {"mg/L", "mg/L", mass_concentration, 1e-3},
    {"ug/dL", "µg/dL", mass_concentration, 1e-5},
    {"ug/L", "µg/L", mass_concentration, 1e-6},
    {"ng/mL", "ng/mL", mass_concentration, 1e-6},
    {"ng/dL", "ng/dL", mass_concentration, 1e-8},
    {"ng/L", "ng/L", mass_concentration, 1e-9},
    {"pg/mL", "pg/mL", mass_concentration, 1e-9},
    // base mmol/d
    {"mmol/d", "mmol/d", amount_rate, 1.0},
    {"mmol/(24.h)", "mmol/24 h", amount_rate, 1.0},
    {"umol/d", "µmol/d", amount_rate, 1e-3},
    {"umol/min", "µmol/min", amount_rate, 1.44},
    // base meq/d
    {"meq/d", "mEq/d", equivalent_rate, 1.0},
    {"meq/(24.h)", "mEq/24 h", equivalent_rate, 1.0},
    // base mg/d
    {"mg/d", "mg/d", mass_rate, 1.0},
    {"mg/(24.h)", "mg/24 h", mass_rate, 1.0},
    {"g/d", "g/d", mass_rate, 1e3},
    // base mm[Hg]
    {"mm[Hg]", "mmHg", pressure, 1.0},
    {"kPa", "kPa", pressure, 1.0 / 0.133322},
    // base mosm/kg
    {"mosm/kg", "mOsm/kg", osmolality, 1.0},
    {"osm/kg", "Osm/kg", osmolality, 1e3},
    {"[pH]", "", ph, 1.0},
    // base mL/min/{1.73_m2}
    {"mL/min/{1.73_m2}", "mL/min/1.73 m²", indexed_filtration, 1.0},
    {"mL/s/{1.73_m2}", "mL/s/1.73 m²", indexed_filtration, 60.0},
    {"%", "%", fraction, 1.0},
    {"1", "", ratio, 1.0},
    {"mmol/mmol", "mmol/mmol", amount_ratio, 1.0},
    // base a
    {"a", "years", time, 1.0},
    {"mo", "months", time, 1.0 / 12.0},
    {"wk", "weeks", time, 7.0 / 365.25},
    {"d", "days", time, 1.0 / 365.25},
    {"ng/mL/h", "ng/mL/h", enzyme_rate, 1.0},
    {"m[IU]/L", "mIU/L", arbitrary_concentration, 1.0},
});

struct Spelling {
    std::string_view text;
    std::string_view ucum;
};

// Other codes of the same unit, and the trade's spellings. Micro signs are already `u`, litres already `L`.
constexpr auto spellings = std::to_array<Spelling>({
    {"mM", "mmol/L"},
    {"uM", "umol/L"},
    {"mcmol/L", "umol/L"},
    {"mEq/L", "meq/L"},
    {"mval/L", "meq/L"},
    {"mEq/d", "meq/d"},
    {"mEq/day", "meq/d"},
    {"mEq/24h", "meq/(24.h)"},
    {"mEq/24 h", "meq/(24.h)"},
    {"mg%", "mg/dL"},
    {"MG/DL", "mg/dL"},
    {"mg/100mL", "mg/dL"},
    {"gm/dL", "g/dL"},
    {"gm/L", "g/L"},
    {"mcg/dL", "ug/dL"},
    {"mcg/L", "ug/L"},
    {"mmol/day", "mmol/d"},
    {"mmol/24h", "mmol/(24.h)"},
    {"mmol/24 h", "mmol/(24.h)"},
    {"mg/day", "mg/d"},
    {"mg/24h", "mg/(24.h)"},
    {"mg/24 h", "mg/(24.h)"},
    {"g/day", "g/d"},
    {"mmHg", "mm[Hg]"},
    {"mm Hg", "mm[Hg]"},
    {"torr", "mm[Hg]"},
    {"Torr", "mm[Hg]"},
    {"mOsm/kg", "mosm/kg"},
    {"mOsm/kg H2O", "mosm/kg"},
    {"mosm/kg H2O", "mosm/kg"},
    {"mosmol/kg", "mosm/kg"},
    {"mOsmol/kg", "mosm/kg"},
    {"mmol/kg", "mosm/kg"},  // UCUM: osm is one mole of particles
    {"Osm/kg", "osm/kg"},
    {"pH", "[pH]"},  // as a UCUM code it is picohenry, which no laboratory reports
    {"{pH}", "[pH]"},
    {"mL/min/1.73m2", "mL/min/{1.73_m2}"},
    {"mL/min/1.73 m2", "mL/min/{1.73_m2}"},
    {"mL/min/1.73m^2", "mL/min/{1.73_m2}"},
    {"mL/min/1.73m²", "mL/min/{1.73_m2}"},
    {"mL/min/1.73 m²", "mL/min/{1.73_m2}"},
    {"mL/min/{1.73m2}", "mL/min/{1.73_m2}"},
    {"mL/min per 1.73 m2", "mL/min/{1.73_m2}"},
    {"mmol/mmol{creat}", "mmol/mmol"},
    {"mmol/mmol{creatinine}", "mmol/mmol"},
    {"mol/mol", "mmol/mmol"},
    {"y", "a"},
    {"yr", "a"},
    {"yrs", "a"},
    {"year", "a"},
    {"years", "a"},
    {"month", "mo"},
    {"months", "mo"},
    {"week", "wk"},
    {"weeks", "wk"},
    {"day", "d"},
    {"days", "d"},
    {"ng/mL/hr", "ng/mL/h"},
    {"ng/(mL.h)", "ng/mL/h"},
    {"ug/L/h", "ng/mL/h"},
    {"mIU/L", "m[IU]/L"},
    {"mU/L", "m[IU]/L"},  // renin concentration is often printed so
    {"u[IU]/mL", "m[IU]/L"},
    {"uIU/mL", "m[IU]/L"},
    {"uU/mL", "m[IU]/L"},
});

struct Refusal {
    std::string_view text;
    std::string_view why;
};

constexpr std::string_view osmolarity =
    "it is an osmolarity (per litre); this program reads osmolality, mosm/kg (per kilogram of water)";
constexpr std::string_view not_indexed =
    "it is not indexed to body surface; give the filtration in mL/min/{1.73_m2}";
constexpr std::string_view mass_ratio =
    "it is a mass ratio to creatinine, not a concentration; give the concentration of each, or mmol/mmol";

constexpr auto refusals = std::to_array<Refusal>({
    {"mosm/L", osmolarity},
    {"mOsm/L", osmolarity},
    {"mosmol/L", osmolarity},
    {"mOsmol/L", osmolarity},
    {"mL/min", not_indexed},
    {"mL/s", not_indexed},
    {"mL/min/1.73.m2", "as a UCUM code it has another dimension; write mL/min/{1.73_m2}"},
    {"mg/g{creat}", mass_ratio},
    {"mg/g{creatinine}", mass_ratio},
    {"mg/g", mass_ratio},
    {"mg/mg", mass_ratio},
    {"mg/mg{creat}", mass_ratio},
    {"mg/mmol{creat}", mass_ratio},
    {"mg/mmol", mass_ratio},
});

/// Both micro signs, U+00B5 and U+03BC, become the `u` of UCUM.
std::string with_plain_micro(std::string_view text) {
    constexpr auto signs = std::to_array<std::string_view>({"\xC2\xB5", "\xCE\xBC"});
    std::string plain;
    while (!text.empty()) {
        const auto* const sign =
            std::find_if(signs.begin(), signs.end(), [&](auto s) { return text.starts_with(s); });
        if (sign != signs.end()) {
            plain += 'u';
            text.remove_prefix(sign->size());
        } else {
            plain += text.front();
            text.remove_prefix(1);
        }
    }
    return plain;
}

/// UCUM writes the litre `l` or `L`: `mg/dl` becomes `mg/dL`, `ml/min` becomes `mL/min`.
std::string with_capital_litre(std::string text) {
    const auto begins_term = [&](std::size_t i) {
        return i == 0 || text[i - 1] == '/' || text[i - 1] == '(';
    };
    for (std::size_t i = 0; i < text.size(); ++i) {
        const bool ends_term = i + 1 == text.size() || text[i + 1] == '/' || text[i + 1] == '.';
        const bool prefixed =
            i > 0 && (text[i - 1] == 'd' || text[i - 1] == 'm' || text[i - 1] == 'u') && begins_term(i - 1);
        if (text[i] == 'l' && ends_term && (begins_term(i) || prefixed)) {
            text[i] = 'L';
        }
    }
    return text;
}

std::string_view without_outer_space(std::string_view text) {
    constexpr std::string_view space = " \t";
    const auto first = text.find_first_not_of(space);
    if (first == std::string_view::npos) {
        return {};
    }
    return text.substr(first, text.find_last_not_of(space) - first + 1);
}

const Unit* find_unit(std::string_view ucum) {
    const auto* const found =
        std::find_if(table.begin(), table.end(), [&](const Unit& unit) { return unit.ucum == ucum; });
    return found == table.end() ? nullptr : found;
}

/// Through which family of dimensions a value passes between amount, mass and equivalents.
enum class Family { none, concentration, rate };

Family family_of(Dimension dimension) {
    switch (dimension) {
        case amount_concentration:
        case equivalent_concentration:
        case mass_concentration:
            return Family::concentration;
        case amount_rate:
        case equivalent_rate:
        case mass_rate:
            return Family::rate;
        default:
            return Family::none;
    }
}

/// What one base unit of a dimension is in mmol (a litre, a day) of the substance; 0 when that is not known.
double millimoles_per_base(Dimension dimension, const Substance& substance) {
    const bool has_mass = substance.molar_mass > 0.0;
    switch (dimension) {
        case amount_concentration:
        case amount_rate:
            return 1.0;
        case equivalent_concentration:
        case equivalent_rate:
            return substance.charge > 0 ? 1.0 / substance.charge : 0.0;
        case mass_concentration:  // base g/L
            return has_mass ? 1e3 / substance.molar_mass : 0.0;
        case mass_rate:  // base mg/d
            return has_mass ? 1.0 / substance.molar_mass : 0.0;
        default:
            return 0.0;
    }
}

}  // namespace

std::span<const Unit> units() noexcept {
    return table;
}

UnitReading read_unit(std::string_view text) {
    const std::string plain = with_capital_litre(with_plain_micro(without_outer_space(text)));
    UnitReading reading;
    if (const Unit* unit = find_unit(plain)) {
        reading.unit = *unit;
        return reading;
    }
    for (const Spelling& spelling : spellings) {
        if (spelling.text == plain) {
            reading.unit = *find_unit(spelling.ucum);
            return reading;
        }
    }
    for (const Refusal& refusal : refusals) {
        if (refusal.text == plain) {
            reading.why_not = refusal.why;
            return reading;
        }
    }
    return reading;
}

std::optional<double> conversion_factor(const Unit& from, const Unit& to, const Substance& substance) {
    if (from.dimension == to.dimension) {
        return from.to_base / to.to_base;
    }
    if (from.dimension == ratio && to.dimension == ph) {
        return 1.0;  // a pH is a plain number, and some laboratories code it so
    }
    const Family family = family_of(from.dimension);
    if (family == Family::none || family != family_of(to.dimension)) {
        return std::nullopt;
    }
    const double in = millimoles_per_base(from.dimension, substance);
    const double out = millimoles_per_base(to.dimension, substance);
    if (in == 0.0 || out == 0.0) {
        return std::nullopt;
    }
    return (from.to_base * in) / (to.to_base * out);
}

std::vector<Unit> accepted_units(const Unit& canonical, const Substance& substance) {
    std::vector<Unit> accepted{canonical};
    for (const Unit& unit : table) {
        if (!(unit == canonical) && conversion_factor(unit, canonical, substance)) {
            accepted.push_back(unit);
        }
    }
    return accepted;
}

}  // namespace steelyard::likelihoods
