// SPDX-License-Identifier: Apache-2.0
#include "check_condition.hpp"

#include <fmt/format.h>

#include "condition_value.hpp"
#include "quantity_text.hpp"
#include "wording.hpp"

namespace steelyard::likelihoods::detail {
namespace {

struct Checked {
    Verdict answer = Verdict::unknown;
    std::string known;  ///< `urine sodium 12 mmol/L`, `urine sodium not given`
    bool given = true;  ///< something is known of the subject, if only a limit
};

Checked check(const TableSet& set, const Condition& condition, const Panel& panel,
              const Quantities& quantities) {
    const std::string title = in_sentence(set.title_of(condition.subject));
    if (condition.is_feature) {
        const auto seen = panel.observed.find(condition.subject);
        if (seen == panel.observed.end()) {
            return {Verdict::unknown, fmt::format("\"{}\" is not stated", title), false};
        }
        const bool holds = seen->second.level == condition.level;
        return {holds ? Verdict::holds : Verdict::fails,
                fmt::format("{}: {}", title, level_in_words(seen->second.level)), true};
    }
    const QuantityValue* quantity = quantities.find(condition.subject);
    if (quantity == nullptr) {
        return {Verdict::unknown, title + " not given", false};
    }
    const std::string value = known_as(panel, condition.subject, *quantity);
    const Verdict answer = check_value(condition, quantity->value);
    return {answer,
            answer == Verdict::unknown ? fmt::format("{} known only as {}", title, value)
                                       : fmt::format("{} {}", title, value),
            true};
}

}  // namespace

std::string known_as(const Panel& panel, std::string_view id, const QuantityValue& quantity) {
    const Interval& value = quantity.value;
    if (value.is_point()) {
        return shown(value, quantity.unit);
    }
    const auto& entries = quantity.origin == Origin::given ? panel.given : panel.measured;
    const auto entry = entries.find(id);
    if (quantity.origin != Origin::computed && entry != entries.end()) {
        // As the laboratory wrote it, so that `<5.0` keeps its figure.
        std::string_view text = entry->second.as_read;
        const std::size_t number = text.find_first_of("+-.0123456789");
        if (number != std::string_view::npos) {
            const std::string_view comparator = text.substr(0, number);
            const bool lower = comparator.find('>') != std::string_view::npos;
            const bool open = lower ? value.low_open : value.high_open;
            const std::string_view words =
                lower ? (open ? "above" : "at least") : (open ? "below" : "at most");
            const std::string& unit = entry->second.unit_as_read;
            return fmt::format("{} {}{}", words, text.substr(number),
                               unit_after_number(unit.empty() ? quantity.unit : unit));
        }
    }
    // A censored value reaches to the end of its plausible range; that end says nothing to a reader.
    Interval open_ended = value;
    if (const std::optional<QuantityRange> range = describe_quantity(id)) {
        constexpr double infinity = std::numeric_limits<double>::infinity();
        if (value.low <= range->low && value.high < range->high) {
            open_ended.low = -infinity;
        } else if (value.high >= range->high && value.low > range->low) {
            open_ended.high = infinity;
        }
    }
    return shown(open_ended, quantity.unit);
}

Applicability check_conditions(const TableSet& set, const std::vector<Condition>& conditions,
                               const Panel& panel, const Quantities& quantities) {
    Applicability result;
    std::string unknown_reason;
    for (const Condition& condition : conditions) {
        const Checked checked = check(set, condition, panel, quantities);
        switch (checked.answer) {
            case Verdict::holds:
                break;
            case Verdict::fails:
                return {false, true, fmt::format("{} ({})", condition.otherwise, checked.known), {}, {}};
            case Verdict::unknown:
                if (!condition.set_aside_when_unknown) {
                    if (checked.given) {
                        result.remarks.push_back("could not be checked: " + checked.known);
                    } else {
                        result.unchecked.push_back(condition.subject);
                    }
                } else if (unknown_reason.empty()) {
                    unknown_reason = fmt::format("{}, so it cannot be told whether it may be read: {}",
                                                 checked.known, condition.otherwise);
                }
                break;
        }
    }
    if (!unknown_reason.empty()) {
        return {false, false, unknown_reason, {}, {}};
    }
    return result;
}

}  // namespace steelyard::likelihoods::detail
