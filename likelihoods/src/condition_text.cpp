// SPDX-License-Identifier: Apache-2.0
#include "condition_text.hpp"

#include <fmt/format.h>

#include "wording.hpp"

namespace steelyard::likelihoods::detail {

std::string condition_in_words(const TableSet& set, const Condition& condition) {
    const std::string title = in_sentence(set.title_of(condition.subject));
    std::vector<std::string> parts;
    if (condition.is_feature) {
        parts.push_back(level_in_words(condition.level));
    } else {
        const QuantityKind* kind = find_quantity(condition.subject);
        const std::string unit = kind == nullptr ? "" : unit_after_number(kind->unit);
        const auto add = [&](std::string_view words, const std::optional<double>& limit) {
            if (limit) {
                parts.push_back(fmt::format("{} {}{}", words, shown(*limit), unit));
            }
        };
        add("at least", condition.at_least);
        add("above", condition.above);
        add("at most", condition.at_most);
        add("below", condition.below);
    }
    return fmt::format("when {} is {}{}", title, listed_in_words(parts),
                       condition.set_aside_when_unknown ? " (and set aside when that is not known)" : "");
}

}  // namespace steelyard::likelihoods::detail
