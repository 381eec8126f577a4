// SPDX-License-Identifier: Apache-2.0
#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <cmath>
#include <map>

#include "near.hpp"
#include "steelyard/likelihoods/pattern.hpp"
#include "table_files.hpp"

namespace steelyard::test {
namespace {

using likelihoods::FindingReading;
using likelihoods::Pattern;
using likelihoods::TableSet;
using likelihoods::Use;

using Entries = std::vector<std::pair<std::string, std::string>>;

likelihoods::Panel panel_for(const TableSet& set, const Entries& entries) {
    document::Diagnostics faults;
    const likelihoods::FeatureVocabulary vocabulary = set.vocabulary();
    likelihoods::PanelBuilder builder(vocabulary, faults);
    builder.start("case", {"case.yaml", 1, 1});
    for (const auto& [name, text] : entries) {
        builder.set(name, text, {"case.yaml", 2, 1});
    }
    for (const document::Diagnostic& fault : faults.sorted()) {
        ADD_FAILURE() << fault.message;
    }
    return builder.finish();
}

/// The pattern of a panel with the quantities it gives, together with the names needed to read it.
struct Read {
    TableSet set;
    Pattern pattern;

    Read(TableSet from, const Entries& entries) : set(std::move(from)) {
        const likelihoods::Panel panel = panel_for(set, entries);
        pattern = likelihoods::read_pattern(set, panel, likelihoods::derive(panel, set.gate.chemistry));
    }

    const FindingReading& of(const std::string& finding) const {
        for (const FindingReading& reading : pattern.findings) {
            if (set.tables[reading.table].finding == finding) {
                return reading;
            }
        }
        throw std::logic_error("no finding " + finding);
    }
};

Read read_small(const Entries& entries) {
    return Read(small_set(), entries);
}

const Entries fasting = {{"fasting", "present"}, {"serum_albumin", "40 g/L"}};

Entries with(Entries entries, const Entries& more) {
    entries.insert(entries.end(), more.begin(), more.end());
    return entries;
}

/// The small set with the edges of calcium replaced and no names.
TableSet with_calcium_edges(const std::string& edges) {
    Files files = small_files_with("serum_calcium.yaml", "edges: [2.0, 2.6]\nnames: [low, middle, high]",
                                   "edges: " + edges);
    return likelihoods::read_table_set(files, "small");
}

TEST(Pattern, HasOneReadingForEachTableInTheOrderOfTheSet) {
    const Read read = read_small(Entries{});
    ASSERT_EQ(read.pattern.findings.size(), read.set.tables.size());
    for (std::size_t i = 0; i < read.set.tables.size(); ++i) {
        EXPECT_EQ(read.pattern.findings[i].table, i);
        EXPECT_EQ(read.pattern.findings[i].use, Use::missing);
        EXPECT_FALSE(read.pattern.findings[i].why_not.empty());
    }
    EXPECT_TRUE(read.pattern.unread.empty());
}

TEST(Pattern, ReadsAValueInItsBand) {
    const Read read = read_small(with(fasting, {{"serum_calcium", "2.3 mmol/L"}}));
    const FindingReading& calcium = read.of("serum_calcium");
    EXPECT_EQ(calcium.use, Use::read) << calcium.why_not;
    EXPECT_EQ(calcium.cells, (std::vector<Eigen::Index>{1}));
    EXPECT_EQ(calcium.band, "middle");
    ASSERT_TRUE(calcium.value.has_value());
    EXPECT_EQ(calcium.value->low, 2.3);
    EXPECT_EQ(calcium.weight, 1.0);
    EXPECT_TRUE(calcium.remarks.empty());
}

TEST(Pattern, AValueOnAnEdgeBelongsToTheUpperBand) {
    EXPECT_EQ(read_small(with(fasting, {{"serum_calcium", "2.0 mmol/L"}})).of("serum_calcium").band,
              "middle");
    EXPECT_EQ(read_small(with(fasting, {{"serum_calcium", "1.99 mmol/L"}})).of("serum_calcium").band, "low");
    EXPECT_EQ(read_small(with(fasting, {{"serum_calcium", "2.6 mmol/L"}})).of("serum_calcium").band, "high");
}

TEST(Pattern, AConvertedValueOnAnEdgeBelongsToTheUpperBand) {
    // Edges 2.5 and 5.4 mg/dL; the same values given in either unit must not fall beside them by a rounding.
    const Entries filtration = {{"gfr", "90 mL/min/{1.73_m2}"}};
    EXPECT_EQ(read_small(with(filtration, {{"serum_phosphate", "5.4 mg/dL"}})).of("serum_phosphate").band,
              "5.4 mg/dL or more");
    EXPECT_EQ(read_small(with(filtration, {{"serum_phosphate", "2.5 mg/dL"}})).of("serum_phosphate").band,
              "2.5 to 5.4 mg/dL");
    EXPECT_EQ(read_small(with(filtration, {{"serum_phosphate", "5.399 mg/dL"}})).of("serum_phosphate").band,
              "2.5 to 5.4 mg/dL");
    // 2.6 mmol/L of calcium reached through mg/dL, a hair below the edge in floating point.
    const double below = std::nextafter(2.6, 0.0);
    likelihoods::Panel panel = panel_for(small_set(), with(fasting, {{"serum_calcium", "2.6 mmol/L"}}));
    panel.measured.at("serum_calcium").value = likelihoods::Interval::point(below);
    const TableSet set = small_set();
    EXPECT_EQ(likelihoods::read_pattern(set, panel, likelihoods::derive(panel)).findings[0].band, "high");
}

TEST(Pattern, ACensoredValueInsideOneBandIsRead) {
    const Read below = read_small(with(fasting, {{"serum_calcium", "<2.0 mmol/L"}}));
    EXPECT_EQ(below.of("serum_calcium").use, Use::read) << "below an edge is wholly below it";
    EXPECT_EQ(below.of("serum_calcium").band, "low");
    const Read above = read_small(with(fasting, {{"serum_calcium", ">2.6 mmol/L"}}));
    EXPECT_EQ(above.of("serum_calcium").band, "high");
    const Read at_most = read_small(with(fasting, {{"serum_calcium", "<=2.0 mmol/L"}}));
    EXPECT_EQ(at_most.of("serum_calcium").use, Use::set_aside) << "at most an edge may be the edge itself";
}

TEST(Pattern, ACensoredValueAcrossBandsIsSetAsideInWords) {
    const Read read = read_small(with(fasting, {{"serum_calcium", "<2.50 mmol/L"}}));
    const FindingReading& calcium = read.of("serum_calcium");
    EXPECT_EQ(calcium.use, Use::set_aside);
    EXPECT_EQ(calcium.why_not, "known only as below 2.50 mmol/L, which spans two bands");
    EXPECT_TRUE(calcium.cells.empty());
    const Read three = read_small(with(fasting, {{"serum_calcium", ">1.5 mmol/L"}}));
    EXPECT_EQ(three.of("serum_calcium").why_not, "known only as above 1.5 mmol/L, which spans three bands");
}

TEST(Pattern, AFailedConditionSetsAsideWithItsReason) {
    const Read read =
        read_small({{"fasting", "present"}, {"serum_albumin", "20 g/L"}, {"serum_calcium", "2.3 mmol/L"}});
    EXPECT_EQ(read.of("serum_calcium").use, Use::set_aside);
    EXPECT_EQ(read.of("serum_calcium").why_not, "albumin is too low to read calcium (serum albumin 20 g/L)");
    const Read fed =
        read_small({{"fasting", "absent"}, {"serum_albumin", "40 g/L"}, {"serum_calcium", "2.3 mmol/L"}});
    EXPECT_EQ(fed.of("serum_calcium").why_not, "the sample was not fasting (fasting: absent)");
}

TEST(Pattern, AConditionHoldsOnItsLimit) {
    EXPECT_EQ(
        read_small({{"fasting", "present"}, {"serum_albumin", "25 g/L"}, {"serum_calcium", "2.3 mmol/L"}})
            .of("serum_calcium")
            .use,
        Use::read);
    EXPECT_EQ(
        read_small({{"fasting", "present"}, {"serum_albumin", "2.5 g/dL"}, {"serum_calcium", "2.3 mmol/L"}})
            .of("serum_calcium")
            .use,
        Use::read);
}

TEST(Pattern, AConditionThatCannotBeCheckedIsNamed) {
    const Read read = read_small({{"serum_calcium", "2.3 mmol/L"}});
    EXPECT_EQ(read.of("serum_calcium").use, Use::read);
    EXPECT_EQ(read.of("serum_calcium").unchecked, (std::vector<std::string>{"serum_albumin", "fasting"}));
    EXPECT_TRUE(read.of("serum_calcium").remarks.empty());
    const Read censored =
        read_small({{"serum_calcium", "2.3 mmol/L"}, {"serum_albumin", "<30 g/L"}, {"fasting", "present"}});
    EXPECT_EQ(censored.of("serum_calcium").remarks,
              (std::vector<std::string>{"could not be checked: serum albumin known only as below 30 g/L"}));
}

TEST(Pattern, AConditionMaySetAsideWhenItIsUnknown) {
    const Read read = read_small({{"serum_phosphate", "1 mmol/L"}});
    EXPECT_EQ(read.of("serum_phosphate").use, Use::set_aside);
    EXPECT_NE(read.of("serum_phosphate").why_not.find("not given"), std::string::npos)
        << read.of("serum_phosphate").why_not;
}

TEST(Pattern, LimitsOfEveryKindAreChecked) {
    const auto use = [](const std::string& limit, const std::string& albumin) {
        Files files = small_files_with("serum_calcium.yaml", "at_least: 25 g/L", limit);
        return Read(likelihoods::read_table_set(files, "small"),
                    {{"fasting", "present"}, {"serum_albumin", albumin}, {"serum_calcium", "2.3 mmol/L"}})
            .of("serum_calcium");
    };
    EXPECT_EQ(use("above: 25 g/L", "25 g/L").use, Use::set_aside);
    EXPECT_EQ(use("above: 25 g/L", ">25 g/L").use, Use::read);
    EXPECT_TRUE(use("above: 25 g/L", ">25 g/L").remarks.empty());
    EXPECT_EQ(use("at_most: 25 g/L", "25 g/L").use, Use::read);
    EXPECT_EQ(use("at_most: 25 g/L", "26 g/L").use, Use::set_aside);
    EXPECT_EQ(use("below: 25 g/L", "25 g/L").use, Use::set_aside);
    EXPECT_EQ(use("below: 25 g/L", "<25 g/L").use, Use::read);
    EXPECT_TRUE(use("below: 25 g/L", "<25 g/L").remarks.empty());
    EXPECT_EQ(use("above: 20 g/L, at_most: 30 g/L", "31 g/L").use, Use::set_aside);
    EXPECT_EQ(use("above: 20 g/L, at_most: 30 g/L", "30 g/L").use, Use::read);
}

TEST(Pattern, OfAlternativesOnlyTheFirstUsableIsRead) {
    const Entries both = {
        {"serum_phosphate", "1 mmol/L"}, {"serum_urate", "300 umol/L"}, {"gfr", "90 mL/min/{1.73_m2}"}};
    const Read preferred = read_small(both);
    EXPECT_EQ(preferred.of("serum_phosphate").use, Use::read);
    EXPECT_EQ(preferred.of("serum_urate").use, Use::set_aside);
    EXPECT_EQ(preferred.of("serum_urate").why_not, "the serum phosphate is read in its place");
    const Read next = read_small(
        {{"serum_phosphate", "1 mmol/L"}, {"serum_urate", "300 umol/L"}, {"gfr", "20 mL/min/{1.73_m2}"}});
    EXPECT_EQ(next.of("serum_phosphate").use, Use::set_aside);
    EXPECT_EQ(next.of("serum_phosphate").why_not, "filtration is too low (GFR 20 mL/min/1.73 m²)")
        << "its own reason stands";
    EXPECT_EQ(next.of("serum_urate").use, Use::read);
    EXPECT_EQ(read_small({{"serum_urate", "300 umol/L"}}).of("serum_urate").use, Use::read);
}

TEST(Pattern, AMissingFindingWhoseConditionFailsIsBarred) {
    const Read low = read_small({{"fasting", "present"}, {"serum_albumin", "20 g/L"}});
    EXPECT_EQ(low.of("serum_calcium").use, Use::missing);
    EXPECT_EQ(low.of("serum_calcium").why_not, "not given");
    EXPECT_EQ(low.of("serum_calcium").barred, "albumin is too low to read calcium (serum albumin 20 g/L)");
    EXPECT_EQ(read_small(fasting).of("serum_calcium").barred, "");
    EXPECT_EQ(read_small({{"serum_albumin", "<30 g/L"}}).of("serum_calcium").barred, "")
        << "a limit that leaves the condition open does not fail it";
    EXPECT_NE(
        read_small(Entries{}).of("serum_phosphate").barred.find("cannot be told whether it may be read"),
        std::string::npos)
        << "one of which nothing is known bars when it would set the finding aside";
    EXPECT_EQ(
        read_small({{"serum_albumin", "20 g/L"}, {"serum_calcium", "2.3 mmol/L"}}).of("serum_calcium").barred,
        "")
        << "only what is missing is barred";
}

TEST(Pattern, AMissingAlternativeOfOneThatIsReadIsBarred) {
    const Read read = read_small({{"serum_phosphate", "1 mmol/L"}, {"gfr", "90 mL/min/{1.73_m2}"}});
    EXPECT_EQ(read.of("serum_urate").use, Use::missing);
    EXPECT_EQ(read.of("serum_urate").why_not, "not given");
    EXPECT_EQ(read.of("serum_urate").barred, "the serum phosphate is read in its place");
    EXPECT_EQ(read.of("serum_phosphate").barred, "");
    const Read second = read_small({{"serum_urate", "300 umol/L"}, {"gfr", "90 mL/min/{1.73_m2}"}});
    EXPECT_EQ(second.of("serum_phosphate").barred, "") << "it is preferred, so it would be read";
    const Read own = read_small({{"serum_urate", "300 umol/L"}, {"gfr", "20 mL/min/{1.73_m2}"}});
    EXPECT_EQ(own.of("serum_phosphate").barred, "filtration is too low (GFR 20 mL/min/1.73 m²)")
        << "its own reason stands";
    EXPECT_EQ(read_small(Entries{}).of("serum_urate").barred, "");
}

TEST(Pattern, OfTheShippedTablesBarsWhatWouldAddNothing) {
    const TableSet adult = likelihoods::open_table_set("adult");
    const Read acidotic(adult, {{"serum_bicarbonate", "14 mmol/L"}});
    EXPECT_EQ(acidotic.of("fe_bicarbonate").use, Use::missing);
    EXPECT_NE(acidotic.of("fe_bicarbonate").barred.find("(serum bicarbonate 14 mmol/L)"), std::string::npos)
        << acidotic.of("fe_bicarbonate").barred;
    const Read potassium(adult, {{"fe_potassium", "25 %"}});
    ASSERT_EQ(potassium.of("fe_potassium").use, Use::read) << potassium.of("fe_potassium").why_not;
    EXPECT_EQ(potassium.of("ttkg").use, Use::missing);
    EXPECT_TRUE(potassium.of("ttkg").barred.ends_with("is read in its place")) << potassium.of("ttkg").barred;
}

TEST(Pattern, AGroupWeighsWhatIsReadOfIt) {
    const Read one = read_small(with(fasting, {{"serum_calcium", "2.3 mmol/L"}}));
    EXPECT_EQ(one.of("serum_calcium").weight, 1.0);
    EXPECT_EQ(one.of("serum_calcium").group, "");
    const Read two = read_small(with(fasting, {{"serum_calcium", "2.3 mmol/L"}, {"tremor", "present"}}));
    // Kish: 1 / (1 + (2 - 1) 0.5).
    EXPECT_TRUE(near_rel(2.0 / 3.0, two.of("serum_calcium").weight, 1e-15));
    EXPECT_TRUE(near_rel(2.0 / 3.0, two.of("tremor_and_magnesium").weight, 1e-15));
    EXPECT_EQ(two.of("serum_calcium").group, "minerals");
    const Eigen::ArrayXd weights = likelihoods::row_weights(two.pattern);
    ASSERT_EQ(weights.size(), 2);
    EXPECT_TRUE(near_rel(2.0 / 3.0, weights(0), 1e-15));
}

TEST(Pattern, AJointTableReadsACellOrAMargin) {
    const Read cell = read_small({{"serum_magnesium", "0.6 mmol/L"}, {"tremor", "absent"}});
    EXPECT_EQ(cell.of("tremor_and_magnesium").cells, (std::vector<Eigen::Index>{1}));
    EXPECT_EQ(cell.of("tremor_and_magnesium").band, "serum magnesium below 0.7; tremor absent");
    EXPECT_TRUE(cell.of("tremor_and_magnesium").remarks.empty());
    const Read first = read_small({{"serum_magnesium", "0.8 mmol/L"}});
    EXPECT_EQ(first.of("tremor_and_magnesium").cells, (std::vector<Eigen::Index>{2, 3}));
    EXPECT_EQ(first.of("tremor_and_magnesium").band, "serum magnesium 0.7 or more");
    EXPECT_EQ(first.of("tremor_and_magnesium").remarks.size(), 1U);
    const Read second = read_small({{"tremor", "present"}});
    EXPECT_EQ(second.of("tremor_and_magnesium").cells, (std::vector<Eigen::Index>{0, 2}));
    const Read spanning = read_small({{"serum_magnesium", "<0.9 mmol/L"}, {"tremor", "present"}});
    EXPECT_EQ(spanning.of("tremor_and_magnesium").cells, (std::vector<Eigen::Index>{0, 2}));
    const Read alone = read_small({{"serum_magnesium", "<0.9 mmol/L"}});
    EXPECT_EQ(alone.of("tremor_and_magnesium").use, Use::set_aside);
}

TEST(Pattern, LogLikelihoodsOfAMarginAddUp) {
    const Read read = read_small({{"serum_magnesium", "0.8 mmol/L"}, {"thirst", "present"}});
    const Eigen::ArrayXXd rows =
        likelihoods::log_likelihood_rows(read.set, read.pattern, {"south", "north", "both"});
    ASSERT_EQ(rows.rows(), 2);
    ASSERT_EQ(rows.cols(), 3);
    EXPECT_TRUE(near_rel(std::log(0.1), rows(0, 0), 1e-13)) << "thirst, south: 0.5 / 5";
    EXPECT_TRUE(near_rel(std::log(3.5 / 11.0), rows(0, 1), 1e-13));
    EXPECT_EQ(rows(0, 2), rows(0, 0)) << "the composite takes thirst of south";
    EXPECT_TRUE(near_rel(std::log(0.5), rows(1, 0), 1e-13)) << "two of four even cells";
    EXPECT_TRUE(near_rel(std::log(13.0 / 22.0), rows(1, 1), 1e-13)) << "1.5 and 11.5 of 22";
    EXPECT_EQ(rows(1, 2), rows(1, 1)) << "and all else of north";
}

TEST(Pattern, NothingReadGivesNoRows) {
    const Read read = read_small(Entries{});
    EXPECT_EQ(likelihoods::log_likelihood_rows(read.set, read.pattern, {"north", "south"}).rows(), 0);
    EXPECT_EQ(likelihoods::row_weights(read.pattern).size(), 0);
}

TEST(Pattern, ListsWhatNothingReads) {
    const Read read = read_small({{"serum_glucose", "5 mmol/L"},       // nothing
                                  {"serum_lactate", "1 mmol/L"},       // the gate
                                  {"serum_calcium", "2.3 mmol/L"},     // a table
                                  {"serum_magnesium", "0.8 mmol/L"},   // a joint table
                                  {"serum_albumin", "40 g/L"},         // a condition
                                  {"serum_bicarbonate", "14 mmol/L"},  // the gate
                                  {"serum_potassium", "3 mmol/L"},     // an urgent limit
                                  {"alkali", "absent"},                // the gate
                                  {"ttkg", "4"}});                     // nothing
    EXPECT_EQ(read.pattern.unread, (std::vector<std::string>{"serum_glucose", "ttkg"}));
}

TEST(Pattern, InputsOfWhatIsReadAreRead) {
    const Read read = read_small({{"serum_creatinine", "80 umol/L"},
                                  {"sex", "female"},
                                  {"age", "40 a"},
                                  {"urine_creatinine", "5 mmol/L"}});
    EXPECT_EQ(read.pattern.unread, (std::vector<std::string>{"urine_creatinine"}))
        << "creatinine gives the GFR of a condition";
}

TableSet with_urine_ph() {
    Files files = small_files_with("set.yaml", "thirst, serum_urate,",
                                   "thirst, serum_urate, urine_ph, urine_anion_gap,");
    files.emplace_back(
        "urine_ph.yaml",
        "format: steelyard.evidence-table/1\nfinding: urine_ph\nedges: [5.5, 6.5]\nrows:\n"
        "  north: {counts: [1, 2, 3], basis: elicited}\n  south: {counts: [1, 2, 3], basis: elicited}\n");
    files.emplace_back(
        "urine_anion_gap.yaml",
        "format: steelyard.evidence-table/1\nfinding: urine_anion_gap\nunit: mmol/L\nedges: [0, 20]\nrows:\n"
        "  north: {counts: [1, 2, 3], basis: elicited}\n  south: {counts: [1, 2, 3], basis: elicited}\n");
    return likelihoods::read_table_set(files, "small");
}

TEST(Pattern, ADipstickNearAnEdgeIsRemarkedUpon) {
    const Read near(with_urine_ph(), {{"urine_ph", "5.6"}, {"urine_method", "dipstick"}});
    ASSERT_EQ(near.of("urine_ph").remarks.size(), 1U);
    EXPECT_NE(near.of("urine_ph").remarks[0].find("dipstick"), std::string::npos);
    EXPECT_NE(near.of("urine_ph").remarks[0].find("5.5"), std::string::npos);
    EXPECT_TRUE(Read(with_urine_ph(), {{"urine_ph", "5.6"}, {"urine_method", "electrode"}})
                    .of("urine_ph")
                    .remarks.empty());
    EXPECT_TRUE(Read(with_urine_ph(), {{"urine_ph", "6.0"}, {"urine_method", "dipstick"}})
                    .of("urine_ph")
                    .remarks.empty());
}

TEST(Pattern, ASumThatRoundsBesideAnEdgeIsOnIt) {
    // 32.3 + 20.3 - 52.6 is -7.1e-15 in floating point, and 0 to the laboratory.
    ASSERT_LT(32.3 + 20.3 - 52.6, 0.0);
    const Read read(with_urine_ph(), {{"urine_sodium", "32.3 mmol/L"},
                                      {"urine_potassium", "20.3 mmol/L"},
                                      {"urine_chloride", "52.6 mmol/L"}});
    EXPECT_EQ(read.of("urine_anion_gap").band, "0 to 20");
}

TEST(Pattern, SaysWhatADerivedQuantityLacks) {
    const Read read(with_urine_ph(), {{"urine_potassium", "32 mmol/L"}});
    EXPECT_EQ(read.of("urine_anion_gap").use, Use::missing);
    EXPECT_EQ(read.of("urine_anion_gap").why_not, "needs urine sodium and urine chloride");
    EXPECT_EQ(read.of("urine_ph").why_not, "not given");
}

TEST(Pattern, CensoredInputsGiveACensoredGap) {
    const Read read(
        with_urine_ph(),
        {{"urine_sodium", "<10 mmol/L"}, {"urine_potassium", "20 mmol/L"}, {"urine_chloride", "10 mmol/L"}});
    const FindingReading& gap = read.of("urine_anion_gap");
    EXPECT_EQ(gap.use, Use::read) << gap.why_not;
    EXPECT_EQ(gap.band, "0 to 20") << "10 up to, not reaching, 20";
}

TEST(Pattern, EveryValueFallsInExactlyOneBand) {
    const TableSet set = with_calcium_edges("[1.0, 1.7, 2.0, 2.6, 3.1]");
    const std::vector<double>& edges = set.find_table("serum_calcium")->edges;
    EXPECT_TRUE(rc::check("one band, and the one that holds the value", [&] {
        const double value = 0.8 + 5.2 * static_cast<double>(*rc::gen::inRange(0, 1000001)) / 1e6;
        likelihoods::Panel panel;
        panel.measured["serum_calcium"].value = likelihoods::Interval::point(value);
        const Pattern pattern = likelihoods::read_pattern(set, panel, likelihoods::derive(panel));
        RC_ASSERT(pattern.findings[0].use == Use::read);
        RC_ASSERT(pattern.findings[0].cells.size() == 1U);
        const auto band = static_cast<std::size_t>(pattern.findings[0].cells[0]);
        constexpr double hair = 1e-8;
        RC_ASSERT((band == 0 || value >= edges[band - 1] - hair));
        RC_ASSERT((band == edges.size() || value < edges[band] + hair));
    }));
}

/// Index of a finding's table.
std::size_t table_of(const TableSet& set, const std::string& finding) {
    return static_cast<std::size_t>(set.find_table(finding) - set.tables.data());
}

bool same_reading(const FindingReading& a, const FindingReading& b) {
    return a.table == b.table && a.use == b.use && a.cells == b.cells && a.band == b.band &&
           a.why_not == b.why_not && a.barred == b.barred && a.weight == b.weight && a.group == b.group &&
           a.passed_over == b.passed_over;
}

const Entries all_of_it = with(fasting, {{"gfr", "90 mL/min/{1.73_m2}"},
                                         {"serum_calcium", "2.3 mmol/L"},
                                         {"serum_phosphate", "1.0 mmol/L"},
                                         {"serum_urate", "300 umol/L"},
                                         {"tremor", "present"},
                                         {"serum_magnesium", "0.8 mmol/L"}});

TEST(Reread, WithoutChangesIsThePatternItself) {
    for (const Entries& entries : {Entries{}, fasting, all_of_it}) {
        const Read read = read_small(entries);
        const Pattern again = likelihoods::reread(read.set, read.pattern, {});
        for (std::size_t i = 0; i < again.findings.size(); ++i) {
            EXPECT_TRUE(same_reading(again.findings[i], read.pattern.findings[i])) << i;
        }
    }
}

TEST(Reread, WithoutAPreferredFindingItsAlternativeIsRead) {
    const Read read = read_small(all_of_it);
    ASSERT_EQ(read.of("serum_phosphate").use, Use::read);
    ASSERT_TRUE(read.of("serum_urate").passed_over);
    const std::size_t phosphate = table_of(read.set, "serum_phosphate");
    const std::size_t urate = table_of(read.set, "serum_urate");
    const Pattern without = likelihoods::reread(read.set, read.pattern, {{phosphate, {}}});
    EXPECT_EQ(without.findings[phosphate].use, Use::missing);
    EXPECT_EQ(without.findings[urate].use, Use::read);
    EXPECT_EQ(without.findings[urate].band, read.of("serum_urate").band);
    // And the other way about: the preferred one comes back and the alternative is passed over again.
    const Pattern back =
        likelihoods::reread(read.set, without, {{phosphate, read.of("serum_phosphate").cells.front()}});
    EXPECT_EQ(back.findings[urate].use, Use::set_aside);
    EXPECT_TRUE(back.findings[urate].passed_over);
}

TEST(Reread, AGroupIsWeighedAnew) {
    const Read read = read_small(all_of_it);
    const std::size_t calcium = table_of(read.set, "serum_calcium");
    const std::size_t other = table_of(read.set, "tremor_and_magnesium");
    ASSERT_LT(read.pattern.findings[calcium].weight, 1.0);
    const Pattern without = likelihoods::reread(read.set, read.pattern, {{other, {}}});
    EXPECT_EQ(without.findings[calcium].weight, 1.0);
    EXPECT_TRUE(without.findings[calcium].group.empty());
    const Pattern with_again = likelihoods::reread(read.set, without, {{other, Eigen::Index{0}}});
    EXPECT_EQ(with_again.findings[calcium].weight, read.pattern.findings[calcium].weight);
}

TEST(Reread, RefusesWhatIsNotOfTheSet) {
    const Read read = read_small(fasting);
    EXPECT_THROW(static_cast<void>(likelihoods::reread(read.set, read.pattern, {{99, {}}})),
                 std::out_of_range);
    EXPECT_THROW(static_cast<void>(likelihoods::reread(read.set, read.pattern, {{0, Eigen::Index{99}}})),
                 std::out_of_range);
}

}  // namespace
}  // namespace steelyard::test
