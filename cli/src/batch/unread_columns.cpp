// SPDX-License-Identifier: Apache-2.0
#include "unread_columns.hpp"

#include <fmt/format.h>

#include <ostream>
#include <set>

#include "steelyard/cli/terminal.hpp"

namespace steelyard::cli {

void warn_of_unread_columns(const CaseInputs& inputs, const likelihoods::FeatureVocabulary& vocabulary,
                            std::ostream& err) {
    std::set<std::vector<std::string>> told;
    for (const CaseFile& file : inputs.files()) {
        const auto& names = file.columns.not_read;
        if (!names.empty() && told.insert(names).second) {
            err << wrapped(fmt::format("steelyard: {}: not read: {}", visible(file.path),
                                       columns_in_words(names, vocabulary)),
                           "", "  ");
        }
    }
}

}  // namespace steelyard::cli
