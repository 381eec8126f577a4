// SPDX-License-Identifier: Apache-2.0
#include "steelyard/priors/prior_set_markdown.hpp"

#include <gtest/gtest.h>

#include "text_of.hpp"

namespace steelyard::priors {
namespace {

TEST(PriorsMarkdown, TablesEveryCauseWithItsGrounds) {
    const PriorSet set = read_prior_set(R"(format: steelyard.prior-set/1
title: Larkmoor adult ward
note: For adults on the ward.
given_as: odds_against_rest
causes:
  classic_distal: {odds: "1:3", range: ["1:6", "1:2"], basis: elicited, source: larkmoor-2026, note: Seen often.}
  renal_failure: {odds: "3:1"}
sources:
  larkmoor-2026: Agreed by three physicians
)",
                                        "larkmoor.yaml");
    EXPECT_EQ(priors_markdown(set), R"(## Larkmoor adult ward

larkmoor.yaml, given as odds against the rest.

For adults on the ward.

| cause | prior % | as given | range | basis | source |
| --- | ---: | ---: | --- | --- | --- |
| `classic_distal` | 25.0 | 1:3 | 1:6 to 1:2 | elicited | larkmoor-2026 |
| `renal_failure` | 75.0 | 3:1 |  | not stated |  |

Notes

- `classic_distal`: Seen often.

Sources

- larkmoor-2026: Agreed by three physicians
)");
}

TEST(PriorsMarkdown, SaysWhatTheSetIsWorth) {
    EXPECT_NE(priors_markdown(open_prior_set("renal-clinic")).find("weights, together worth 10 patients"),
              std::string::npos);
    EXPECT_NE(
        priors_markdown(read_prior_set(test::set_text("counts", "count", {{"a", "3"}, {"b", "4"}}), "t.yaml"))
            .find("counts of 7 patients, half a patient added to each cause"),
        std::string::npos);
}

TEST(PriorsMarkdown, ShowsMarkupOfTheFileAsText) {
    const PriorSet set = read_prior_set(
        "format: steelyard.prior-set/1\ntitle: \"<b>Ward</b> | *one*\\nline\"\ngiven_as: weights\ncauses:\n"
        "  a: {weight: 1}\n  b: {weight: 1}\n",
        "t.yaml");
    EXPECT_TRUE(priors_markdown(set).starts_with("## &lt;b&gt;Ward&lt;/b&gt; \\| \\*one\\* line\n"));
}

}  // namespace
}  // namespace steelyard::priors
