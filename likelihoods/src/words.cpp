// SPDX-License-Identifier: Apache-2.0
#include "steelyard/likelihoods/words.hpp"

#include <fmt/format.h>

#include "wording.hpp"

namespace steelyard::likelihoods {

std::string title_in_sentence(std::string_view title) {
    return detail::in_sentence(title);
}

std::string condition_in_words(const TableSet& set, const Condition& condition) {
    const std::string title = detail::in_sentence(set.title_of(condition.subject));
    std::vector<std::string> parts;
    if (condition.is_feature) {
        parts.push_back(detail::level_in_words(condition.level));
    } else {
        const QuantityKind* kind = find_quantity(condition.subject);
        const std::string unit = kind == nullptr ? "" : detail::unit_after_number(kind->unit);
        const auto add = [&](std::string_view words, const std::optional<double>& limit) {
            if (limit) {
                parts.push_back(fmt::format("{} {}{}", words, detail::shown(*limit), unit));
            }
        };
        add("at least", condition.at_least);
        add("above", condition.above);
        add("at most", condition.at_most);
        add("below", condition.below);
    }
    return fmt::format("when {} is {}{}", title, detail::listed_in_words(parts),
                       condition.set_aside_when_unknown ? " (and set aside when that is not known)" : "");
}

}  // namespace steelyard::likelihoods
