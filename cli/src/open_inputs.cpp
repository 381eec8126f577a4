// SPDX-License-Identifier: Apache-2.0
#include "open_inputs.hpp"

#include <fmt/format.h>

#include "steelyard/document/strict_map.hpp"

namespace steelyard::cli {
namespace {

void add_all(document::Diagnostics& faults, const document::LoadError& error) {
    for (const document::Diagnostic& fault : error.faults().sorted()) {
        faults.add(fault);
    }
}

}  // namespace

std::optional<likelihoods::TableSet> open_tables(const std::string& name, document::Diagnostics& faults) {
    try {
        return likelihoods::open_table_set(name);
    } catch (const document::LoadError& error) {
        add_all(faults, error);
        return std::nullopt;
    }
}

std::optional<priors::PriorSet> open_priors(const std::string& name,
                                            const std::vector<std::string>& known_causes,
                                            document::Diagnostics& faults) {
    try {
        return priors::open_prior_set(name, known_causes);
    } catch (const document::LoadError& error) {
        add_all(faults, error);
        return std::nullopt;
    }
}

void check_composites(const likelihoods::TableSet& tables, const priors::PriorSet& priors,
                      document::Diagnostics& faults) {
    for (const priors::PriorCause& prior : priors.causes) {
        const likelihoods::Cause* cause = tables.find_cause(prior.id);
        if (cause == nullptr) {
            continue;
        }
        for (const std::string& part : cause->parts) {
            if (priors.find(part) == nullptr) {
                faults.add(prior.where, document::Code::composite_without_parts,
                           fmt::format("{} is weighed, but its part {} is not", prior.id, part),
                           fmt::format("give {} a prior too, or leave the composite out", part));
            }
        }
    }
}

std::vector<std::string> cause_ids(const likelihoods::TableSet& tables) {
    std::vector<std::string> ids;
    for (const likelihoods::Cause& cause : tables.causes) {
        ids.push_back(cause.id);
    }
    return ids;
}

std::string suggestion(const std::string& word, const std::vector<std::string>& known) {
    const std::string near = document::nearest(word, known);
    if (!near.empty()) {
        return "; did you mean " + near + "?";
    }
    std::string list;
    for (const std::string& name : known) {
        list += (list.empty() ? "" : ", ") + name;
    }
    return "; there are: " + list;
}

}  // namespace steelyard::cli
