// SPDX-License-Identifier: Apache-2.0
#pragma once
// A casebook as text for people, and as CSV and JSON for programs.

#include <string>
#include <string_view>
#include <vector>

#include "steelyard/cli/casebook.hpp"

namespace steelyard::cli {

/// What `list` shows. @param now  the time to which ages are counted, as the casebook writes times
/// @param open_only  whether cases with a final cause were left out of `shown`   @param all  the whole
/// casebook
std::string casebook_list_text(const std::string& path, const std::vector<CasebookEntry>& shown,
                               const std::vector<CasebookEntry>& all, bool open_only, std::string_view now,
                               bool colour);
std::string casebook_list_csv(const std::vector<CasebookEntry>& shown, std::string_view now);
std::string casebook_list_json(const std::vector<CasebookEntry>& shown, std::string_view now);

/// What `export` writes: one line for each entry.
std::string casebook_csv(const std::vector<CasebookEntry>& entries);
std::string casebook_ndjson(const std::vector<CasebookEntry>& entries);

}  // namespace steelyard::cli
