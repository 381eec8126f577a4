// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <iosfwd>

#include "case_inputs.hpp"

namespace steelyard::cli {

/// Names the columns of each file that nothing reads, once for files of the same columns.
void warn_of_unread_columns(const CaseInputs& inputs, const likelihoods::FeatureVocabulary& vocabulary,
                            std::ostream& err);

}  // namespace steelyard::cli
