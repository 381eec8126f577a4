// SPDX-License-Identifier: Apache-2.0
// What the docs say and what the program does are held equal.
#include <gtest/gtest.h>

#include <algorithm>

#include "run_program.hpp"
#include "steelyard/document/diagnostic.hpp"
#include "steelyard/likelihoods/analyte.hpp"
#include "steelyard/likelihoods/derived.hpp"
#include "steelyard/likelihoods/read_table_set.hpp"
#include "steelyard/priors/prior_set.hpp"

namespace steelyard::test {
namespace {

std::string doc(const std::string& name) {
    return text_of(std::string(STEELYARD_SOURCE_DIR "/") + name);
}

TEST(Formats, ExplainEveryFaultCodeAndNoOther) {
    const std::string text = doc("docs/formats.md");
    std::size_t listed = 0;
    for (const document::Code code : document::all_codes()) {
        EXPECT_NE(text.find("| `" + std::string(document::to_string(code)) + "` |"), std::string::npos)
            << document::to_string(code);
    }
    const std::string section = text.substr(text.find("## Fault codes"));
    for (std::size_t at = section.find("\n| `"); at != std::string::npos;
         at = section.find("\n| `", at + 1)) {
        ++listed;
    }
    EXPECT_EQ(listed, document::all_codes().size());
}

TEST(Formats, ListEveryAnalyteAndDerivedQuantity) {
    const std::string text = doc("docs/formats.md");
    for (const likelihoods::Analyte& analyte : likelihoods::analytes()) {
        EXPECT_NE(text.find("`" + std::string(analyte.id) + "`"), std::string::npos) << analyte.id;
    }
    for (const likelihoods::DerivedQuantity& quantity : likelihoods::derived_quantities()) {
        EXPECT_NE(text.find("`" + std::string(quantity.id) + "`"), std::string::npos) << quantity.id;
    }
}

TEST(Readme, ShowsTheReportThatTheProgramPrints) {
    const std::string text = doc("README.md");
    const std::string report = run({"weigh", STEELYARD_SOURCE_DIR "/docs/cases/larkmoor-002.yaml"}).out;
    ASSERT_FALSE(report.empty());
    EXPECT_NE(text.find(report), std::string::npos) << "run docs/refresh to bring README.md up to date";
}

TEST(Readme, NamesTheTwoCommands) {
    const std::string text = doc("README.md");
    EXPECT_NE(text.find("docs/demo"), std::string::npos);
    EXPECT_NE(text.find("tests/run"), std::string::npos);
}

TEST(ShippedFolders, HaveTheDigestsOfTheirCopiesInTheProgram) {
    EXPECT_EQ(likelihoods::load_table_set(STEELYARD_SOURCE_DIR "/likelihoods/tables/adult").digest,
              likelihoods::open_table_set("adult").digest);
    for (const std::string& name : priors::shipped_prior_sets()) {
        EXPECT_EQ(priors::load_prior_set(STEELYARD_SOURCE_DIR "/priors/sets/" + name + ".yaml").digest,
                  priors::open_prior_set(name).digest)
            << name;
    }
}

}  // namespace
}  // namespace steelyard::test
