// SPDX-License-Identifier: Apache-2.0
// The quick way of reading a panel is held to the general one: same bands, same gate, same urgent values.
#include "steelyard/likelihoods/point_reader.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <map>

#include "table_files.hpp"

namespace steelyard::test {
namespace {

using likelihoods::BatchReading;
using likelihoods::Panel;
using likelihoods::PointPanel;
using likelihoods::PointReader;
using likelihoods::TableSet;

/// One panel both as entries and as numbers.
struct Both {
    Panel panel;
    PointPanel points;
};

/// Values near what decides: band edges, limits of the gate and of urgent values, by quantity.
std::map<std::string, std::vector<double>, std::less<>> turning_points(const TableSet& set) {
    std::map<std::string, std::vector<double>, std::less<>> points;
    for (const likelihoods::EvidenceTable& table : set.tables) {
        points[table.finding] = table.edges;
        for (std::size_t i = 0; i < table.joint_of.size(); ++i) {
            points[table.joint_of[i]] = table.joint_edges[i];
        }
        for (const likelihoods::Condition& condition : table.usable_when) {
            for (const auto& limit :
                 {condition.at_least, condition.at_most, condition.above, condition.below}) {
                if (limit) {
                    points[condition.subject].push_back(*limit);
                }
            }
        }
    }
    for (const likelihoods::UrgentLimit& limit : set.urgent) {
        for (const auto& side : {limit.low, limit.high}) {
            if (side) {
                points[limit.quantity].push_back(*side);
            }
        }
    }
    points["arterial_ph"].insert(points["arterial_ph"].end(), {7.35, 7.40, 7.45});
    points["arterial_pco2"].insert(points["arterial_pco2"].end(), {25.0, 30.0, 45.0});
    points["serum_bicarbonate"].insert(points["serum_bicarbonate"].end(), {14.0, 22.0, 24.0});
    points["serum_sodium"].insert(points["serum_sodium"].end(), {138.0, 140.0});
    points["serum_chloride"].insert(points["serum_chloride"].end(), {104.0, 110.0, 116.0});
    points["serum_albumin"].insert(points["serum_albumin"].end(), {25.0, 40.0});
    points["serum_lactate"].push_back(4.0);
    points["serum_beta_hydroxybutyrate"].push_back(3.0);
    return points;
}

double any_value(double low, double high, const std::vector<double>* near) {
    const double share = static_cast<double>(*rc::gen::inRange(0, 1000001)) / 1e6;
    if (near == nullptr || near->empty() || *rc::gen::inRange(0, 4) == 0) {
        return low + share * (high - low);
    }
    const double point = (*near)[*rc::gen::inRange<std::size_t>(0, near->size())];
    const double apart = std::vector<double>{
        0.0, 1e-12, -1e-12, 1e-6, -1e-6, 0.02, -0.02, 0.3, -0.3}[*rc::gen::inRange<std::size_t>(0, 9)];
    return std::clamp(point + apart * std::max(1.0, std::abs(point)), low, high);
}

Both any_panel(const TableSet& set, const PointReader& reader,
               const std::map<std::string, std::vector<double>, std::less<>>& points) {
    Both both{{}, reader.empty_panel()};
    const int share = *rc::gen::inRange(1, 10);  // of all entries are known
    const auto chosen = [&] { return *rc::gen::inRange(0, 10) < share; };
    const auto near = [&](std::string_view id) {
        const auto found = points.find(id);
        return found == points.end() ? nullptr : &found->second;
    };
    const auto set_value = [&](auto& entries, std::string_view id, double low, double high) {
        const double value = any_value(low, high, near(id));
        entries.emplace(id, likelihoods::Reading{likelihoods::Interval::point(value), {}, {}, {}});
        both.points.value[static_cast<std::size_t>(likelihoods::quantity_number(id))] = value;
    };
    for (const likelihoods::Analyte& analyte : likelihoods::analytes()) {
        if (chosen()) {
            set_value(both.panel.measured, analyte.id, analyte.plausible_low, analyte.plausible_high);
        }
    }
    for (const likelihoods::DerivedQuantity& derived : likelihoods::derived_quantities()) {
        if (*rc::gen::inRange(0, 20) == 0) {
            set_value(both.panel.given, derived.id, derived.plausible_low, derived.plausible_high);
        }
    }
    for (const auto& [feature, levels] : set.vocabulary().levels) {
        if (chosen()) {
            const auto level = *rc::gen::inRange<std::size_t>(0, levels.size());
            both.panel.observed.emplace(feature, likelihoods::Observation{levels[level], {}});
            const int number = reader.feature_number(feature);
            both.points.level[static_cast<std::size_t>(number)] =
                static_cast<std::int16_t>(reader.level_number(number, levels[level]));
        }
    }
    if (chosen()) {
        both.panel.age = both.points.age = static_cast<double>(*rc::gen::inRange(10, 90));
    }
    both.panel.sex = both.points.sex =
        *rc::gen::element(likelihoods::Sex::unknown, likelihoods::Sex::female, likelihoods::Sex::male);
    return both;
}

BatchReading the_general_way(const TableSet& set, const Panel& panel) {
    const likelihoods::Quantities quantities = likelihoods::derive(panel, set.gate.chemistry);
    return likelihoods::batch_reading(set, likelihoods::read_pattern(set, panel, quantities),
                                      likelihoods::gate(panel, quantities, set.gate),
                                      likelihoods::urgent_values(quantities, set.urgent));
}

void hold_both_ways_equal(const TableSet& set) {
    PointReader reader(set);
    const auto points = turning_points(set);
    int quick = 0;
    EXPECT_TRUE(rc::check("the quick way reads what the general way reads", [&] {
        Both both = any_panel(set, reader, points);
        BatchReading reading;
        if (reader.read(both.points, reading)) {
            ++quick;
            const BatchReading general = the_general_way(set, both.panel);
            RC_ASSERT(likelihoods::code_in_characters(set, reading.code) ==
                      likelihoods::code_in_characters(set, general.code));
            RC_ASSERT(reading.gate == general.gate);
            RC_ASSERT(reading.urgent == general.urgent);
        }
    }));
    EXPECT_GT(quick, 900);  // of 1000: the general way is the exception
}

TEST(PointReader, ReadsAsTheGeneralWayWithTheShippedTables) {
    hold_both_ways_equal(likelihoods::open_table_set("adult"));
}

TEST(PointReader, ReadsAsTheGeneralWayWithAJointTableAndAlternatives) {
    hold_both_ways_equal(small_set());
}

TEST(PointReader, AFormulaWithoutAValueLeavesItsFindingMissing) {
    // A urine chloride of 0 has no ratio of sodium to it; an age of 16 has no filtration rate.
    const TableSet set = likelihoods::open_table_set("adult");
    PointReader reader(set);
    PointPanel panel = reader.empty_panel();
    panel.value[static_cast<std::size_t>(likelihoods::quantity_number("serum_creatinine"))] = 80.0;
    panel.age = 16.0;
    panel.sex = likelihoods::Sex::female;
    BatchReading reading;
    ASSERT_TRUE(reader.read(panel, reading));
    EXPECT_EQ(reading.code, likelihoods::PatternCode(set.tables.size(), '\0'));
    EXPECT_EQ(reading.gate, likelihoods::GateStatus::out_of_scope);
}

TEST(PointReader, NamesFeaturesAndLevelsOfTheVocabulary) {
    const TableSet set = small_set();
    const PointReader reader(set);
    EXPECT_EQ(reader.feature_number("thrist"), -1);
    const int thirst = reader.feature_number("thirst");
    ASSERT_GE(thirst, 0);
    EXPECT_EQ(reader.level_number(thirst, "absent"), 1);
    EXPECT_EQ(reader.level_number(thirst, "maybe"), -1);
}

}  // namespace
}  // namespace steelyard::test
