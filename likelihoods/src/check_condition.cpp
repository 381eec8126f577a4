// SPDX-License-Identifier: Apache-2.0
#include "check_condition.hpp"

#include <fmt/format.h>

#include "band_edges.hpp"
#include "quantity_text.hpp"
#include "wording.hpp"

namespace steelyard::likelihoods::detail {
namespace {

enum class Answer { holds, fails, unknown };

/// The answer for a whole interval: unknown when part of it satisfies the limit and part does not.
Answer combine(bool low_end, bool high_end) {
    if (low_end == high_end) {
        return low_end ? Answer::holds : Answer::fails;
    }
    return Answer::unknown;
}

/// `value >= limit` at both ends. An open upper end on the limit never reaches it.
Answer at_least(const Interval& value, double limit) {
    return combine(at_or_above(value.low, limit),
                   value.high_open ? strictly_above(value.high, limit) : at_or_above(value.high, limit));
}

/// `value > limit` at both ends. An open lower end on the limit is above it.
Answer above(const Interval& value, double limit) {
    return combine(value.low_open ? at_or_above(value.low, limit) : strictly_above(value.low, limit),
                   strictly_above(value.high, limit));
}

Answer negate(Answer answer) {
    switch (answer) {
        case Answer::holds:
            return Answer::fails;
        case Answer::fails:
            return Answer::holds;
        case Answer::unknown:
            break;
    }
    return Answer::unknown;
}

Answer check_value(const Condition& condition, const Interval& value) {
    bool unknown = false;
    const auto settle = [&](const std::optional<double>& limit, auto compare, bool negated) {
        if (!limit) {
            return true;
        }
        const Answer raw = compare(value, *limit);
        const Answer answer = negated ? negate(raw) : raw;
        unknown = unknown || answer == Answer::unknown;
        return answer != Answer::fails;
    };
    const bool passes = settle(condition.at_least, at_least, false) &&
                        settle(condition.above, above, false) && settle(condition.at_most, above, true) &&
                        settle(condition.below, at_least, true);
    if (!passes) {
        return Answer::fails;
    }
    return unknown ? Answer::unknown : Answer::holds;
}

struct Checked {
    Answer answer = Answer::unknown;
    std::string known;  ///< `urine sodium 12 mmol/L`, `urine sodium not given`
    bool given = true;  ///< something is known of the subject, if only a limit
};

Checked check(const TableSet& set, const Condition& condition, const Panel& panel,
              const Quantities& quantities) {
    const std::string title = in_sentence(set.title_of(condition.subject));
    if (condition.is_feature) {
        const auto seen = panel.observed.find(condition.subject);
        if (seen == panel.observed.end()) {
            return {Answer::unknown, fmt::format("\"{}\" is not stated", title), false};
        }
        const bool holds = seen->second.level == condition.level;
        return {holds ? Answer::holds : Answer::fails,
                fmt::format("{}: {}", title, level_in_words(seen->second.level)), true};
    }
    const QuantityValue* quantity = quantities.find(condition.subject);
    if (quantity == nullptr) {
        return {Answer::unknown, title + " not given", false};
    }
    const std::string value = known_as(panel, condition.subject, *quantity);
    const Answer answer = check_value(condition, quantity->value);
    return {answer,
            answer == Answer::unknown ? fmt::format("{} known only as {}", title, value)
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
            case Answer::holds:
                break;
            case Answer::fails:
                return {false, true, fmt::format("{} ({})", condition.otherwise, checked.known), {}, {}};
            case Answer::unknown:
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
