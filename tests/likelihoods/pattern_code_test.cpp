// SPDX-License-Identifier: Apache-2.0
#include "steelyard/likelihoods/pattern_code.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include "table_files.hpp"

namespace steelyard::test {
namespace {

using likelihoods::Pattern;
using likelihoods::PatternCode;
using likelihoods::TableSet;

Pattern read(const TableSet& set, const std::vector<std::pair<std::string, std::string>>& entries) {
    document::Diagnostics faults;
    const likelihoods::FeatureVocabulary vocabulary = set.vocabulary();
    likelihoods::PanelBuilder builder(vocabulary, faults);
    builder.start("case", {"case.yaml", 1, 1});
    for (const auto& [name, text] : entries) {
        builder.set(name, text, {"case.yaml", 2, 1});
    }
    EXPECT_TRUE(faults.empty());
    const likelihoods::Panel panel = builder.finish();
    return likelihoods::read_pattern(set, panel, likelihoods::derive(panel, set.gate.chemistry));
}

/// What of a pattern decides its posterior.
std::string essence(const Pattern& pattern) {
    std::string text;
    for (const likelihoods::FindingReading& reading : pattern.findings) {
        text += std::to_string(static_cast<int>(reading.use));
        if (reading.use == likelihoods::Use::read) {
            for (const Eigen::Index cell : reading.cells) {
                text += ' ' + std::to_string(cell);
            }
            text += " x " + std::to_string(reading.weight);
        }
        text += '\n';
    }
    return text;
}

/// A panel in which each entry is there or not, in one band or across several.
std::vector<std::pair<std::string, std::string>> any_entries() {
    std::vector<std::pair<std::string, std::string>> entries;
    const auto maybe = [&](const char* name, const std::vector<std::string>& values) {
        const auto which = *rc::gen::inRange<std::size_t>(0, values.size() + 1);
        if (which < values.size()) {
            entries.emplace_back(name, values[which]);
        }
    };
    maybe("serum_calcium", {"1.9 mmol/L", "2.3 mmol/L", "2.7 mmol/L", "<2.3 mmol/L"});
    maybe("serum_phosphate", {"2 mg/dL", "3 mg/dL", "6 mg/dL", ">3 mg/dL"});
    maybe("serum_urate", {"100 umol/L", "300 umol/L", "500 umol/L"});
    maybe("serum_magnesium", {"0.5 mmol/L", "0.9 mmol/L", ">0.6 mmol/L"});
    maybe("serum_albumin", {"40 g/L", "20 g/L"});
    maybe("gfr", {"90 mL/min/{1.73_m2}", "20 mL/min/{1.73_m2}"});
    for (const char* feature : {"tremor", "thirst", "fasting"}) {
        maybe(feature, {"present", "absent"});
    }
    return entries;
}

TEST(PatternCode, KeepsWhatDecidesThePosterior) {
    const TableSet set = small_set();
    EXPECT_TRUE(rc::check("pattern to code to pattern", [&] {
        const Pattern pattern = read(set, any_entries());
        const PatternCode code = likelihoods::code_of(set, pattern);
        RC_ASSERT(code.size() == set.tables.size());
        const Pattern again = likelihoods::pattern_of(set, code);
        RC_ASSERT(essence(again) == essence(pattern));
        RC_ASSERT(likelihoods::code_of(set, again) == code);
        const std::string characters = likelihoods::code_in_characters(set, code);
        RC_ASSERT(likelihoods::code_from_characters(set, characters) == code);
    }));
}

TEST(PatternCode, EveryStateOfAJointTableIsAPatternOfItsOwn) {
    const TableSet set = small_set();
    ASSERT_EQ(set.tables.back().finding, "tremor_and_magnesium");
    const int states = likelihoods::states_of(set.tables.back());
    EXPECT_EQ(states, 2 + 4 + 2 + 2);  // cells, bands of magnesium alone, levels of tremor alone
    std::vector<std::vector<Eigen::Index>> cells;
    for (int state = 2; state < states; ++state) {
        PatternCode code(set.tables.size(), '\0');
        code.back() = static_cast<char>(state);
        const Pattern pattern = likelihoods::pattern_of(set, code);
        EXPECT_EQ(likelihoods::code_of(set, pattern), code);
        cells.push_back(pattern.findings.back().cells);
    }
    const std::vector<std::vector<Eigen::Index>> expected = {{0},    {1},    {2},    {3},
                                                             {0, 1}, {2, 3}, {0, 2}, {1, 3}};
    EXPECT_EQ(cells, expected);
}

TEST(PatternCode, InCharactersSaysWhatIsMissingAsideAndRead) {
    const TableSet set = small_set();
    const Pattern pattern = read(set, {{"fasting", "present"},
                                       {"serum_albumin", "40 g/L"},
                                       {"serum_calcium", "2.3 mmol/L"},
                                       {"serum_phosphate", ">3 mg/dL"},
                                       {"gfr", "90 mL/min/{1.73_m2}"},
                                       {"tremor", "absent"}});
    const std::string characters = likelihoods::code_in_characters(set, likelihoods::code_of(set, pattern));
    EXPECT_EQ(characters, "1x..7");
}

TEST(PatternCode, RefusesWhatIsNotOfTheSet) {
    const TableSet set = small_set();
    for (const char* text : {"", "1x..", "1x..7.", "9x..7", "1x..?", "1x..8", "1X..7"}) {
        EXPECT_FALSE(likelihoods::code_from_characters(set, text).has_value()) << text;
    }
    EXPECT_THROW((void)likelihoods::pattern_of(set, PatternCode(4, '\0')), std::out_of_range);
    EXPECT_THROW((void)likelihoods::pattern_of(set, PatternCode(5, '\x20')), std::out_of_range);
}

TEST(PatternCode, ATableOfManyBandsTakesTwoCharacters) {
    std::string edges;
    for (int i = 0; i < 80; ++i) {
        edges += (i > 0 ? ", " : "") + std::to_string(1.0 + 0.05 * i);
    }
    std::string shares = "[";
    for (int i = 0; i < 81; ++i) {
        shares += i > 0 ? ", 1" : "1";
    }
    shares += "]";
    Files files = small_files();
    std::string& text = text_named(files, "serum_calcium.yaml");
    text = "format: steelyard.evidence-table/1\nfinding: serum_calcium\nunit: mmol/L\nedges: [" + edges +
           "]\nburden: routine\nrows:\n  north: {counts: " + shares +
           ", basis: memory}\n  south: {counts: " + shares + ", basis: memory}\n";
    const TableSet set = likelihoods::read_table_set(files, "many");
    const PatternCode code = likelihoods::code_of(set, read(set, {{"serum_calcium", "4.94 mmol/L"}}));
    EXPECT_EQ(static_cast<unsigned char>(code[0]), 2 + 79);
    EXPECT_EQ(likelihoods::code_in_characters(set, code), "1H....");
    EXPECT_EQ(likelihoods::code_from_characters(set, "1H...."), code);
}

TEST(ReadingDigest, ChangesWithBandsConditionsAndGateOnly) {
    const std::string before = likelihoods::reading_digest(small_set());
    const auto digest_with = [](const char* file, const char* old_text, const char* new_text) {
        return likelihoods::reading_digest(
            likelihoods::read_table_set(small_files_with(file, old_text, new_text), "changed"));
    };
    EXPECT_EQ(digest_with("thirst.yaml", "counts: [3, 7]", "counts: [4, 7]"), before);
    EXPECT_EQ(digest_with("set.yaml", "rho: 0.5", "rho: 0.25"), before);
    EXPECT_NE(digest_with("serum_calcium.yaml", "edges: [2.0, 2.6]", "edges: [2.0, 2.7]"), before);
    EXPECT_NE(digest_with("tremor_and_magnesium.yaml", "edges: [[0.7]", "edges: [[0.8]"), before);
    EXPECT_NE(digest_with("set.yaml", "ph_high: {value: 7.45", "ph_high: {value: 7.46"), before);
}

}  // namespace
}  // namespace steelyard::test
