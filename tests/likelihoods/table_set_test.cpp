// SPDX-License-Identifier: Apache-2.0
#include "steelyard/likelihoods/table_set.hpp"

#include <gtest/gtest.h>

#include <cmath>
#include <stdexcept>

#include "near.hpp"
#include "steelyard/engine/row_ratio.hpp"
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

TEST(CauseRatios, AgainstTheRestOfTwoCausesAreThePublishedOnes) {
    // With two causes the rest of north is south: 4 (2 to 8) is shown as it was published, though both rows
    // carry a range. Even mix; rows (0.8, 0.2) and (0.2, 0.8).
    Files files = small_files();
    text_named(files, "thirst.yaml") =
        "format: steelyard.evidence-table/1\nfinding: thirst\ntitle: Thirst\nlevels: [present, absent]\n"
        "study_mix: {north: 0.5, south: 0.5}\nrows:\n"
        "  north: {ratio_to_rest: [4, 0.25], range: [[2, 8], [0.125, 0.5]], basis: elicited}\n"
        "  south: {ratio_to_rest: [0.25, 4], range: [[0.125, 0.5], [2, 8]], basis: elicited}\n";
    const TableSet set = likelihoods::read_table_set(files, "small");
    const auto& thirst = *set.find_table("thirst");
    const auto ratios = likelihoods::cause_ratios(set, thirst, "north", "south");
    ASSERT_EQ(ratios.size(), 2U);
    EXPECT_EQ(ratios[0].value, 4.0);
    EXPECT_EQ(ratios[0].low, 2.0);
    EXPECT_EQ(ratios[0].high, 8.0);
    const auto turned = likelihoods::cause_ratios(set, thirst, "south", "north");
    EXPECT_EQ(turned[0].value, 0.25);
    EXPECT_EQ(turned[0].low, 0.125);
    EXPECT_EQ(turned[0].high, 0.5);
    // A 68.27 % interval reaches one standard deviation, ln 4 / (2 * 1.959964), either way.
    const auto narrow = likelihoods::cause_ratios(set, thirst, "north", "south", 0.6826894921370859);
    EXPECT_TRUE(near_rel(4.0 * std::exp(std::log(4.0) / 3.919928), narrow[0].high, 1e-6));
}

TEST(CauseRatios, AgainstTheRestTakeTheRangeOfWhicheverRowHasOne) {
    Files files = small_files();
    text_named(files, "thirst.yaml") =
        "format: steelyard.evidence-table/1\nfinding: thirst\ntitle: Thirst\nlevels: [present, absent]\n"
        "study_mix: {north: 0.5, south: 0.5}\nrows:\n"
        "  north: {ratio_to_rest: [4, 0.25], basis: elicited}\n"
        "  south: {ratio_to_rest: [0.25, 4], range: [[0.125, 0.5], [2, 8]], basis: elicited}\n";
    const TableSet set = likelihoods::read_table_set(files, "small");
    const auto ratios = likelihoods::cause_ratios(set, *set.find_table("thirst"), "north", "south");
    EXPECT_EQ(ratios[0].value, 4.0);
    EXPECT_EQ(ratios[0].low, 2.0);
    EXPECT_EQ(ratios[0].high, 8.0);
}

/// The small set with a third cause, west, and a table of urate as given.
TableSet with_three_causes(const std::string& urate_rows) {
    Files files = small_files_with("set.yaml", "  south: {title: Southern fever}",
                                   "  south: {title: Southern fever}\n  west: {title: Western fever}");
    text_named(files, "serum_urate.yaml") =
        "format: steelyard.evidence-table/1\nfinding: serum_urate\nunit: umol/L\nedges: [350]\n" + urate_rows;
    for (const auto& [name, addition] : std::vector<std::pair<std::string, std::string>>{
             {"serum_calcium.yaml", "  west: {mean: 2.3, sd: 0.2, n: 9, basis: elicited}\n"},
             {"serum_phosphate.yaml", "  west: {share: [0.2, 0.7, 0.1], worth: 20, basis: elicited}\n"},
             {"thirst.yaml", "  west: {counts: [1, 1], basis: elicited}\n"},
             {"tremor_and_magnesium.yaml", "  west: {joint: [[1, 1], [1, 1]], basis: elicited}\n"}}) {
        std::string& text = text_named(files, name);
        text.insert(text.find("rows:\n") + 6, addition);
    }
    return likelihoods::read_table_set(files, "small");
}

// Counts 3 and 5 are the shares 3.5/9 and 5.5/9. Ratios 9/7 and 9/11 make them even; 13/7 and 5/11 make them
// 6.5/9 and 2.5/9.
constexpr const char* against_north =
    "rows:\n"
    "  north: {counts: [3, 5], basis: elicited}\n"
    "  south: {ratio: [1.2857142857142858, 0.8181818181818182], against: north, basis: elicited}\n"
    "  west: {ratio: [1.8571428571428572, 0.45454545454545453], against: north, basis: elicited}\n";

TEST(CauseRatios, OfTwoRowsAgainstTheSameThirdHoldThatOneFixed) {
    const TableSet set = with_three_causes(against_north);
    const auto& urate = *set.find_table("serum_urate");
    const auto ratios = likelihoods::cause_ratios(set, urate, "south", "west");
    ASSERT_EQ(ratios.size(), 2U);
    EXPECT_TRUE(near_rel(9.0 / 13.0, ratios[0].value, 1e-12));
    EXPECT_TRUE(near_rel(9.0 / 5.0, ratios[1].value, 1e-12));
    for (const auto& ratio : ratios) {
        EXPECT_TRUE(near_rel(ratio.value, ratio.low, 1e-12)) << "north's uncertainty cancels";
        EXPECT_TRUE(near_rel(ratio.value, ratio.high, 1e-12));
    }
}

TEST(CauseRatios, AlongAChainOfRatiosAddTheirVariances) {
    // West against south against north, 2-fold and 3-fold ranges either way: against north the two logarithms
    // add as independent normals, sqrt(ln(2)^2 + ln(3)^2), and north's own counts cancel.
    const TableSet set = with_three_causes(
        "rows:\n"
        "  north: {share: [0.4, 0.6], worth: 10, basis: elicited}\n"
        "  south: {ratio: [1, 1], range: [[0.5, 2], [0.5, 2]], against: north, basis: elicited}\n"
        "  west: {ratio: [1, 1], range: [[0.3333333333333333, 3], [0.3333333333333333, 3]], against: south,\n"
        "         basis: elicited}\n");
    const auto& urate = *set.find_table("serum_urate");
    const double reach = std::exp(std::hypot(std::log(2.0), std::log(3.0)));
    const auto ratios = likelihoods::cause_ratios(set, urate, "west", "north");
    EXPECT_TRUE(near_rel(reach, ratios[0].high, 0.02));
    EXPECT_TRUE(near_rel(1.0 / reach, ratios[0].low, 0.02));
    const auto step = likelihoods::cause_ratios(set, urate, "west", "south");
    EXPECT_TRUE(near_rel(3.0, step[0].high, 0.02));
    EXPECT_TRUE(near_rel(1.0 / 3.0, step[0].low, 0.02));
}

TEST(CauseRatios, OfARaisedBandEndWhereItWasRaisedTo) {
    // South, mean 2.2, SD 0.2, n 16, has next to nothing above 3.2; judged, it is raised to 0.01.
    const Files files = small_files_with("serum_calcium.yaml", "edges: [2.0, 2.6]", "edges: [2.0, 3.2]");
    const TableSet set = likelihoods::read_table_set(files, "small");
    const auto& calcium = *set.find_table("serum_calcium");
    const likelihoods::EvidenceRow& south = likelihoods::row_of(set, calcium, "south");
    const engine::LogShareLaw law(south.compiled, 2);
    const double floor = std::log(south.compiled.probability(2));
    EXPECT_GE(law.quantile(0.001), floor - 1e-12) << "never below what the row was raised to";
    EXPECT_TRUE(near_abs(floor, law.quantile(0.025), 0.05));
    for (const auto& ratio : likelihoods::cause_ratios(set, calcium, "south", "north")) {
        EXPECT_LT(ratio.low, ratio.value);
        EXPECT_GT(ratio.high, ratio.value);
    }
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
