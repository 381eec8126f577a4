// SPDX-License-Identifier: Apache-2.0
#pragma once
// Case files (YAML, or JSON with the same keys) to panels. A file holds one case or a list of cases.

#include <string>
#include <string_view>
#include <vector>

#include "steelyard/document/diagnostic.hpp"
#include "steelyard/likelihoods/panel.hpp"

namespace steelyard::cli {

/// Cases of one text. Faults are collected; a faulty case is not returned.
std::vector<likelihoods::Panel> read_cases(std::string_view text, const std::string& file,
                                           const likelihoods::FeatureVocabulary& vocabulary,
                                           document::Diagnostics& faults);

/// Cases of files in the order given; `-` is standard input. Case names must be unique over all files.
/// @param standard_input  its text, where it has been read already
std::vector<likelihoods::Panel> load_cases(const std::vector<std::string>& paths,
                                           const likelihoods::FeatureVocabulary& vocabulary,
                                           document::Diagnostics& faults,
                                           const std::string* standard_input = nullptr);

}  // namespace steelyard::cli
