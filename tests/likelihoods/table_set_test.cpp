// SPDX-License-Identifier: Apache-2.0
#include "steelyard/likelihoods/table_set.hpp"

#include <gtest/gtest.h>

#include <stdexcept>

#include "near.hpp"
#include "steelyard/likelihoods/cause_ratios.hpp"
#include "steelyard/likelihoods/evidence_markdown.hpp"
#include "table_files.hpp"

namespace steelyard::test {
namespace {

using likelihoods::TableSet;

TEST(TableSet, FindsCausesAndTables) {
    const TableSet set = small_set();
    EXPECT_EQ(set.find_cause("south")->title, "Southern fever");
    EXPECT_EQ(set.find_cause("west"), nullptr);
    EXPECT_EQ(set.find_table("thirst")->finding, "thirst");
    EXPECT_EQ(set.find_table("hunger"), nullptr);
}

TEST(TableSet, KnowsTheFeaturesACaseMayMention) {
    const auto levels = small_set().vocabulary().levels;
    std::vector<std::string> names;
    for (const auto& [name, list] : levels) {
        names.push_back(name);
        EXPECT_EQ(list, (std::vector<std::string>{"present", "absent"}));
    }
    EXPECT_EQ(names, (std::vector<std::string>{"alkali", "fasting", "thirst", "tremor"}));
}

TEST(TableSet, HasTitlesForPeople) {
    const TableSet set = small_set();
    EXPECT_EQ(set.title_of("thirst"), "Thirst");
    EXPECT_EQ(set.title_of("serum_potassium"), "Serum potassium") << "a quantity without a table";
    EXPECT_EQ(set.title_of("alkali"), "Alkali being given") << "a feature of conditions";
    EXPECT_EQ(set.title_of("some_thing"), "Some thing");
}

TEST(TableSet, CompositesTakeTheRowsOfTheirParts) {
    const TableSet set = small_set();
    const auto& thirst = *set.find_table("thirst");
    const auto& calcium = *set.find_table("serum_calcium");
    EXPECT_EQ(likelihoods::row_of(set, thirst, "both").cause, "south");
    EXPECT_EQ(likelihoods::row_of(set, calcium, "both").cause, "north");
    const Eigen::ArrayXXd bands = likelihoods::band_probabilities(set, thirst, {"both", "north"});
    EXPECT_TRUE(near_rel(0.1, bands(0, 0), 1e-14));
    EXPECT_TRUE(near_rel(3.5 / 11.0, bands(0, 1), 1e-14));
    for (Eigen::Index c = 0; c < bands.cols(); ++c) {
        EXPECT_TRUE(near_ulps(1.0, bands.col(c).sum(), 4));
    }
}

TEST(TableSet, RefusesUnknownCauses) {
    const TableSet set = small_set();
    EXPECT_THROW(likelihoods::row_of(set, set.tables[0], "west"), std::out_of_range);
    EXPECT_THROW(likelihoods::band_probabilities(set, set.tables[0], {"north", "west"}), std::out_of_range);
}

TEST(CauseRatios, AreTheRatiosOfTheRows) {
    const TableSet set = small_set();
    const auto ratios = likelihoods::cause_ratios(set, *set.find_table("thirst"), "north", "south");
    ASSERT_EQ(ratios.size(), 2U);
    EXPECT_TRUE(near_rel((3.5 / 11.0) / 0.1, ratios[0].value, 1e-12));
    EXPECT_TRUE(near_rel((7.5 / 11.0) / 0.9, ratios[1].value, 1e-12));
    for (const auto& ratio : ratios) {
        EXPECT_LT(ratio.low, ratio.value);
        EXPECT_LT(ratio.value, ratio.high);
    }
}

TEST(CauseRatios, GiveBackPublishedRatiosWithTheirInterval) {
    // South was given against north, 0.5 (0.25 to 1.0): shown against north that is what comes out, but for
    // the 0.2 % by which the products had to be normalised; the engine's tabulated law is right within 1 % of
    // the interval's width.
    const TableSet set = small_set();
    const auto ratios = likelihoods::cause_ratios(set, *set.find_table("serum_urate"), "south", "north");
    EXPECT_TRUE(near_rel(0.5, ratios[0].value, 0.003));
    EXPECT_TRUE(near_rel(0.25, ratios[0].low, 0.02));
    EXPECT_TRUE(near_rel(1.0, ratios[0].high, 0.02));
    const auto turned = likelihoods::cause_ratios(set, *set.find_table("serum_urate"), "north", "south");
    EXPECT_TRUE(near_rel(1.0 / ratios[0].value, turned[0].value, 1e-12));
    EXPECT_TRUE(near_rel(1.0 / ratios[0].high, turned[0].low, 0.02));
}

TEST(CauseRatios, OfACauseAgainstItsOwnRowAreOne) {
    const TableSet set = small_set();
    for (const auto& ratio : likelihoods::cause_ratios(set, *set.find_table("thirst"), "both", "south")) {
        EXPECT_EQ(ratio.value, 1.0);
        EXPECT_EQ(ratio.low, 1.0);
        EXPECT_EQ(ratio.high, 1.0);
    }
}

TEST(LoadTableSet, ReadsAFolderLikeItsTexts) {
    const TableSet loaded = likelihoods::load_table_set(small_folder().string() + "/");
    EXPECT_EQ(loaded.digest, small_set().digest);
    EXPECT_EQ(loaded.name, small_folder().string());
}

TEST(LoadTableSet, SaysWhichSetsAreShippedWhenThereIsNoSuchFolder) {
    try {
        likelihoods::open_table_set("/no/such/folder");
        FAIL();
    } catch (const document::LoadError& error) {
        ASSERT_EQ(error.faults().size(), 1U);
        const document::Diagnostic fault = error.faults().sorted()[0];
        EXPECT_EQ(fault.code, document::Code::unreadable_file);
        EXPECT_NE(fault.hint.find("adult"), std::string::npos);
    }
    EXPECT_THROW(likelihoods::open_table_set("shipped:children"), document::LoadError);
    EXPECT_THROW(likelihoods::load_table_set(small_folder().string() + "/set.yaml"), document::LoadError);
}

TEST(ShippedTables, AreTheFilesOfTheRepository) {
    const Files shipped = likelihoods::shipped_table_files("adult");
    std::vector<std::string> on_disk;
    for (const auto& entry :
         std::filesystem::directory_iterator(STEELYARD_SOURCE_DIR "/likelihoods/tables/adult")) {
        on_disk.push_back(entry.path().filename().string());
    }
    std::sort(on_disk.begin(), on_disk.end());
    std::vector<std::string> embedded;
    for (const auto& [name, text] : shipped) {
        embedded.push_back(name);
        EXPECT_EQ(text, text_of(std::string(STEELYARD_SOURCE_DIR) + "/likelihoods/tables/adult/" + name))
            << name;
    }
    EXPECT_EQ(embedded, on_disk) << "likelihoods/CMakeLists.txt lists every file";
    EXPECT_TRUE(likelihoods::shipped_table_files("children").empty());
}

TEST(ShippedTables, AreReadWithoutAFault) {
    for (const std::string& name : likelihoods::shipped_table_sets()) {
        Files files = likelihoods::shipped_table_files(name);
        EXPECT_EQ(messages_of(faults_of(files)), "");
        const TableSet set = likelihoods::open_table_set(name);
        EXPECT_EQ(set.name, "shipped:" + name);
        EXPECT_EQ(set.digest, likelihoods::open_table_set("shipped:" + name).digest);
        std::vector<std::string> causes;
        for (const auto& cause : set.causes) {
            causes.push_back(cause.id);
        }
        for (const auto& table : set.tables) {
            const Eigen::ArrayXXd bands = likelihoods::band_probabilities(set, table, causes);
            EXPECT_GT(bands.minCoeff(), 0.0) << table.finding;
            EXPECT_LT((bands.colwise().sum() - 1.0).abs().maxCoeff(), 1e-14) << table.finding;
        }
    }
}

TEST(EvidenceMarkdown, ShowsEachRowWithItsBasisAndSources) {
    const std::string text = likelihoods::evidence_markdown(small_set());
    EXPECT_NE(text.find("### Serum calcium"), std::string::npos);
    // 3.5 / 11 and 7.5 / 11 in percent.
    EXPECT_NE(text.find("| Northern fever | 31.8 | 68.2 | counts 3, 7 | 10 | study (field, ward) |"),
              std::string::npos)
        << text;
    EXPECT_NE(text.find("raised to the least"), std::string::npos);
    EXPECT_NE(text.find("when serum albumin is at least 25 g/L"), std::string::npos);
    EXPECT_NE(text.find("doi:10.1000/none"), std::string::npos);
    EXPECT_NE(text.find("Seen: table"), std::string::npos);
    EXPECT_NE(text.find("of Northern fever, but of Southern fever for: thirst"), std::string::npos);
    EXPECT_NE(text.find("| `bicarbonate_low` | 22 mmol/L | practice |"), std::string::npos);
    EXPECT_EQ(text, likelihoods::evidence_markdown(small_set()));
}

TEST(EvidenceMarkdown, EscapesWhatFilesSay) {
    const Files files = small_files_with("thirst.yaml", "title: Thirst", "title: \"<b>*Thirst* | [x](y)\"");
    const std::string text = likelihoods::evidence_markdown(likelihoods::read_table_set(files, "small"));
    EXPECT_EQ(text.find("<b>"), std::string::npos);
    EXPECT_NE(text.find("### &lt;b&gt;\\*Thirst\\* \\| \\[x\\](y)"), std::string::npos) << text;
}

// docs/evidence.md holds the generated text between two comments, so that the page cannot drift from the
// tables.
TEST(EvidenceMarkdown, IsWhatTheDocumentationShows) {
    const std::filesystem::path page = STEELYARD_SOURCE_DIR "/docs/evidence.md";
    ASSERT_TRUE(std::filesystem::exists(page));
    const std::string text = text_of(page);
    const std::string begin = std::string(likelihoods::evidence_begin) + "\n";
    const std::size_t from = text.find(begin);
    const std::size_t to = text.find(likelihoods::evidence_end);
    ASSERT_NE(from, std::string::npos);
    ASSERT_NE(to, std::string::npos);
    EXPECT_EQ(text.substr(from + begin.size(), to - from - begin.size()),
              likelihoods::evidence_markdown(likelihoods::open_table_set("adult")))
        << "run docs/refresh after a change of the tables";
}

}  // namespace
}  // namespace steelyard::test
