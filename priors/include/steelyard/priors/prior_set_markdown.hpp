// SPDX-License-Identifier: Apache-2.0
#pragma once
// A prior set as a Markdown section, for the document that lists what the program ships and for a clinic's
// own review.

#include <string>

#include "steelyard/priors/prior_set.hpp"

namespace steelyard::priors {

/// A prior set as Markdown: title, what it is for, a table of every cause, the causes' notes, the sources.
///
/// The table has the columns cause, prior [%] (to 0.1), as given, range, basis and source. Text of the file
/// is shown as text: characters that Markdown or HTML would read as markup are escaped.
/// @param set  as read, or as left by without()
std::string priors_markdown(const PriorSet& set);

}  // namespace steelyard::priors
