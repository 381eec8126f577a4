// SPDX-License-Identifier: Apache-2.0
#include "steelyard/likelihoods/pattern_code.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <stdexcept>

#include "arrange.hpp"
#include "steelyard/document/digest.hpp"

namespace steelyard::likelihoods {
namespace {

constexpr std::string_view digits = "0123456789ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwyz_";
static_assert(digits.size() == 62 && digits.find('x') == std::string_view::npos);

/// Rows and columns of a joint table; {bands, 0} of any other.
struct Shape {
    Eigen::Index rows = 0, columns = 0;
    bool joint() const noexcept { return columns > 0; }
};

Shape shape_of(const EvidenceTable& table) {
    if (table.kind != FindingKind::joint) {
        return {table.bands(), 0};
    }
    return {static_cast<Eigen::Index>(table.joint_names[0].size()),
            static_cast<Eigen::Index>(table.joint_names[1].size())};
}

/// The state of what is known of a finding that is read: its cells, as locate_joint() lists them.
Eigen::Index state_of(const EvidenceTable& table, const std::vector<Eigen::Index>& cells) {
    const Shape shape = shape_of(table);
    if (cells.size() == 1 && (!shape.joint() || (shape.rows > 1 && shape.columns > 1))) {
        return cells.front();
    }
    const bool one_row = cells.back() - cells.front() + 1 == static_cast<Eigen::Index>(cells.size());
    return shape.rows * shape.columns +
           (one_row ? cells.front() / shape.columns : shape.rows + cells.front() % shape.columns);
}

std::vector<Eigen::Index> cells_of(const EvidenceTable& table, Eigen::Index state) {
    const Shape shape = shape_of(table);
    const Eigen::Index whole = shape.joint() ? shape.rows * shape.columns : shape.rows;
    if (state < whole) {
        return {state};
    }
    std::vector<Eigen::Index> cells;
    const Eigen::Index margin = state - whole;
    if (margin < shape.rows) {
        for (Eigen::Index c = 0; c < shape.columns; ++c) {
            cells.push_back(margin * shape.columns + c);
        }
    } else {
        for (Eigen::Index r = 0; r < shape.rows; ++r) {
            cells.push_back(r * shape.columns + margin - shape.rows);
        }
    }
    return cells;
}

void add_limit(std::string& text, const char* key, const std::optional<double>& limit) {
    if (limit) {
        text += fmt::format(" {} {}", key, *limit);
    }
}

/// Everything about one table that decides in which band a panel falls.
std::string reading_of(const EvidenceTable& table) {
    std::string text = fmt::format("{} {} {}", table.finding, static_cast<int>(table.kind), table.unit);
    for (const double edge : table.edges) {
        text += fmt::format(" {}", edge);
    }
    for (const std::string& level : table.levels) {
        text += fmt::format(" \"{}\"", level);
    }
    for (std::size_t member = 0; member < table.joint_of.size(); ++member) {
        text += fmt::format("\nof {}", table.joint_of[member]);
        for (const double edge : table.joint_edges[member]) {
            text += fmt::format(" {}", edge);
        }
        for (const std::string& name : table.joint_names[member]) {
            text += fmt::format(" \"{}\"", table.joint_edges[member].empty() ? name : "");
        }
    }
    for (const Condition& condition : table.usable_when) {
        text += fmt::format("\nwhen {} \"{}\" {}", condition.subject, condition.level,
                            condition.set_aside_when_unknown ? 1 : 0);
        add_limit(text, "at_least", condition.at_least);
        add_limit(text, "at_most", condition.at_most);
        add_limit(text, "above", condition.above);
        add_limit(text, "below", condition.below);
    }
    return text + "\n";
}

std::string reading_of(const GateSettings& gate) {
    const ChemistrySettings& chemistry = gate.chemistry;
    std::string text = "gate";
    for (const double value :
         {chemistry.albumin_reference, chemistry.albumin_slope, chemistry.anion_gap_reference,
          chemistry.bicarbonate_reference, chemistry.expected_pco2_slope, chemistry.expected_pco2_intercept,
          gate.bicarbonate_low.value, gate.ph_low.value, gate.ph_high.value, gate.gap_normal_to.value,
          gate.gap_high_from.value, gate.gfr_reduced_below.value, gate.expected_pco2_band.value,
          gate.gas_bicarbonate.value, gate.gas_ph.value, gate.age_least.value, gate.pco2_high.value,
          gate.lactate_high.value, gate.ketones_high.value}) {
        text += fmt::format(" {}", value);
    }
    text += fmt::format(" \"{}\" \"{}\"", gate.alkali_feature, gate.pregnancy_feature);
    for (const GfrCondition& condition : gate.gfr_conditions) {
        text += fmt::format(" \"{}\" \"{}\" {}", condition.feature, condition.level,
                            condition.set_aside_when_unknown ? 1 : 0);
    }
    return text + "\n";
}

}  // namespace

int states_of(const EvidenceTable& table) {
    const Shape shape = shape_of(table);
    const Eigen::Index bands =
        shape.joint() ? shape.rows * shape.columns + shape.rows + shape.columns : shape.rows;
    if (bands + first_band_state > 256) {
        throw std::length_error(
            fmt::format("{} has too many bands for a pattern: {}, at most 254", table.finding, bands));
    }
    return static_cast<int>(bands) + first_band_state;
}

std::vector<int> states_of(const TableSet& set) {
    std::vector<int> states;
    for (const EvidenceTable& table : set.tables) {
        states.push_back(states_of(table));
    }
    return states;
}

PatternCode code_of(const TableSet& set, const Pattern& pattern) {
    PatternCode code(pattern.findings.size(), static_cast<char>(missing_state));
    for (std::size_t i = 0; i < pattern.findings.size(); ++i) {
        const FindingReading& reading = pattern.findings[i];
        // One that is passed over for an alternative would be read if it stood alone.
        if (reading.use == Use::read || (reading.use == Use::set_aside && reading.passed_over)) {
            code[i] = static_cast<char>(first_band_state + state_of(set.tables[i], reading.cells));
        } else if (reading.use == Use::set_aside) {
            code[i] = static_cast<char>(aside_state);
        }
    }
    return code;
}

Pattern pattern_of(const TableSet& set, std::string_view code) {
    if (code.size() != set.tables.size()) {
        throw std::out_of_range("a pattern code of another table set");
    }
    Pattern pattern;
    pattern.findings.resize(code.size());
    for (std::size_t i = 0; i < code.size(); ++i) {
        const auto state = static_cast<unsigned char>(code[i]);
        FindingReading& reading = pattern.findings[i];
        reading.table = i;
        if (state >= states_of(set.tables[i])) {
            throw std::out_of_range("a pattern code of another table set");
        }
        if (state == aside_state) {
            reading.use = Use::set_aside;
        } else if (state >= first_band_state) {
            reading.use = Use::read;
            reading.cells = cells_of(set.tables[i], state - first_band_state);
        }
    }
    detail::arrange(set, pattern.findings);
    return pattern;
}

std::string code_in_characters(const TableSet& set, std::string_view code) {
    return code_in_characters(states_of(set), code);
}

std::string code_in_characters(const std::vector<int>& states, std::string_view code) {
    std::string text;
    for (std::size_t i = 0; i < code.size(); ++i) {
        const auto state = static_cast<unsigned char>(code[i]);
        const bool wide = states[i] - first_band_state > static_cast<int>(digits.size());
        if (state < first_band_state) {
            text.append(wide ? 2 : 1, state == missing_state ? '.' : 'x');
            continue;
        }
        const std::size_t band = static_cast<std::size_t>(state) - first_band_state;
        if (wide) {
            text += digits[band / digits.size()];
        }
        text += digits[band % digits.size()];
    }
    return text;
}

std::optional<PatternCode> code_from_characters(const TableSet& set, std::string_view text) {
    return code_from_characters(states_of(set), text);
}

std::optional<PatternCode> code_from_characters(const std::vector<int>& states, std::string_view text) {
    PatternCode code;
    for (const int of_table : states) {
        const std::size_t width = of_table - first_band_state > static_cast<int>(digits.size()) ? 2 : 1;
        if (text.size() < width) {
            return std::nullopt;
        }
        const std::string_view token = text.substr(0, width);
        text.remove_prefix(width);
        const bool flat = token.find_first_not_of(token.front()) == std::string_view::npos;
        if (flat && (token.front() == '.' || token.front() == 'x')) {
            code += static_cast<char>(token.front() == '.' ? missing_state : aside_state);
            continue;
        }
        std::size_t band = 0;
        for (const char digit : token) {
            const std::size_t value = digits.find(digit);
            if (value == std::string_view::npos) {
                return std::nullopt;
            }
            band = band * digits.size() + value;
        }
        if (band + first_band_state >= static_cast<std::size_t>(of_table)) {
            return std::nullopt;
        }
        code += static_cast<char>(band + first_band_state);
    }
    return text.empty() ? std::optional(code) : std::nullopt;
}

std::string reading_digest(const TableSet& set) {
    std::string text;
    for (const EvidenceTable& table : set.tables) {
        text += reading_of(table);
    }
    return document::digest({{"reading", text + reading_of(set.gate)}});
}

}  // namespace steelyard::likelihoods
