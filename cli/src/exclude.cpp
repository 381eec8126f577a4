// SPDX-License-Identifier: Apache-2.0
#include "exclude.hpp"

#include <fmt/format.h>

#include <algorithm>

#include "open_inputs.hpp"
#include "steelyard/cli/terminal.hpp"

namespace steelyard::cli {

priors::PriorSet without_excluded(const priors::PriorSet& set, const likelihoods::TableSet& tables,
                                  const std::vector<std::string>& excluded) {
    std::vector<std::string> present;
    for (const std::string& cause : excluded) {
        if (tables.find_cause(cause) == nullptr) {
            throw UsageError(fmt::format("--exclude {}: the tables have no such cause{}", visible(cause),
                                         suggestion(cause, cause_ids(tables))));
        }
        if (set.find(cause) != nullptr && std::find(present.begin(), present.end(), cause) == present.end()) {
            present.push_back(cause);
        }
    }
    if (set.causes.size() < present.size() + 2) {
        throw UsageError("--exclude leaves fewer than two causes: there is nothing to weigh them against");
    }
    return present.empty() ? set : priors::without(set, present);
}

}  // namespace steelyard::cli
