// SPDX-License-Identifier: Apache-2.0
// The tally: any split of the cases adds up to the same bytes, what differs is refused, and what was read
// back is what was written.
#include "steelyard/cli/tally.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <nlohmann/json.hpp>

#include "run_program.hpp"
#include "steelyard/cli/tally_file.hpp"
#include "steelyard/likelihoods/read_table_set.hpp"

namespace steelyard::cli {
namespace {

using likelihoods::GateStatus;
using test::text_of;
using test::WorkDir;

/// Three findings, the last with two digits a band.
TallyHead small_head() {
    TallyHead head;
    head.versions = {"0.1.0"};
    head.tables_title = "Small";
    head.tables_digest = "sha256:aa";
    head.reading_digest = "sha256:bb";
    head.causes = {"wet", "dry"};
    head.findings = {{"rain", 4}, {"wind", 5}, {"cloud", 100}};
    head.by = {"ward"};
    head.months = true;
    return head;
}

std::string code(int a, int b, int c) {
    return {static_cast<char>(a), static_cast<char>(b), static_cast<char>(c)};
}

struct Patient {
    std::string code, cause, stratum, month;
    GateStatus gate{};
    bool readable = true;
};

Patient any_patient() {
    Patient patient;
    patient.code = code(*rc::gen::inRange(0, 4), *rc::gen::inRange(0, 5), *rc::gen::inRange(0, 100));
    patient.cause =
        *rc::gen::element<std::string>("", "wet", "dry", "mist", "\"a\", or b\n", "Niesel \xC3\xBC");
    patient.stratum = *rc::gen::element<std::string>("", "north", "south");
    patient.month = *rc::gen::element<std::string>("", "2025-03", "2024-12");
    patient.gate = *rc::gen::element(GateStatus::in_scope, GateStatus::caution, GateStatus::out_of_scope);
    patient.readable = *rc::gen::inRange(0, 10) > 0;
    return patient;
}

void add(Tally& tally, const Patient& patient) {
    if (patient.readable) {
        tally.add(patient.code, patient.gate, patient.cause, patient.stratum, patient.month);
    } else {
        tally.add_set_aside();
    }
}

Tally tally_of(const std::vector<Patient>& patients) {
    Tally tally(small_head());
    for (const Patient& patient : patients) {
        add(tally, patient);
    }
    return tally;
}

std::vector<Patient> any_patients() {
    std::vector<Patient> patients;
    const int n = *rc::gen::inRange(0, 30);
    for (int i = 0; i < n; ++i) {
        patients.push_back(any_patient());
    }
    return patients;
}

/// What reading says is wrong, as `line:column code`; empty when nothing is.
std::string faults_in(std::string_view text) {
    document::Diagnostics faults;
    const std::optional<Tally> tally = read_tally(text, "x.tally", faults);
    EXPECT_EQ(tally.has_value(), faults.empty());
    std::string list;
    for (const document::Diagnostic& fault : faults.sorted()) {
        list += (list.empty() ? "" : "; ") + std::to_string(fault.where.line) + ':' +
                std::to_string(fault.where.column) + ' ' + std::string(document::to_string(fault.code));
    }
    return list;
}

Tally read_back(std::string_view text) {
    document::Diagnostics faults;
    std::optional<Tally> tally = read_tally(text, "x.tally", faults);
    if (!tally) {
        throw document::LoadError(faults);
    }
    return std::move(*tally);
}

TEST(Tally, AnySplitAddsUpToTheSameBytes) {
    EXPECT_TRUE(rc::check("split over 1 to 16 parts, merged in any order", [] {
        const std::vector<Patient> patients = any_patients();
        const std::string whole = tally_text(tally_of(patients));
        const auto parts = *rc::gen::inRange<std::size_t>(1, 17);
        std::vector<std::vector<Patient>> split(parts);
        for (const Patient& patient : patients) {
            split[*rc::gen::inRange<std::size_t>(0, parts)].push_back(patient);
        }
        std::vector<Tally> tallies;
        for (const std::vector<Patient>& part : split) {
            tallies.push_back(tally_of(part));
        }
        // Two at a time in any order: any grouping.
        while (tallies.size() > 1) {
            const auto from = *rc::gen::inRange<std::size_t>(0, tallies.size());
            const Tally part = tallies[from];
            tallies.erase(tallies.begin() + static_cast<std::ptrdiff_t>(from));
            tallies[*rc::gen::inRange<std::size_t>(0, tallies.size())].merge(part);
        }
        RC_ASSERT(tally_text(tallies.front()) == whole);
    }));
}

TEST(Tally, ReadsBackWhatItWrote) {
    EXPECT_TRUE(rc::check("write, read, write", [] {
        const Tally tally = tally_of(any_patients());
        const std::string text = tally_text(tally);
        const Tally again = read_back(text);
        RC_ASSERT(tally_text(again) == text);
        RC_ASSERT(again.flow() == tally.flow());
        const Tally fewer = tally.suppressed(static_cast<std::uint64_t>(*rc::gen::inRange(1, 4)));
        RC_ASSERT(tally_text(read_back(tally_text(fewer))) == tally_text(fewer));
    }));
}

TEST(Tally, CountsReconcileWhateverIsAdded) {
    EXPECT_TRUE(rc::check("flow", [] {
        const std::vector<Patient> patients = any_patients();
        const TallyFlow flow = tally_of(patients).flow();
        RC_ASSERT(flow.read == patients.size());
        RC_ASSERT(flow.read == flow.weighed + flow.out_of_scope + flow.set_aside);
        RC_ASSERT(flow.weighed == flow.diagnosed + flow.outside + flow.undiagnosed);
    }));
    Tally tally(small_head());
    tally.add(code(2, 2, 2), GateStatus::in_scope, "dry", "north", "2025-01", 5);
    tally.add(code(2, 2, 2), GateStatus::caution, "mist", "north", "2025-01", 2);
    tally.add(code(0, 0, 0), GateStatus::in_scope, "", "", "", 3);
    tally.add(code(0, 0, 0), GateStatus::out_of_scope, "dry", "", "", 4);
    tally.add_set_aside(6);
    EXPECT_EQ(tally.flow(), (TallyFlow{20, 10, 4, 6, 5, 2, 3}));
    EXPECT_EQ(tally.out_of_scope().at("dry"), 4U);
    EXPECT_EQ(tally.cells(), 3U);
}

TEST(Tally, IsWrittenInOneOrderAsDocumented) {
    Tally tally(small_head());
    tally.add(code(2, 0, 99), GateStatus::in_scope, "wet", "north", "2025-03", 7);
    tally.add(code(2, 0, 99), GateStatus::caution, "wet", "north", "2025-03");
    tally.add(code(1, 2, 0), GateStatus::in_scope, "", "", "");
    const std::string text = tally_text(tally);
    EXPECT_EQ(
        text,
        R"({"format":"steelyard.tally/1","versions":["0.1.0"],"tables":{"title":"Small","digest":"sha256:aa"},)"
        R"("reading":"sha256:bb","causes":["wet","dry"],"findings":[{"id":"rain","states":4},)"
        R"({"id":"wind","states":5},{"id":"cloud","states":100}],"by":["ward"],"over":"month","least_cell":1,)"
        R"("lost":{"cells":0,"patients":0},"flow":{"read":9,"weighed":9,"out_of_scope":0,"set_aside":0,)"
        R"("diagnosed":8,"outside":0,"undiagnosed":1},"out_of_scope":[],"cells":3})"
        "\n"
        "[\"0.1Z\",\"caution\",\"wet\",\"north\",\"2025-03\",1]\n"
        "[\"0.1Z\",\"in_scope\",\"wet\",\"north\",\"2025-03\",7]\n"
        "[\"x0..\",\"in_scope\",\"\",\"\",\"\",1]\n");
}

TEST(Tally, DropsSmallCellsAndSaysHowMany) {
    Tally tally(small_head());
    tally.add(code(2, 2, 2), GateStatus::in_scope, "dry", "north", "2025-01", 5);
    tally.add(code(2, 2, 3), GateStatus::in_scope, "dry", "north", "2025-01", 4);
    tally.add(code(2, 2, 4), GateStatus::in_scope, "rare name", "north", "2025-01", 1);
    tally.add(code(2, 2, 4), GateStatus::out_of_scope, "another rare name", "", "", 2);
    tally.add(code(2, 2, 4), GateStatus::out_of_scope, "dry", "", "", 6);
    const Tally fewer = tally.suppressed(5);
    EXPECT_EQ(fewer.flow(), tally.flow());
    EXPECT_EQ(fewer.lost(), (TallyLoss{2, 5}));
    EXPECT_EQ(fewer.cells(), 1U);
    const std::string text = tally_text(fewer);
    EXPECT_EQ(text.find("rare name"), std::string::npos);
    EXPECT_NE(text.find(R"("least_cell":5,"lost":{"cells":2,"patients":5})"), std::string::npos);
    EXPECT_NE(text.find(R"("out_of_scope":[{"final_cause":"dry","patients":6}])"), std::string::npos);
    EXPECT_EQ(tally_text(fewer.suppressed(5)), text);
    // Suppressed parts add up, with their losses.
    Tally twice = fewer;
    twice.merge(fewer);
    EXPECT_EQ(twice.lost(), (TallyLoss{4, 10}));
    EXPECT_EQ(tally_text(read_back(tally_text(twice))), tally_text(twice));
}

TEST(Tally, RefusesToMergeWhatDiffersAndSaysWhat) {
    const auto refusal = [](const std::function<void(TallyHead&)>& change) {
        TallyHead head = small_head();
        change(head);
        Tally tally(small_head());
        try {
            tally.merge(Tally(head));
            return std::string("merged");
        } catch (const TallyError& error) {
            return std::string(error.what());
        }
    };
    const auto has = [](const std::string& text, const char* part) {
        EXPECT_NE(text.find(part), std::string::npos) << text;
    };
    has(refusal([](TallyHead& head) { head.reading_digest = "sha256:cc"; }),
        "other bands, conditions or gate");
    has(refusal([](TallyHead& head) { head.tables_digest = "sha256:cc"; }), "different tables");
    has(refusal([](TallyHead& head) {
            head.by = {"site", "sex"};
        }),
        "different columns (ward and site, sex)");
    has(refusal([](TallyHead& head) { head.by = {}; }), "different columns (ward and none)");
    has(refusal([](TallyHead& head) { head.months = false; }), "keeps the months");
    has(refusal([](TallyHead& head) { head.least_cell = 5; }),
        "below 1 patients were dropped from one and below 5");
    has(refusal([](TallyHead& head) { head.findings[0].states = 5; }), "contradict each other");
    Tally older(small_head());
    TallyHead head = small_head();
    head.versions = {"0.2.0"};
    older.merge(Tally(head));
    EXPECT_EQ(older.head().versions, (std::vector<std::string>{"0.1.0", "0.2.0"}));
}

TEST(Tally, AddsItselfToItself) {
    Tally tally(small_head());
    tally.add(code(2, 2, 2), GateStatus::in_scope, "dry", "north", "2025-01", 5);
    tally.merge(tally);
    EXPECT_EQ(tally.flow().diagnosed, 10U);
}

TEST(Tally, RefusesAColumnOfNames) {
    Tally tally(small_head());
    const auto fill = [&] {
        for (int i = 0; i <= 1000; ++i) {
            tally.add(code(2, 2, 2), GateStatus::in_scope, "dry", "patient " + std::to_string(i), "");
        }
    };
    try {
        fill();
        FAIL() << "1001 strata were taken";
    } catch (const TallyError& error) {
        EXPECT_NE(std::string(error.what()).find("more than 1000 different strata"), std::string::npos);
    }
    EXPECT_THROW(tally.add(code(2, 2, 2), GateStatus::in_scope, std::string(201, 'x')), TallyError);
    EXPECT_THROW(tally.add(code(2, 2, 2), GateStatus::in_scope, "\xff"), TallyError);
    EXPECT_THROW(tally.add(code(2, 2, 2), GateStatus::in_scope, "dry", "", "", Tally::most_patients),
                 TallyError);
}

TEST(Tally, TakesOnlyWhatItsHeadAllows) {
    Tally tally(small_head());
    EXPECT_THROW(tally.add(code(4, 2, 2), GateStatus::in_scope, "dry"), std::invalid_argument);
    EXPECT_THROW(tally.add("xx", GateStatus::in_scope, "dry"), std::invalid_argument);
    EXPECT_THROW(tally.add(code(2, 2, 2), GateStatus::in_scope, "dry", "", "2025-13"), std::invalid_argument);
    EXPECT_THROW(tally.add(code(2, 2, 2), GateStatus::in_scope, "dry", "", "2025-01-07"),
                 std::invalid_argument);
    TallyHead head = small_head();
    head.by = {};
    head.months = false;
    Tally plain(head);
    EXPECT_THROW(plain.add(code(2, 2, 2), GateStatus::in_scope, "dry", "north"), std::invalid_argument);
    EXPECT_THROW(plain.add(code(2, 2, 2), GateStatus::in_scope, "dry", "", "2025-01"), std::invalid_argument);
}

TEST(Tally, HoldsNothingOfACaseButItsBands) {
    // The head of the shipped tables, a case's code: no text of the case can enter.
    const likelihoods::TableSet tables = likelihoods::open_table_set("adult");
    Tally tally(tally_head(tables, {}, false));
    tally.add(likelihoods::PatternCode(tables.tables.size(), '\0'), GateStatus::in_scope, "classic_distal");
    const std::string text = tally_text(tally);
    const std::string line = text.substr(text.find('\n') + 1);
    EXPECT_EQ(line, "[\"" + std::string(tables.tables.size(), '.') +
                        "\",\"in_scope\",\"classic_distal\",\"\",\"\",1]\n");
    EXPECT_EQ(tally_text(read_back(text)), text);
}

TEST(TallyFile, IsRefusedAtThePlaceOfEachFault) {
    Tally tally(small_head());
    tally.add(code(2, 0, 99), GateStatus::in_scope, "wet", "north", "2025-03", 7);
    tally.add(code(2, 3, 99), GateStatus::caution, "dry", "", "2025-03", 2);
    tally.add(code(2, 3, 99), GateStatus::out_of_scope, "dry", "", "", 3);
    const std::string good = tally_text(tally);
    ASSERT_EQ(faults_in(good), "");
    const auto spoiled = [&](const std::string& from, const std::string& to) {
        std::string text = good;
        const std::size_t at = text.find(from);
        EXPECT_NE(at, std::string::npos) << from;
        return faults_in(text.replace(at, from.size(), to));
    };
    const auto at_in_head = [&](const std::string& part) {
        return "1:" + std::to_string(good.find(part) + 1) + ' ';
    };
    const std::string at_flow = at_in_head("{\"read\"");
    const std::string at_cells = "1:" + std::to_string(good.find("\"cells\":2}") + 9) + ' ';
    EXPECT_EQ(faults_in(""), "1:1 empty-document");
    EXPECT_EQ(faults_in(good.substr(0, 40)), "1:1 bad-tally");
    EXPECT_EQ(faults_in(good.substr(0, good.size() - 4)), "3:37 bad-tally");             // cut off
    EXPECT_EQ(faults_in(good.substr(0, good.find("[\"011Z"))), at_cells + "bad-tally");  // a line lost
    EXPECT_EQ(spoiled("tally/1", "tally/2"), "1:11 bad-format");
    EXPECT_EQ(spoiled("\"over\"", "\"patient\":\"A\",\"over\""), at_in_head("\"over\"") + "unknown-key");
    EXPECT_EQ(spoiled("\"least_cell\":1,", ""), "1:1 missing-key");
    EXPECT_EQ(spoiled("\"read\":12", "\"read\":13"), at_flow + "bad-tally");
    EXPECT_EQ(spoiled("\"read\":12", "\"read\":12.5"), "1:327 not-a-number");
    EXPECT_EQ(spoiled("\"patients\":3", "\"patients\":4"), at_in_head("[{\"final_cause") + "bad-tally");
    EXPECT_EQ(spoiled("\"cells\":2}", "\"cells\":3}"), at_cells + "bad-tally");
    EXPECT_EQ(spoiled(",7]", ",0]"), "2:44 out-of-range");
    EXPECT_EQ(spoiled(",7]", ",-7]"), "2:44 out-of-range");
    EXPECT_EQ(spoiled(",7]", ",7.5]"), "2:45 bad-tally");
    EXPECT_EQ(spoiled(",7]", ",8]"), at_flow + "bad-tally");
    EXPECT_EQ(spoiled("[\"0.1Z\"", "[ \"0.1Z\""), "2:2 bad-tally");
    EXPECT_EQ(spoiled("\"0.1Z\"", "\"9.1Z\""), "2:2 bad-tally");
    EXPECT_EQ(spoiled("in_scope\",\"wet", "out\",\"wet"), "2:9 bad-choice");
    EXPECT_EQ(spoiled("\"north\"", "\"nor\\u0074h\""), "2:26 bad-tally");
    EXPECT_EQ(spoiled("\"2025-03\",7", "\"2025-3\",7"), "2:26 bad-tally");
    EXPECT_EQ(spoiled("[\"011Z\"", "[\"0.1Z\""), "3:1 bad-tally");  // out of order
    const std::string second = good.substr(good.find("[\"0.1Z"), good.find("[\"011Z") - good.find("[\"0.1Z"));
    EXPECT_EQ(spoiled(second, second + second), "3:1 bad-tally");
    EXPECT_EQ(spoiled("\"least_cell\":1", "\"least_cell\":5"), "1:464 out-of-range");
}

TEST(TallyFile, IsWrittenWholeOrNotAtAll) {
    const WorkDir dir;
    const Tally tally = Tally(small_head());
    save_tally(tally, dir.file("a.tally"));
    EXPECT_EQ(text_of(dir.file("a.tally")), tally_text(tally));
    EXPECT_TRUE(looks_like_tally(text_of(dir.file("a.tally"))));
    document::Diagnostics faults;
    EXPECT_TRUE(load_tally(dir.file("a.tally"), faults).has_value());
    EXPECT_FALSE(load_tally(dir.file("none.tally"), faults).has_value());
    EXPECT_EQ(std::distance(std::filesystem::directory_iterator(dir.path()), {}), 1);
}

}  // namespace
}  // namespace steelyard::cli
