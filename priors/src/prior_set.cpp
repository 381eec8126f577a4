// SPDX-License-Identifier: Apache-2.0
#include "steelyard/priors/prior_set.hpp"

#include <algorithm>
#include <cmath>
#include <stdexcept>

#include "steelyard/priors/odds.hpp"

namespace steelyard::priors {

namespace {

/// Odds against the rest change when the rest shrinks: the odds and their range are multiplied by one factor,
/// so that the range still holds the odds and its width on the scale of odds is kept.
void restate_odds(PriorCause& cause) {
    const double odds = odds_of_probability(cause.probability);
    const double factor = odds / cause.given;
    cause.given = odds;
    cause.as_given = odds_text(odds);
    if (cause.range_low && cause.range_high) {
        // The bounds are re-clamped because the product may round past the odds when a bound was equal to
        // them.
        cause.range_low = std::min(*cause.range_low * factor, odds);
        cause.range_high = std::max(*cause.range_high * factor, odds);
        cause.range_as_given = odds_text(*cause.range_low) + " to " + odds_text(*cause.range_high);
    }
}

}  // namespace

std::string_view to_string(GivenAs form) noexcept {
    switch (form) {
        case GivenAs::odds_against_rest:
            return "odds_against_rest";
        case GivenAs::weights:
            return "weights";
        case GivenAs::counts:
            return "counts";
    }
    return "";
}

const PriorCause* PriorSet::find(std::string_view id) const noexcept {
    const auto found =
        std::find_if(causes.begin(), causes.end(), [&](const PriorCause& c) { return c.id == id; });
    return found == causes.end() ? nullptr : &*found;
}

std::vector<std::string> PriorSet::ids() const {
    std::vector<std::string> names;
    names.reserve(causes.size());
    for (const PriorCause& cause : causes) {
        names.push_back(cause.id);
    }
    return names;
}

Eigen::ArrayXd PriorSet::log_prior() const {
    Eigen::ArrayXd logs(static_cast<Eigen::Index>(causes.size()));
    Eigen::Index at = 0;
    for (const PriorCause& cause : causes) {
        logs(at++) = std::log(cause.probability);
    }
    return logs;
}

PriorSet without(const PriorSet& set, const std::vector<std::string>& causes) {
    for (const std::string& id : causes) {
        if (set.find(id) == nullptr) {
            throw std::invalid_argument("the prior set has no cause '" + id + "' to leave out");
        }
    }
    if (causes.empty()) {
        return set;
    }
    PriorSet rest = set;
    std::erase_if(rest.causes, [&](const PriorCause& cause) {
        return std::find(causes.begin(), causes.end(), cause.id) != causes.end();
    });
    if (rest.causes.size() < 2) {
        throw std::invalid_argument("a prior set needs at least two causes; leaving these out would keep " +
                                    std::to_string(rest.causes.size()));
    }
    double kept = 0.0;
    double counted = 0.0;
    for (const PriorCause& cause : rest.causes) {
        kept += cause.probability;
        counted += cause.given;
    }
    for (PriorCause& cause : rest.causes) {
        cause.probability /= kept;
    }
    switch (set.given_as) {
        case GivenAs::odds_against_rest:
            std::for_each(rest.causes.begin(), rest.causes.end(), restate_odds);
            rest.given_sum = 1.0;
            break;
        case GivenAs::weights:
            // Part of a Dirichlet is a Dirichlet worth only the patients of the causes that stay.
            rest.worth = set.worth * kept;
            break;
        case GivenAs::counts:
            rest.worth = counted;
            break;
    }
    return rest;
}

}  // namespace steelyard::priors
