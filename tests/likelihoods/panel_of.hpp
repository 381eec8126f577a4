// SPDX-License-Identifier: Apache-2.0
#pragma once
// Panels for tests, built through the same door as every case.

#include <gtest/gtest.h>

#include <string>
#include <utility>
#include <vector>

#include "steelyard/likelihoods/panel.hpp"

namespace steelyard::test {

inline const likelihoods::FeatureVocabulary& vocabulary() {
    static const likelihoods::FeatureVocabulary features{{{"alkali_therapy", {"present", "absent"}},
                                                          {"changing_creatinine", {"present", "absent"}},
                                                          {"glycosuria", {"present", "absent"}},
                                                          {"pregnancy", {"present", "absent"}},
                                                          {"volume_status", {"depleted", "not_depleted"}}}};
    return features;
}

/// A panel of entries that must all be right.
inline likelihoods::Panel panel_of(const std::vector<std::pair<std::string, std::string>>& entries) {
    document::Diagnostics faults;
    likelihoods::PanelBuilder builder(vocabulary(), faults);
    builder.start("case", {"case.yaml", 1, 1});
    int line = 1;
    for (const auto& [name, text] : entries) {
        builder.set(name, text, {"case.yaml", ++line, 3});
    }
    for (const document::Diagnostic& fault : faults.sorted()) {
        ADD_FAILURE() << fault.message;
    }
    return builder.finish();
}

}  // namespace steelyard::test
