// SPDX-License-Identifier: Apache-2.0
#pragma once
// From the files of a table set to the checked, compiled value.

#include <string>
#include <string_view>
#include <vector>

#include "steelyard/document/digest.hpp"
#include "steelyard/likelihoods/table_set.hpp"

namespace steelyard::likelihoods {

/// Reads a table set from texts: `set.yaml` and one text per finding. `name` prefixes file names in messages.
/// @throws document::LoadError with every fault of every file
TableSet read_table_set(const std::vector<document::NamedText>& files, const std::string& name);

/// Reads a folder (`set.yaml`, and every other *.yaml, *.yml or *.json in it). @throws document::LoadError
TableSet load_table_set(const std::string& folder);

/// The names of the sets built into the program, and the files of one.
std::vector<std::string> shipped_table_sets();
std::vector<document::NamedText> shipped_table_files(std::string_view name);

/// A shipped set by name, or else a folder. @throws document::LoadError
TableSet open_table_set(const std::string& name_or_folder);

}  // namespace steelyard::likelihoods
