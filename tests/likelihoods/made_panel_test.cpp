// SPDX-License-Identifier: Apache-2.0
#include "steelyard/likelihoods/made_panel.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include "steelyard/engine/counter_random.hpp"
#include "steelyard/likelihoods/pattern_code.hpp"
#include "table_files.hpp"

namespace steelyard::test {
namespace {

using likelihoods::BandsToShow;
using likelihoods::left_out;
using likelihoods::MadePanel;
using likelihoods::PanelMaker;
using likelihoods::TableSet;

const TableSet& adult() {
    static const TableSet set = likelihoods::open_table_set("adult");
    return set;
}

std::vector<bool> all_tables(const TableSet& set) {
    return std::vector<bool>(set.tables.size(), true);
}

std::vector<double> numbers(const PanelMaker& maker, std::uint64_t seed) {
    std::vector<double> numbers(maker.numbers());
    engine::fill_uniform(seed, 0, 0, numbers);
    return numbers;
}

BandsToShow nothing(const TableSet& set) {
    return BandsToShow(set.tables.size(), left_out);
}

std::size_t place_of(const TableSet& set, const std::string& finding) {
    for (std::size_t t = 0; t < set.tables.size(); ++t) {
        if (set.tables[t].finding == finding) {
            return t;
        }
    }
    throw std::logic_error("no table " + finding);
}

/// The panel as a reader of files makes it from its texts: so that what is checked is what is printed.
likelihoods::Panel read_back(const TableSet& set, const likelihoods::Panel& made, const PanelMaker& maker) {
    document::Diagnostics faults;
    const likelihoods::FeatureVocabulary vocabulary = set.vocabulary();
    likelihoods::PanelBuilder builder(vocabulary, faults);
    builder.start(made.case_id, {"made", 1, 1});
    if (made.sex != likelihoods::Sex::unknown) {
        builder.set("sex", made.sex == likelihoods::Sex::female ? "female" : "male", {"made", 1, 1});
    }
    builder.set("age", std::to_string(static_cast<int>(*made.age)), "a", {"made", 1, 1});
    std::size_t found = 0;
    for (const likelihoods::PanelEntry& entry : maker.entries()) {
        for (const auto* readings : {&made.measured, &made.given}) {
            if (const auto reading = readings->find(entry.name); reading != readings->end()) {
                builder.set(entry.name, reading->second.as_read, entry.unit, {"made", 1, 1});
                ++found;
            }
        }
        if (const auto seen = made.observed.find(entry.name); seen != made.observed.end()) {
            builder.set(entry.name, seen->second.level, {"made", 1, 1});
            ++found;
        }
    }
    EXPECT_EQ(found, made.measured.size() + made.given.size() + made.observed.size())
        << "every entry of a made panel is one of entries()";
    EXPECT_TRUE(faults.empty()) << faults.sorted().front().message;
    return builder.finish();
}

std::string code_of(const TableSet& set, const likelihoods::Panel& panel) {
    return likelihoods::code_of(
        set, likelihoods::read_pattern(set, panel, likelihoods::derive(panel, set.gate.chemistry)));
}

/// What is read of the printed panel is what was shown, and no more.
void expect_shown(const TableSet& set, const PanelMaker& maker, const MadePanel& made) {
    const std::string code = code_of(set, read_back(set, made.panel, maker));
    ASSERT_EQ(code.size(), made.shown.size());
    for (std::size_t t = 0; t < code.size(); ++t) {
        const auto state = static_cast<unsigned char>(code[t]);
        if (made.shown[t] == left_out) {
            EXPECT_LT(state, likelihoods::first_band_state) << set.tables[t].finding << " was left out";
        } else {
            EXPECT_EQ(state - likelihoods::first_band_state, made.shown[t]) << set.tables[t].finding;
        }
    }
}

TEST(MadePanel, ShowsEachBandOfEachTableAlone) {
    for (const TableSet& set : {adult(), small_set()}) {
        const PanelMaker maker(set, all_tables(set));
        EXPECT_TRUE(maker.never_shown().empty());
        for (std::size_t t = 0; t < set.tables.size(); ++t) {
            for (int band = 0; band < set.tables[t].bands(); ++band) {
                for (std::uint64_t seed = 0; seed < 3; ++seed) {
                    BandsToShow bands = nothing(set);
                    bands[t] = band;
                    const MadePanel made = maker.make("one", bands, numbers(maker, seed));
                    expect_shown(set, maker, made);
                    EXPECT_NE(made.gate, likelihoods::GateStatus::out_of_scope)
                        << set.tables[t].finding << band;
                }
            }
        }
    }
}

TEST(MadePanel, ShowsAnyBandsTogether) {
    const bool holds = rc::check([] {
        const bool small = *rc::gen::inRange(0, 4) == 0;
        static const TableSet small_tables = small_set();
        const TableSet& set = small ? small_tables : adult();
        static const PanelMaker adult_maker(adult(), all_tables(adult()));
        static const PanelMaker small_maker(small_tables, all_tables(small_tables));
        const PanelMaker& maker = small ? small_maker : adult_maker;
        BandsToShow bands = nothing(set);
        const int share = *rc::gen::inRange(0, 5);
        for (std::size_t t = 0; t < bands.size(); ++t) {
            if (*rc::gen::inRange(0, 4) < share) {
                bands[t] = *rc::gen::inRange(0, static_cast<int>(set.tables[t].bands()));
            }
        }
        const MadePanel made =
            maker.make("some", bands, numbers(maker, *rc::gen::arbitrary<std::uint64_t>()));
        expect_shown(set, maker, made);
        for (std::size_t t = 0; t < bands.size(); ++t) {
            RC_ASSERT((made.shown[t] == bands[t] || made.shown[t] == left_out));
        }
        RC_ASSERT(made.gate != likelihoods::GateStatus::out_of_scope);
    });
    EXPECT_TRUE(holds);
}

TEST(MadePanel, IsInScopeWhenItsGapIsNormal) {
    const TableSet& set = adult();
    const PanelMaker maker(set, all_tables(set));
    for (std::uint64_t seed = 0; seed < 40; ++seed) {
        BandsToShow bands = nothing(set);
        bands[place_of(set, "serum_bicarbonate")] = static_cast<int>(seed % 6);
        bands[place_of(set, "gfr")] = static_cast<int>(seed % 5);
        bands[place_of(set, "anion_gap_corrected")] = static_cast<int>(seed % 2);
        bands[place_of(set, "serum_potassium")] = static_cast<int>(seed % 7);
        EXPECT_EQ(maker.make("normal", bands, numbers(maker, seed)).gate, likelihoods::GateStatus::in_scope)
            << seed;
        EXPECT_EQ(maker.make("nothing", nothing(set), numbers(maker, seed)).gate,
                  likelihoods::GateStatus::in_scope)
            << "limits satisfy the gate where the findings are left out";
    }
}

TEST(MadePanel, IsTheSameWhicheverWayItIsChecked) {
    const TableSet& set = adult();
    const PanelMaker maker(set, all_tables(set));
    likelihoods::PointReader reader(set);
    for (std::uint64_t seed = 0; seed < 30; ++seed) {
        BandsToShow bands = nothing(set);
        for (std::size_t t = 0; t < bands.size(); ++t) {
            bands[t] =
                static_cast<int>((seed * 7 + t * 5) % static_cast<std::uint64_t>(set.tables[t].bands()));
        }
        const MadePanel slow = maker.make("x", bands, numbers(maker, seed));
        const MadePanel quick = maker.make("x", bands, numbers(maker, seed), &reader);
        EXPECT_EQ(slow.shown, quick.shown);
        EXPECT_EQ(slow.gate, quick.gate);
        EXPECT_EQ(slow.panel.measured.size(), quick.panel.measured.size());
        for (const auto& [id, reading] : slow.panel.measured) {
            EXPECT_EQ(reading.as_read, quick.panel.measured.at(id).as_read);
        }
    }
}

TEST(MadePanel, MeetsADerivedBandByMeasuredValuesWhereItCan) {
    const TableSet& set = adult();
    const PanelMaker maker(set, all_tables(set));
    int stated = 0;
    int filtration_stated = 0;
    for (std::uint64_t seed = 0; seed < 50; ++seed) {
        BandsToShow bands = nothing(set);
        bands[place_of(set, "serum_bicarbonate")] = 3;
        bands[place_of(set, "serum_potassium")] = 2;
        for (const char* finding :
             {"anion_gap_corrected", "gfr", "fe_potassium", "urine_calcium_creatinine"}) {
            bands[place_of(set, finding)] = 1;
        }
        bands[place_of(set, "gfr")] = static_cast<int>(seed % 6);  // on both sides of the equation's knee
        const MadePanel made = maker.make("derived", bands, numbers(maker, seed));
        filtration_stated += made.panel.given.contains("gfr") ? 1 : 0;
        EXPECT_TRUE(made.panel.measured.contains("serum_chloride"));
        stated += static_cast<int>(made.panel.given.size());
    }
    EXPECT_LE(stated, 5);
    EXPECT_LE(filtration_stated, 2);
}

TEST(MadePanel, StatesADerivedQuantityWhoseAnalytesWouldShowMore) {
    const TableSet& set = adult();
    const PanelMaker maker(set, all_tables(set));
    BandsToShow bands = nothing(set);
    bands[place_of(set, "fe_potassium")] = 2;  // potassium itself is left out
    const MadePanel made = maker.make("potassium", bands, numbers(maker, 3));
    EXPECT_TRUE(made.panel.given.contains("fe_potassium"));
    EXPECT_FALSE(made.panel.measured.contains("serum_potassium"));
    EXPECT_EQ(made.shown, bands);
}

TEST(MadePanel, LeavesAFindingOutByTheValuesOfOthersAloneNeverByItsOwnBand) {
    const TableSet& set = adult();
    const PanelMaker maker(set, all_tables(set));
    const std::size_t volume = place_of(set, "volume_status");
    const std::size_t tested = place_of(set, "urine_ph_after_furosemide");
    const std::size_t gfr = place_of(set, "gfr");
    const std::size_t urate = place_of(set, "fe_urate");
    for (std::uint64_t seed = 0; seed < 40; ++seed) {
        std::vector<int> urate_shown;
        for (int band = 0; band < 2; ++band) {
            BandsToShow bands = nothing(set);
            bands[tested] = band;
            bands[volume] = 0;  // depleted: the test may not be read
            bands[gfr] = 2;     // 30 to 45, and the condition of urate lies at 40
            bands[urate] = band;
            const MadePanel made = maker.make("conditions", bands, numbers(maker, seed));
            EXPECT_EQ(made.shown[tested], left_out);
            bands[volume] = 1;
            EXPECT_EQ(maker.make("conditions", bands, numbers(maker, seed)).shown[tested], band);
            urate_shown.push_back(made.shown[urate] == left_out ? 0 : 1);
        }
        EXPECT_EQ(urate_shown[0], urate_shown[1]) << seed;
    }
}

TEST(MadePanel, IsUniformInABandAndStaysBelowItsUpperEdge) {
    const TableSet& set = adult();
    const PanelMaker maker(set, all_tables(set));
    const std::size_t potassium = place_of(set, "serum_potassium");
    std::map<std::string, int> counts;
    for (std::uint64_t seed = 0; seed < 500; ++seed) {
        BandsToShow bands = nothing(set);
        bands[potassium] = 1;  // 2.5 to 3.0
        ++counts[maker.make("k", bands, numbers(maker, seed)).panel.measured.at("serum_potassium").as_read];
    }
    ASSERT_EQ(counts.size(), 5U) << "2.5, 2.6, 2.7, 2.8, 2.9";
    for (const auto& [text, count] : counts) {
        EXPECT_NEAR(count, 100, 45) << text;
    }
}

TEST(PanelMaker, LeavesOutWhatConditionsMakeImpossible) {
    // Two tables that want the opposite of one feature: the first has its way.
    Files files =
        small_files_with("serum_phosphate.yaml",
                         "  - {quantity: gfr, at_least: \"30 mL/min/{1.73_m2}\", else: filtration is too "
                         "low, when_unknown: set_aside}",
                         "  - {feature: fasting, is: absent, else: fasting}");
    const TableSet set = likelihoods::read_table_set(files, "small");
    const PanelMaker maker(set, all_tables(set));
    EXPECT_EQ(maker.never_shown(), std::vector<std::string>{"serum_phosphate"});
    BandsToShow bands = nothing(set);
    bands[place_of(set, "serum_phosphate")] = 1;
    bands[place_of(set, "serum_calcium")] = 1;
    const MadePanel made = maker.make("x", bands, numbers(maker, 1));
    EXPECT_EQ(made.shown[place_of(set, "serum_phosphate")], left_out);
    EXPECT_EQ(made.shown[place_of(set, "serum_calcium")], 1);
}

TEST(PanelMaker, StatesADerivedQuantityThatAConditionAsksFor) {
    const TableSet set = small_set();
    const PanelMaker maker(set, all_tables(set));
    BandsToShow bands = nothing(set);
    bands[place_of(set, "serum_phosphate")] = 1;  // wants a known GFR of at least 30
    const MadePanel made = maker.make("x", bands, numbers(maker, 1));
    EXPECT_EQ(made.shown, bands);
    EXPECT_GE(made.panel.given.at("gfr").value.low, 30.0);
}

TEST(PanelMaker, RefusesWhatDoesNotFitTheSet) {
    const TableSet& set = adult();
    EXPECT_THROW(PanelMaker(set, std::vector<bool>(3, true)), std::invalid_argument);
    const PanelMaker maker(set, all_tables(set));
    EXPECT_THROW(maker.make("x", BandsToShow(3, left_out), numbers(maker, 1)), std::invalid_argument);
    EXPECT_THROW(maker.make("x", nothing(set), std::vector<double>(3, 0.5)), std::invalid_argument);
    BandsToShow bands = nothing(set);
    bands[0] = static_cast<int>(set.tables[0].bands());
    EXPECT_THROW(maker.make("x", bands, numbers(maker, 1)), std::invalid_argument);
    bands[0] = -2;
    EXPECT_THROW(maker.make("x", bands, numbers(maker, 1)), std::invalid_argument);
    TableSet beyond = small_set();  // a reader of files lets no such edge through
    beyond.tables[place_of(beyond, "serum_urate")].edges = {250, 2500};
    EXPECT_THROW(PanelMaker(beyond, all_tables(beyond)), std::invalid_argument);
}

}  // namespace
}  // namespace steelyard::test
