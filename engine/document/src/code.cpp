// SPDX-License-Identifier: Apache-2.0
// The fault codes as written. A code's name in the enum and in print differ only in `_` and `-`.
#include <array>

#include "steelyard/document/diagnostic.hpp"

namespace steelyard::document {

namespace {
constexpr std::array code_names = std::to_array<std::string_view>(
    {// the text itself
     "unreadable-file", "bad-encoding", "syntax", "empty-document", "second-document", "anchor", "alias",
     "tag", "merge-key", "too-large", "too-deep", "too-many-values",
     // its shape
     "duplicate-key", "unknown-key", "missing-key", "wrong-type", "empty-value", "not-a-number", "not-finite",
     "out-of-range", "bad-choice", "bad-identifier", "bad-format", "conflicting-keys",
     // cases
     "unknown-analyte", "unknown-feature", "bad-level", "bad-unit", "implausible-value", "bad-limit",
     "conflicting-values",
     // prior sets
     "bad-odds", "incoherent-odds", "bad-interval", "too-few-causes", "unknown-cause",
     "composite-without-parts",
     // sources and basis
     "bad-basis", "unknown-source", "unused-source",
     // evidence tables and table sets
     "bad-edges", "band-count", "band-sum", "band-zero", "row-form", "missing-row", "ratio-sum",
     "ratio-chain", "study-mix", "bad-joint", "unknown-finding", "duplicate-finding", "unknown-quantity",
     "bad-group", "bad-one-of", "bad-composite", "bad-gate", "bad-variation", "missing-file",
     // tallies
     "bad-tally", "tally-mismatch"});

// The enum has no count of its own; a code added to it without a name here stops the build.
static_assert(code_names.size() == static_cast<std::size_t>(Code::tally_mismatch) + 1);
}  // namespace

std::string_view to_string(Code code) noexcept {
    return code_names[static_cast<std::size_t>(code)];
}

const std::vector<Code>& all_codes() {
    static const std::vector<Code> codes = [] {
        std::vector<Code> list;
        for (std::size_t i = 0; i < code_names.size(); ++i) {
            list.push_back(static_cast<Code>(i));
        }
        return list;
    }();
    return codes;
}

}  // namespace steelyard::document
