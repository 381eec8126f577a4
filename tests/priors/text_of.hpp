// SPDX-License-Identifier: Apache-2.0
#pragma once
// Small prior sets for the tests, and the faults of one that does not load.

#include <string>
#include <utility>
#include <vector>

#include "steelyard/priors/prior_set.hpp"

namespace steelyard::test {

/// A prior set of one form from pairs of cause and value as written.
inline std::string set_text(const std::string& given_as, const std::string& key,
                            const std::vector<std::pair<std::string, std::string>>& causes) {
    std::string text =
        "format: steelyard.prior-set/1\ntitle: Larkmoor adult ward\ngiven_as: " + given_as + "\ncauses:\n";
    for (const auto& [id, value] : causes) {
        text += "  " + id + ": {" + key + ": " + value + "}\n";
    }
    return text;
}

/// The faults of a text, sorted; none when it loads.
inline std::vector<document::Diagnostic> faults_of(const std::string& text,
                                                   const std::vector<std::string>& known_causes = {}) {
    try {
        static_cast<void>(priors::read_prior_set(text, "test.yaml", known_causes));
        return {};
    } catch (const document::LoadError& error) {
        return error.faults().sorted();
    }
}

/// The causes that the shipped evidence tables know, the composite last.
inline const std::vector<std::string>& shipped_causes() {
    static const std::vector<std::string> ids{"proximal",
                                              "classic_distal",
                                              "voltage_distal",
                                              "low_aldosterone",
                                              "renal_failure",
                                              "extrarenal",
                                              "low_aldosterone_renal_failure"};
    return ids;
}

}  // namespace steelyard::test
