// SPDX-License-Identifier: Apache-2.0
#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <boost/math/distributions/students_t.hpp>
#include <cmath>

#include "near.hpp"
#include "table_files.hpp"

namespace steelyard::test {
namespace {

using likelihoods::EvidenceRow;
using likelihoods::EvidenceTable;
using likelihoods::FindingKind;
using likelihoods::RowForm;
using likelihoods::TableSet;

const EvidenceRow& row(const TableSet& set, const std::string& finding, const std::string& cause) {
    return likelihoods::row_of(set, *set.find_table(finding), cause);
}

void expect_bands(const EvidenceRow& row, const std::vector<double>& wanted, double tolerance = 1e-14) {
    ASSERT_EQ(row.compiled.probability.size(), static_cast<Eigen::Index>(wanted.size()));
    for (std::size_t i = 0; i < wanted.size(); ++i) {
        EXPECT_TRUE(near_rel(wanted[i], row.compiled.probability(static_cast<Eigen::Index>(i)), tolerance))
            << "band " << i;
    }
}

TEST(ReadTableSet, ReadsTheSmallSetWhole) {
    const TableSet set = small_set();
    EXPECT_EQ(set.title, "Two fevers");
    EXPECT_EQ(set.name, "small");
    EXPECT_EQ(set.caution, "For tests only");
    ASSERT_EQ(set.causes.size(), 3U);
    EXPECT_EQ(set.causes[0].id, "north");
    EXPECT_EQ(set.causes[0].icd10cm, "A00.0");
    EXPECT_EQ(set.causes[2].id, "both") << "composites come last";
    EXPECT_EQ(set.causes[2].where.line, 7);
    std::vector<std::string> order;
    for (const EvidenceTable& table : set.tables) {
        order.push_back(table.finding);
    }
    EXPECT_EQ(order, (std::vector<std::string>{"serum_calcium", "serum_phosphate", "thirst", "serum_urate",
                                               "tremor_and_magnesium"}))
        << "the order of `findings`, not of the files";
    ASSERT_EQ(set.groups.size(), 1U);
    EXPECT_EQ(set.groups[0].rho, 0.5);
    ASSERT_EQ(set.one_of.size(), 1U);
    EXPECT_EQ(set.one_of[0].findings.size(), 2U);
    EXPECT_EQ(set.gate.bicarbonate_low.value, 22.0);
    EXPECT_EQ(set.gate.ph_high.value, 7.45);
    EXPECT_EQ(set.gate.gap_high_from.value, 16.0) << "mEq/L of univalent ions is mmol/L";
    EXPECT_EQ(set.gate.chemistry.albumin_reference, 40.0) << "4 g/dL";
    EXPECT_EQ(set.gate.chemistry.albumin_slope, 0.25);
    EXPECT_EQ(set.gate.alkali_feature, "alkali");
    EXPECT_EQ(set.gate.pregnancy_feature, "") << "left out";
    EXPECT_EQ(set.gate.lactate_high.value, 4.0);
    EXPECT_EQ(set.gate.ketones_high.value, 3.0);
    EXPECT_EQ(set.gate.pco2_high.value, 45.0);
    EXPECT_TRUE(set.gate.gfr_conditions.empty()) << "no table of GFR";
    EXPECT_EQ(set.gate_entries.size(), 19U);
    ASSERT_EQ(set.urgent.size(), 1U);
    EXPECT_EQ(set.urgent[0].low, 2.8);
    EXPECT_EQ(set.urgent[0].high, 6.2);
}

TEST(ReadTableSet, TakesAFeatureForPregnancyOrNone) {
    const auto named = [](const std::string& feature) {
        return likelihoods::read_table_set(
                   small_files_with("set.yaml", "alkali_feature: alkali",
                                    "alkali_feature: alkali\n  pregnancy_feature: " + feature),
                   "small")
            .gate.pregnancy_feature;
    };
    EXPECT_EQ(named("fasting"), "fasting");
    EXPECT_EQ(named("none"), "");
}

TEST(ReadTableSet, HandsTheGateWhatItsGfrTableAsksOfFeatures) {
    const TableSet set = likelihoods::load_table_set(STEELYARD_SOURCE_DIR "/likelihoods/tables/adult");
    std::size_t asked = 0;
    for (const likelihoods::Condition& condition : set.find_table("gfr")->usable_when) {
        asked += condition.is_feature ? 1 : 0;
    }
    ASSERT_GT(asked, 0U);
    EXPECT_EQ(set.gate.gfr_conditions.size(), asked);
    EXPECT_EQ(set.gate.gfr_conditions[0].feature, "changing_creatinine");
    EXPECT_EQ(set.gate.gfr_conditions[0].level, "absent");
    EXPECT_FALSE(set.gate.gfr_conditions[0].otherwise.empty());
}

TEST(ReadTableSet, ReadsAHead) {
    const TableSet set = small_set();
    const EvidenceTable& calcium = *set.find_table("serum_calcium");
    EXPECT_EQ(calcium.kind, FindingKind::quantity);
    EXPECT_EQ(calcium.unit, "mmol/L");
    EXPECT_EQ(calcium.edges, (std::vector<double>{2.0, 2.6}));
    EXPECT_EQ(calcium.band_names, (std::vector<std::string>{"low", "middle", "high"}));
    EXPECT_EQ(calcium.least, 0.01);
    EXPECT_EQ(calcium.caution, "Test only");
    ASSERT_EQ(calcium.usable_when.size(), 2U);
    EXPECT_EQ(calcium.usable_when[0].at_least, 25.0);
    EXPECT_FALSE(calcium.usable_when[0].set_aside_when_unknown);
    ASSERT_TRUE(calcium.usable_when[0].grounds.has_value());
    EXPECT_EQ(calcium.usable_when[0].grounds->basis, document::Basis::practice);
    EXPECT_TRUE(calcium.usable_when[1].is_feature);
    EXPECT_EQ(calcium.usable_when[1].level, "present");
    EXPECT_TRUE(set.find_table("serum_phosphate")->usable_when[0].set_aside_when_unknown);
    EXPECT_EQ(set.find_table("thirst")->burden, "bedside");
    EXPECT_EQ(set.find_table("thirst")->levels, (std::vector<std::string>{"present", "absent"}));
}

TEST(ReadTableSet, NamesBandsByTheirEdgesAsWritten) {
    const TableSet set = small_set();
    EXPECT_EQ(set.find_table("serum_urate")->band_names,
              (std::vector<std::string>{"below 250", "250 to 420", "420 or more"}));
    // Another unit than the canonical one is shown with the name, since a report shows the value in the
    // canonical unit.
    EXPECT_EQ(set.find_table("serum_phosphate")->band_names,
              (std::vector<std::string>{"below 2.5 mg/dL", "2.5 to 5.4 mg/dL", "5.4 mg/dL or more"}));
    EXPECT_EQ(set.find_table("serum_phosphate")->title, "Serum phosphate") << "the title of the analyte";
}

TEST(ReadTableSet, MakesEdgesCanonical) {
    const EvidenceTable phosphate = *small_set().find_table("serum_phosphate");
    EXPECT_EQ(phosphate.unit, "mmol/L");
    // 1 mg/dL of phosphorus is 10 / 30.973762 mmol/L (standard atomic weight of phosphorus, IUPAC 2021).
    EXPECT_TRUE(near_rel(2.5 * 10.0 / 30.973762, phosphate.edges[0], 1e-5));
    EXPECT_TRUE(near_rel(5.4 * 10.0 / 30.973762, phosphate.edges[1], 1e-5));
}

// The Dirichlet posterior mean of Jeffreys' start: (count + 1/2) / (total + bands / 2), by hand.
TEST(RowForms, CountsStartFromAHalfInEachBand) {
    const TableSet set = small_set();
    expect_bands(row(set, "thirst", "north"), {3.5 / 11.0, 7.5 / 11.0});
    expect_bands(row(set, "thirst", "south"), {0.5 / 5.0, 4.5 / 5.0});
    expect_bands(row(set, "serum_urate", "north"), {3.5 / 11.5, 5.5 / 11.5, 2.5 / 11.5});
    EXPECT_EQ(row(set, "thirst", "north").effective_patients, 10.0);
    EXPECT_EQ(row(set, "thirst", "north").as_given, "counts 3, 7");
    EXPECT_EQ(row(set, "thirst", "north").grounds.sources, (std::vector<std::string>{"field", "ward"}));
}

TEST(RowForms, ShareIsTheMeanOfADirichletOfItsWorth) {
    const TableSet set = small_set();
    const EvidenceRow& north = row(set, "serum_phosphate", "north");
    expect_bands(north, {0.2, 0.7, 0.1});
    EXPECT_FALSE(north.least_acted);
    EXPECT_EQ(north.effective_patients, 20.0);
    EXPECT_EQ(north.as_given, "share 0.2, 0.7, 0.1, worth 20 patients");
    EXPECT_TRUE(near_rel(14.0, std::get<engine::DirichletLaw>(north.compiled.law).alpha(1), 1e-14));
}

TEST(RowForms, JudgedRowsAreKeptAtTheLeast) {
    const TableSet set = small_set();
    // 0.001 raised to the default 0.005, then everything divided by 1.004.
    const EvidenceRow& south = row(set, "serum_phosphate", "south");
    EXPECT_TRUE(south.least_acted);
    expect_bands(south, {0.005 / 1.004, 0.599 / 1.004, 0.4 / 1.004});
    const engine::DirichletLaw& law = std::get<engine::DirichletLaw>(south.compiled.law);
    EXPECT_TRUE(near_rel(10.0, law.alpha.sum(), 1e-14)) << "the worth stays";
    EXPECT_TRUE(near_rel(10.0 * 0.4 / 1.004, law.alpha(2), 1e-14)) << "the law is centred on the row as used";
}

TEST(RowForms, TheLawOfAJudgedMeanIsToldOfTheLeast) {
    // North is a study, south from memory and raised: mean 2.2, SD 0.2 puts little above 3.2.
    const Files files = small_files_with("serum_calcium.yaml", "edges: [2.0, 2.6]", "edges: [2.0, 3.2]");
    const TableSet set = likelihoods::read_table_set(files, "small");
    const EvidenceRow& south = row(set, "serum_calcium", "south");
    EXPECT_TRUE(south.least_acted);
    EXPECT_EQ(std::get<engine::SummaryLaw>(south.compiled.law).least, 0.01);
    EXPECT_EQ(std::get<engine::SummaryLaw>(row(set, "serum_calcium", "north").compiled.law).least, 0.0);
    EXPECT_LT(south.compiled.probability(2), 0.01) << "raised, then normalised: a little below the least";
    EXPECT_GT(south.compiled.probability(2), 0.01 / 1.01);
}

TEST(RowForms, StudiedRowsAreNotRaised) {
    const Files files = small_files_with("serum_phosphate.yaml", "worth: 10, basis: elicited}",
                                         "worth: 10, basis: study, source: s}\nsources: {s: A study}");
    const TableSet set = likelihoods::read_table_set(files, "small");
    EXPECT_FALSE(row(set, "serum_phosphate", "south").least_acted);
    expect_bands(row(set, "serum_phosphate", "south"), {0.001, 0.599, 0.4});
}

// The Student-t predictive: n - 1 degrees of freedom, scale sd * sqrt(1 + 1/n), integrated over the bands.
TEST(RowForms, SummaryIsAStudentPredictive) {
    const TableSet set = small_set();
    const auto predictive = [](double mean, double sd, double n, double edge) {
        return boost::math::cdf(boost::math::students_t(n - 1.0),
                                (edge - mean) / (sd * std::sqrt(1.0 + 1.0 / n)));
    };
    const double low = predictive(2.3, 0.2, 9.0, 2.0);
    const double high = predictive(2.3, 0.2, 9.0, 2.6);
    expect_bands(row(set, "serum_calcium", "north"), {low, high - low, 1.0 - high}, 1e-12);
    // A standard error of 0.05 in 16 patients is a standard deviation of 0.2.
    const double south_low = predictive(2.2, 0.2, 16.0, 2.0);
    const double south_high = predictive(2.2, 0.2, 16.0, 2.6);
    expect_bands(row(set, "serum_calcium", "south"), {south_low, south_high - south_low, 1.0 - south_high},
                 1e-12);
    EXPECT_EQ(row(set, "serum_calcium", "south").as_given, "mean 2.2, SEM 0.05, n 16");
    EXPECT_EQ(row(set, "serum_calcium", "south").note, "From the ward");
    EXPECT_EQ(row(set, "serum_calcium", "south").effective_patients, 16.0);
}

TEST(RowForms, SummaryOnTheLogScaleIsOfTheLogarithm) {
    const Files files = small_files_with("serum_calcium.yaml", "mean: 2.3, sd: 0.2, n: 9",
                                         "mean: 0.8329091229351039, sd: 0.1, n: 9, scale: log");
    const TableSet set = likelihoods::read_table_set(files, "small");
    const auto predictive = [](double edge) {
        return boost::math::cdf(boost::math::students_t(8.0),
                                (std::log(edge) - std::log(2.3)) / (0.1 * std::sqrt(10.0 / 9.0)));
    };
    expect_bands(row(set, "serum_calcium", "north"),
                 {predictive(2.0), predictive(2.6) - predictive(2.0), 1.0 - predictive(2.6)}, 1e-12);
    EXPECT_EQ(row(set, "serum_calcium", "north").as_given,
              "natural log: mean 0.8329091229351039, SD 0.1, n 9");
}

TEST(RowForms, SummaryInAnotherUnitIsTheSameRow) {
    const TableSet in_mmol = small_set();
    // 1 mmol/L of calcium is 4.0078 mg/dL; edges, means and spreads all pass through the same factor.
    Files files = small_files();
    std::string& text = text_named(files, "serum_calcium.yaml");
    const auto replace = [&](const std::string& from, const std::string& to) {
        text.replace(text.find(from), from.size(), to);
    };
    const double factor = 4.0078;
    replace("unit: mmol/L", "unit: mg/dL");
    replace("[2.0, 2.6]", "[" + std::to_string(2.0 * factor) + ", " + std::to_string(2.6 * factor) + "]");
    replace("mean: 2.3, sd: 0.2",
            "mean: " + std::to_string(2.3 * factor) + ", sd: " + std::to_string(0.2 * factor));
    replace("mean: 2.2, sem: 0.05",
            "mean: " + std::to_string(2.2 * factor) + ", sem: " + std::to_string(0.05 * factor));
    const TableSet in_mg = likelihoods::read_table_set(files, "small");
    for (const std::string cause : {"north", "south"}) {
        for (Eigen::Index band = 0; band < 3; ++band) {
            // std::to_string keeps six decimals, which bounds the agreement.
            EXPECT_TRUE(near_rel(row(in_mmol, "serum_calcium", cause).compiled.probability(band),
                                 row(in_mg, "serum_calcium", cause).compiled.probability(band), 1e-4));
        }
    }
    EXPECT_NE(row(in_mg, "serum_calcium", "south").as_given.find("(in mg/dL)"), std::string::npos);
}

TEST(RowForms, RatioMultipliesTheOtherCausesRow) {
    const TableSet set = small_set();
    const EvidenceRow& south = row(set, "serum_urate", "south");
    // 0.5 * 3.5, 1.2 * 5.5, 1.25 * 2.5, all over 11.5, then divided by their sum 11.475 / 11.5.
    expect_bands(south, {1.75 / 11.475, 6.6 / 11.475, 3.125 / 11.475});
    EXPECT_EQ(south.against, "north");
    EXPECT_EQ(south.as_given,
              "ratio 0.5 (0.25 to 1.0), 1.2 (0.9 to 1.6), 1.25 (0.5 to 2.0), against Northern fever");
    const engine::RatioLaw& law = std::get<engine::RatioLaw>(south.compiled.law);
    // A 95 % interval reaches 1.959964 standard deviations either way: ln 4 / 3.919928 for (0.25, 1.0).
    EXPECT_TRUE(near_rel(std::log(4.0) / 3.919928, law.log_sd(0), 1e-6));
    EXPECT_TRUE(near_rel(std::log(4.0) / 3.919928, law.log_sd(2), 1e-6));
    EXPECT_EQ(south.effective_patients, 0.0) << "ratios do not say";
}

TEST(RowForms, RatiosMayFollowEachOtherInAnyOrder) {
    Files files = small_files_with("set.yaml", "  south: {title: Southern fever}",
                                   "  south: {title: Southern fever}\n  west: {title: Western fever}");
    std::string& urate = text_named(files, "serum_urate.yaml");
    urate =
        "format: steelyard.evidence-table/1\nfinding: serum_urate\nunit: umol/L\nedges: [250, 420]\nrows:\n"
        "  north: {ratio: [2, 1, 0.5], against: south, basis: elicited}\n"
        "  south: {ratio: [1, 1, 1], against: west, basis: elicited}\n"
        "  west: {share: [0.2, 0.4, 0.4], worth: 10, basis: elicited}\n";
    for (const auto& [name, addition] : std::vector<std::pair<std::string, std::string>>{
             {"serum_calcium.yaml", "  west: {mean: 2.3, sd: 0.2, n: 9, basis: elicited}\n"},
             {"serum_phosphate.yaml", "  west: {share: [0.2, 0.7, 0.1], worth: 20, basis: elicited}\n"},
             {"thirst.yaml", "  west: {counts: [1, 1], basis: elicited}\n"},
             {"tremor_and_magnesium.yaml", "  west: {joint: [[1, 1], [1, 1]], basis: elicited}\n"}}) {
        std::string& text = text_named(files, name);
        text.insert(text.find("rows:\n") + 6, addition);
    }
    const TableSet set = likelihoods::read_table_set(files, "small");
    expect_bands(row(set, "serum_urate", "south"), {0.2, 0.4, 0.4});
    expect_bands(row(set, "serum_urate", "north"), {0.4, 0.4, 0.2});
}

TEST(RowForms, JointTablesCountCells) {
    const TableSet set = small_set();
    const EvidenceTable& table = *set.find_table("tremor_and_magnesium");
    EXPECT_EQ(table.kind, FindingKind::joint);
    EXPECT_EQ(table.band_names, (std::vector<std::string>{"below 0.7; present", "below 0.7; absent",
                                                          "0.7 or more; present", "0.7 or more; absent"}));
    expect_bands(row(set, "tremor_and_magnesium", "north"),
                 {6.5 / 22.0, 2.5 / 22.0, 1.5 / 22.0, 11.5 / 22.0});
    EXPECT_EQ(row(set, "tremor_and_magnesium", "north").as_given, "joint counts 6, 2 / 1, 11");
    EXPECT_TRUE(set.vocabulary().levels.contains("tremor"));
}

TEST(RowForms, RatiosAgainstTheRestAreSolvedBackToTheRowsTheyCameFrom) {
    // Rows (0.2, 0.8) and (0.5, 0.5) in a study of 60 % north: with two causes the rest is the other cause,
    // so the ratios are 0.4 and 1.6, and their reciprocals.
    Files files = small_files();
    text_named(files, "thirst.yaml") =
        "format: steelyard.evidence-table/1\nfinding: thirst\ntitle: Thirst\nlevels: [present, absent]\n"
        "study_mix: {north: 0.6, south: 0.4}\nrows:\n"
        "  north: {ratio_to_rest: [0.4, 1.6], basis: elicited}\n"
        "  south: {ratio_to_rest: [2.5, 0.625], range: [[2, 3], [0.5, 0.7]], basis: elicited}\n";
    const TableSet set = likelihoods::read_table_set(files, "small");
    expect_bands(row(set, "thirst", "north"), {0.2, 0.8}, 1e-9);
    expect_bands(row(set, "thirst", "south"), {0.5, 0.5}, 1e-9);
    const EvidenceTable& table = *set.find_table("thirst");
    EXPECT_LT(table.incoherence.maxCoeff(), 1e-9);
    EXPECT_TRUE(table.scale_is_unique);
    EXPECT_TRUE(near_rel(0.6, table.study_mix(0), 1e-15));
    EXPECT_EQ(row(set, "thirst", "south").form, RowForm::ratio_to_rest);
    EXPECT_EQ(row(set, "thirst", "south").as_given, "ratio to the rest 2.5 (2 to 3), 0.625 (0.5 to 0.7)");
    const engine::RatioLaw& law = std::get<engine::RatioLaw>(row(set, "thirst", "south").compiled.law);
    // p/m = R / (1 - w + w R) moves by (1 - w) / (1 - w + w R) of ln R: 0.6 / (0.6 + 0.4 * 2.5) for 2.5 (2 to
    // 3), 0.6 / (0.6 + 0.4 * 0.625) for 0.625 (0.5 to 0.7).
    EXPECT_TRUE(near_rel(0.375 * std::log(1.5) / 3.919928, law.log_sd(0), 1e-6));
    EXPECT_TRUE(near_rel(0.6 / 0.85 * std::log(1.4) / 3.919928, law.log_sd(1), 1e-6));
    EXPECT_TRUE(near_rel(std::log(2.5 / 1.6), law.log_ratio(0), 1e-12));
    const auto& published = row(set, "thirst", "south").published;
    ASSERT_EQ(published.size(), 2U);
    EXPECT_EQ(published[1].low, 0.5);
    EXPECT_EQ(published[1].high, 0.7);
    EXPECT_EQ(row(set, "thirst", "north").published[0].high, 0.4) << "no range: the ratio three times";
    EXPECT_TRUE(row(set, "serum_phosphate", "north").published.empty());
}

TEST(RowForms, RatiosAgainstTheRestOverManyBandsKeepTheRatiosBetweenCauses) {
    // Rows (0.2, 0.5, 0.3) and (0.5, 0.3, 0.2): three bands and two causes, so the rows themselves are not
    // fixed.
    Files files = small_files();
    std::string& text = text_named(files, "serum_phosphate.yaml");
    text = text.substr(0, text.find("rows:")) +
           "study_mix: {north: 0.6, south: 0.4}\nrows:\n"
           "  north: {ratio_to_rest: [0.4, 1.6666666666666667, 1.5], basis: elicited}\n"
           "  south: {ratio_to_rest: [2.5, 0.6, 0.6666666666666667], basis: elicited}\n";
    const TableSet set = likelihoods::read_table_set(files, "small");
    const EvidenceTable& table = *set.find_table("serum_phosphate");
    EXPECT_FALSE(table.scale_is_unique);
    const Eigen::ArrayXXd bands = likelihoods::band_probabilities(set, table, {"north", "south"});
    EXPECT_TRUE(near_rel(0.4, bands(0, 0) / bands(0, 1), 1e-9));
    EXPECT_TRUE(near_rel(5.0 / 3.0, bands(1, 0) / bands(1, 1), 1e-9));
    EXPECT_TRUE(near_rel(1.5, bands(2, 0) / bands(2, 1), 1e-9));
}

// Batlle and others, N Engl J Med 1988;318:594: urine anion gap in classic distal acidosis 23 +/- 4.1 mmol/L
// (SEM), n 11.
TEST(ReadTableSet, ReadsTheUrineAnionGapOfAPublishedGroup) {
    Files files =
        small_files_with("set.yaml", "thirst, serum_urate,", "thirst, serum_urate, urine_anion_gap,");
    files.emplace_back(
        "urine_anion_gap.yaml",
        "format: steelyard.evidence-table/1\n"
        "finding: urine_anion_gap\n"
        "unit: mmol/L\n"
        "edges: [-20, 0, 20, 40]                    # five bands; a band includes its lower edge\n"
        "burden: routine\n"
        "usable_when:\n"
        "  - {quantity: urine_sodium, at_least: 25 mmol/L, else: \"too little sodium reaches the distal "
        "nephron\"}\n"
        "rows:\n"
        "  north: {mean: 23, sem: 4.1, n: 11, basis: study, source: batlle-1988}\n"
        "  south: {mean: -20, sem: 5.7, n: 8, basis: study, source: batlle-1988}\n"
        "sources: {batlle-1988: {cite: \"N Engl J Med 1988;318:594\", doi: \"10.1056/NEJM198803103181002\", "
        "seen: abstract}}\n"
        "least: 0.005\n");
    const TableSet set = likelihoods::read_table_set(files, "small");
    const EvidenceTable& table = *set.find_table("urine_anion_gap");
    EXPECT_EQ(table.title, "Urine anion gap");
    EXPECT_EQ(table.band_names,
              (std::vector<std::string>{"below -20", "-20 to 0", "0 to 20", "20 to 40", "40 or more"}));
    EXPECT_EQ(table.least, 0.005);
    const boost::math::students_t t(10.0);
    const double scale = 4.1 * std::sqrt(11.0) * std::sqrt(12.0 / 11.0);
    EXPECT_TRUE(
        near_rel(boost::math::cdf(t, (0.0 - 23.0) / scale) - boost::math::cdf(t, (-20.0 - 23.0) / scale),
                 row(set, "urine_anion_gap", "north").compiled.probability(1), 1e-12));
    EXPECT_EQ(row(set, "urine_anion_gap", "north").as_given, "mean 23, SEM 4.1, n 11");
}

TEST(ReadTableSet, RefusesALogScaleWithEdgesAtOrBelowZero) {
    Files files =
        small_files_with("set.yaml", "thirst, serum_urate,", "thirst, serum_urate, urine_anion_gap,");
    files.emplace_back(
        "urine_anion_gap.yaml",
        "format: steelyard.evidence-table/1\nfinding: urine_anion_gap\nunit: mmol/L\nedges: [0, 20]\nrows:\n"
        "  north: {mean: 3, sd: 1, n: 11, scale: log, basis: elicited}\n"
        "  south: {mean: 3, sd: 1, n: 8, basis: elicited}\n");
    EXPECT_EQ(summary_of(faults_of(files)), "small/urine_anion_gap.yaml 6:41 bad-edges");
}

TEST(ReadTableSet, ReportsAllFaultsOfAllFilesInOneRun) {
    Files files = small_files_with("serum_calcium.yaml", "edges: [2.0, 2.6]", "edges: [2.6, 2.0]");
    std::string& thirst = text_named(files, "thirst.yaml");
    thirst.replace(thirst.find("[3, 7]"), 6, "[3, 7, 1]");
    std::string& set = text_named(files, "set.yaml");
    set.replace(set.find("rho: 0.5"), 8, "rho: 5.0");
    std::string& urate = text_named(files, "serum_urate.yaml");
    urate = "format: [";
    const std::vector<document::Diagnostic> faults = faults_of(files);
    std::vector<std::string> found;
    for (const document::Diagnostic& fault : faults) {
        found.push_back(fault.where.file);
        EXPECT_FALSE(fault.where.line == 0) << fault.message;
    }
    EXPECT_EQ(faults.size(), 4U) << messages_of(faults);
    EXPECT_EQ(std::set<std::string>(found.begin(), found.end()).size(), 4U);
}

TEST(ReadTableSet, HintsAtTheNearestName) {
    const auto faults = faults_of(
        small_files_with("serum_calcium.yaml", "quantity: serum_albumin", "quantity: serum_albumen"));
    ASSERT_EQ(faults.size(), 1U);
    EXPECT_EQ(faults[0].hint, "did you mean serum_albumin?");
    EXPECT_NE(faults[0].source_line.find("serum_albumen"), std::string::npos) << "the line is shown";
}

TEST(ReadTableSet, SaysByHowMuchRatiosMiss) {
    const auto faults =
        faults_of(small_files_with("serum_urate.yaml", "ratio: [0.5, 1.2, 1.25]", "ratio: [0.5, 1.3, 1.5]"));
    ASSERT_EQ(faults.size(), 1U);
    // 0.5 * 3.5 + 1.3 * 5.5 + 1.5 * 2.5 = 12.65, over 11.5 is 1.1.
    EXPECT_NE(faults[0].message.find("1.1000"), std::string::npos) << faults[0].message;
    EXPECT_NE(faults[0].message.find("+0.1000"), std::string::npos) << faults[0].message;
}

TEST(ReadTableSet, NeedsASetFile) {
    Files files = small_files();
    std::erase_if(files, [](const auto& file) { return file.first == "set.yaml"; });
    EXPECT_EQ(summary_of(faults_of(files)), "small 0:0 missing-file");
}

TEST(ReadTableSet, ReadsJsonWithTheSameKeys) {
    Files files = small_files();
    std::erase_if(files, [](const auto& file) { return file.first == "thirst.yaml"; });
    files.emplace_back("thirst.json",
                       R"({"format": "steelyard.evidence-table/1", "finding": "thirst", "title": "Thirst",
                           "levels": ["present", "absent"], "burden": "bedside",
                           "rows": {"north": {"counts": [3, 7], "basis": "study", "source": ["field", "ward"]},
                                    "south": {"counts": [0, 4], "basis": "review", "source": "ward"}},
                           "sources": {"field": "A field study", "ward": "A ward book"}})");
    const TableSet set = likelihoods::read_table_set(files, "small");
    expect_bands(row(set, "thirst", "north"), {3.5 / 11.0, 7.5 / 11.0});
}

TEST(ReadTableSet, DigestsNameAndTextOfEveryFile) {
    const std::string digest = small_set().digest;
    EXPECT_TRUE(digest.starts_with("sha256:"));
    EXPECT_EQ(digest, likelihoods::read_table_set(small_files(), "another name").digest);
    EXPECT_NE(digest,
              likelihoods::read_table_set(small_files_with("thirst.yaml", "# Counted", "# counted"), "small")
                  .digest);
}

/// A number with as many digits as are needed to read it back.
std::string digits(double value) {
    std::ostringstream out;
    out.imbue(std::locale::classic());
    out.precision(17);
    out << value;
    return out.str();
}

TEST(ReadTableSet, GivesBackTheSharesThatWereWritten) {
    EXPECT_TRUE(rc::check("a set written as YAML and read back has the same probabilities", [] {
        const auto bands = *rc::gen::inRange<std::size_t>(2, 7);
        std::string edges;
        for (std::size_t i = 1; i < bands; ++i) {
            edges += (i == 1 ? "" : ", ") + digits(1.0 + 0.37 * static_cast<double>(i));
        }
        std::vector<std::vector<double>> shares;
        std::string rows;
        for (const std::string cause : {"north", "south"}) {
            std::vector<double> weights;
            double total = 0.0;
            for (std::size_t i = 0; i < bands; ++i) {
                weights.push_back(static_cast<double>(*rc::gen::inRange(20, 1000)));
                total += weights.back();
            }
            rows += "  " + cause + ": {share: [";
            for (std::size_t i = 0; i < bands; ++i) {
                weights[i] /= total;
                rows += (i == 0 ? "" : ", ") + digits(weights[i]);
            }
            rows += "], worth: " + std::to_string(*rc::gen::inRange(1, 500)) + ", basis: study, source: s}\n";
            shares.push_back(weights);
        }
        Files files = small_files();
        std::erase_if(files, [](const auto& file) { return file.first == "serum_calcium.yaml"; });
        files.emplace_back(
            "serum_calcium.yaml",
            "format: steelyard.evidence-table/1\nfinding: serum_calcium\nunit: mmol/L\nedges: [" + edges +
                "]\nrows:\n" + rows + "sources: {s: A study}\n");
        const TableSet set = likelihoods::read_table_set(files, "random");
        const Eigen::ArrayXXd read =
            likelihoods::band_probabilities(set, *set.find_table("serum_calcium"), {"north", "south"});
        for (std::size_t c = 0; c < 2; ++c) {
            for (std::size_t i = 0; i < bands; ++i) {
                RC_ASSERT(near_rel(shares[c][i],
                                   read(static_cast<Eigen::Index>(i), static_cast<Eigen::Index>(c)), 1e-13));
            }
        }
    }));
}

}  // namespace
}  // namespace steelyard::test
