// SPDX-License-Identifier: Apache-2.0
#pragma once
// Titles and conditions as they stand inside a sentence.

#include <string>
#include <string_view>

#include "steelyard/likelihoods/table_set.hpp"

namespace steelyard::likelihoods {

/// A title inside a sentence: `Serum potassium` becomes `serum potassium`; `GFR`, `pH` and `TmP/GFR` keep
/// their form.
std::string title_in_sentence(std::string_view title);

/// `when urine sodium is at least 25 mmol/L`, `when lithium therapy is absent`, with what happens when it is
/// not known.
std::string condition_in_words(const TableSet& set, const Condition& condition);

}  // namespace steelyard::likelihoods
