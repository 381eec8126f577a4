// SPDX-License-Identifier: Apache-2.0
// The life of a case in a casebook: recorded, listed, its final cause entered, amended, exported.
#include "steelyard/cli/casebook.hpp"

#include <gtest/gtest.h>

#include <charconv>
#include <nlohmann/json.hpp>
#include <sstream>

#include "casebook_book.hpp"
#include "salted_id.hpp"
#include "steelyard/cli/terminal.hpp"
#include "utc_time.hpp"

namespace steelyard::test {
namespace {

using cli::CasebookEntry;
using Json = nlohmann::json;

std::vector<std::string> lines_of(const std::string& text) {
    std::vector<std::string> lines;
    std::istringstream in(text);
    for (std::string line; std::getline(in, line);) {
        lines.push_back(line);
    }
    return lines;
}

/// Fields of a line without quotes.
std::vector<std::string> fields_of(const std::string& line) {
    std::vector<std::string> fields;
    std::size_t at = 0;
    while (true) {
        const std::size_t end = line.find(',', at);
        fields.push_back(line.substr(at, end - at));
        if (end == std::string::npos) {
            return fields;
        }
        at = end + 1;
    }
}

TEST(Casebook, KeepsTheWholeLifeOfACase) {
    const Book book;
    const Outcome recorded = book.record(case_text("larkmoor-101"));
    ASSERT_EQ(recorded.code, 0) << recorded.err;
    EXPECT_EQ(recorded.err, "");
    EXPECT_NE(in_one_line(recorded.out).find("with 1 case. It holds 1 case, 1 without a final cause."),
              std::string::npos)
        << recorded.out;
    EXPECT_NE(recorded.out.find("Caution: "), std::string::npos);

    const Outcome open = book.list();
    EXPECT_EQ(open.code, 0) << open.err;
    EXPECT_NE(open.out.find("larkmoor-101"), std::string::npos) << open.out;
    EXPECT_NE(in_one_line(open.out).find("classic_distal led with"), std::string::npos) << open.out;
    EXPECT_NE(open.out.find("no final cause yet"), std::string::npos);
    EXPECT_NE(open.out.find("Caution: "), std::string::npos);

    const Outcome entered = book.outcome({"larkmoor-101", "classic_distal"});
    EXPECT_EQ(entered.code, 0) << entered.err;
    EXPECT_NE(in_one_line(entered.out).find("It holds 1 case, 0 without a final cause."), std::string::npos);

    EXPECT_NE(book.list().out.find("No case to show."), std::string::npos);
    EXPECT_NE(in_one_line(book.list({"--all"}).out).find("final cause classic_distal"), std::string::npos);
    EXPECT_NE(in_one_line(book.list({"larkmoor-101"}).out).find("final cause classic_distal"),
              std::string::npos);

    const auto entries = cli::read_casebook(book.path());
    ASSERT_EQ(entries.size(), 1U);
    EXPECT_EQ(entries[0].case_id, "larkmoor-101");
    ASSERT_NE(entries[0].outcome(), nullptr);
    EXPECT_EQ(entries[0].outcome()->final_cause, "classic_distal");
    EXPECT_FALSE(entries[0].outcome()->outside);
}

TEST(Casebook, KeepsPriorsAndPosteriorsAsGivenToTheLastBit) {
    const Book book;
    const std::string text = case_text("larkmoor-102");
    const Json report = Json::parse(run({"weigh", "-", "--as", "json", "--draws", "1000"}, text).out)[0];
    ASSERT_EQ(book.record(text).code, 0);
    const auto entries = cli::read_casebook(book.path());
    ASSERT_EQ(entries.size(), 1U);
    ASSERT_EQ(entries[0].causes.size(), report["causes"].size());
    for (std::size_t k = 0; k < entries[0].causes.size(); ++k) {
        EXPECT_EQ(entries[0].causes[k].cause, report["causes"][k]["id"]);
        EXPECT_EQ(entries[0].causes[k].prior, report["causes"][k]["prior"].get<double>());
        EXPECT_EQ(entries[0].causes[k].posterior, report["causes"][k]["posterior"].get<double>());
    }
    EXPECT_EQ(entries[0].tables_digest, report["provenance"]["tables"]["digest"]);
    EXPECT_EQ(entries[0].tables_title, report["provenance"]["tables"]["title"]);
    EXPECT_EQ(entries[0].priors_digest, report["provenance"]["priors"]["digest"]);
    EXPECT_EQ(entries[0].priors_title, report["provenance"]["priors"]["title"]);
    EXPECT_EQ(entries[0].version, STEELYARD_VERSION);
    EXPECT_EQ(entries[0].reading_digest.rfind("sha256:", 0), 0U);
    EXPECT_EQ(entries[0].gate, report["gate"]["status"]);
    // Every number of the exports reads back to the same double.
    const auto csv = lines_of(book.exported().out);
    ASSERT_EQ(csv.size(), 2U);
    const auto header = fields_of(csv[0]);
    const auto fields = fields_of(csv[1]);
    ASSERT_EQ(header.size(), fields.size());
    std::size_t found = 0;
    for (std::size_t i = 0; i < header.size(); ++i) {
        for (const cli::CauseAtTheTime& cause : entries[0].causes) {
            const bool posterior = header[i] == "posterior_" + cause.cause;
            if (posterior || header[i] == "prior_" + cause.cause) {
                double value = 0.0;
                std::from_chars(fields[i].data(), fields[i].data() + fields[i].size(), value);
                EXPECT_EQ(value, posterior ? cause.posterior : cause.prior);
                ++found;
            }
        }
        if (header[i] == "pattern") {
            EXPECT_EQ(fields[i], entries[0].pattern);
            EXPECT_EQ(fields[i].substr(0, 2), "12");  // potassium 2.9 and bicarbonate 14 in their bands
        }
    }
    EXPECT_EQ(found, 2 * entries[0].causes.size());
    const Json line = Json::parse(book.exported({"--as", "ndjson"}).out);
    for (std::size_t k = 0; k < entries[0].causes.size(); ++k) {
        EXPECT_EQ(line["causes"][k]["posterior"].get<double>(), entries[0].causes[k].posterior);
    }
    EXPECT_FALSE(line["caution"].get<std::string>().empty());
}

TEST(Casebook, KeepsNoValueNoNameAndNoPath) {
    const Book book;
    const std::string priors = book.dir().write("secret-folder/ours.yaml",
                                                run({"priors", "show", "even", "--as", "json"}).out.empty()
                                                    ? ""
                                                    : text_of(STEELYARD_SOURCE_DIR "/priors/sets/even.yaml"));
    ASSERT_EQ(
        book.record("sex: female\nage: 47.25 a\n" + case_text("larkmoor-103"), {"--priors", priors}).code, 0);
    const std::string bytes = text_of(book.path());
    EXPECT_EQ(bytes.find("secret-folder"), std::string::npos);
    EXPECT_EQ(bytes.find("female"), std::string::npos);
    EXPECT_EQ(bytes.find("47.25"), std::string::npos);
    EXPECT_NE(bytes.find("larkmoor-103"), std::string::npos);
}

TEST(Casebook, AnAmendmentKeepsTheOldFinalCauseAndTheReason) {
    const Book book;
    ASSERT_EQ(book.record(case_text("larkmoor-104")).code, 0);
    ASSERT_EQ(book.outcome({"larkmoor-104", "classic_distal"}).code, 0);
    const Outcome again = book.outcome({"larkmoor-104", "extrarenal"});
    EXPECT_EQ(again.code, 2);
    EXPECT_NE(in_one_line(again.err).find("has the final cause classic_distal already"), std::string::npos)
        << again.err;
    ASSERT_EQ(book.outcome({"larkmoor-104", "extrarenal", "--amend", "--why", "ileostomy found"}).code, 0);
    ASSERT_EQ(book.outcome({"larkmoor-104", "proximal", "--amend", "--why", "and a tubular leak"}).code, 0);

    const auto entries = cli::read_casebook(book.path());
    ASSERT_EQ(entries[0].outcomes.size(), 3U);
    EXPECT_EQ(entries[0].outcomes[0].final_cause, "classic_distal");
    EXPECT_EQ(entries[0].outcomes[0].why, "");
    EXPECT_EQ(entries[0].outcomes[1].final_cause, "extrarenal");
    EXPECT_EQ(entries[0].outcomes[1].why, "ileostomy found");
    EXPECT_EQ(entries[0].outcome()->final_cause, "proximal");
    EXPECT_NE(
        in_one_line(book.list({"--all"}).out).find("amended from extrarenal because: and a tubular leak"),
        std::string::npos);
    const Json line = Json::parse(book.exported({"--as", "ndjson"}).out);
    EXPECT_EQ(line["outcomes"].size(), 3U);
    EXPECT_EQ(line["final_cause"], "proximal");
}

TEST(Casebook, EnteringTheSameFinalCauseTwiceChangesNothing) {
    const Book book;
    ASSERT_EQ(book.record(case_text("larkmoor-105")).code, 0);
    ASSERT_EQ(book.outcome({"larkmoor-105", "proximal"}).code, 0);
    const Outcome twice = book.outcome({"larkmoor-105", "proximal"});
    EXPECT_EQ(twice.code, 0);
    EXPECT_NE(in_one_line(twice.out).find("1 was there already"), std::string::npos) << twice.out;
    EXPECT_EQ(cli::read_casebook(book.path())[0].outcomes.size(), 1U);
}

TEST(Casebook, TakesACauseOutsideTheTablesOnlyWhenItIsMeant) {
    const Book book;
    ASSERT_EQ(book.record(case_text("larkmoor-106")).code, 0);
    const Outcome slip = book.outcome({"larkmoor-106", "clasic_distal"});
    EXPECT_EQ(slip.code, 2);
    EXPECT_NE(in_one_line(slip.err).find("did you mean classic_distal?"), std::string::npos) << slip.err;
    EXPECT_EQ(book.outcome({"larkmoor-106", "toluene"}).code, 2);
    EXPECT_EQ(cli::read_casebook(book.path())[0].outcome(), nullptr);
    ASSERT_EQ(book.outcome({"larkmoor-106", "toluene", "--outside"}).code, 0);
    EXPECT_TRUE(cli::read_casebook(book.path())[0].outcome()->outside);
    // A cause of the tables that this prior set leaves out is none outside.
    ASSERT_EQ(book.record(case_text("larkmoor-107"), {"--exclude", "extrarenal"}).code, 0);
    ASSERT_EQ(book.outcome({"larkmoor-107", "extrarenal"}).code, 0);
    EXPECT_FALSE(cli::read_casebook(book.path())[1].outcome()->outside);
}

TEST(Casebook, RecordsACaseOutOfScopeAsSuchWithoutAPosterior) {
    const Book book;
    const Outcome alone = book.record(case_out_of_scope("larkmoor-108"));
    EXPECT_EQ(alone.code, 4);
    const auto entries = cli::read_casebook(book.path());
    ASSERT_EQ(entries.size(), 1U);
    EXPECT_EQ(entries[0].gate, "out_of_scope");
    EXPECT_TRUE(entries[0].causes.empty());
    EXPECT_EQ(entries[0].leader(), nullptr);
    EXPECT_NE(book.list().out.find("not weighed, out of scope"), std::string::npos);
    ASSERT_EQ(book.outcome({"larkmoor-108", "extrarenal"}).code, 0)
        << "its final cause may be known all the same";
    ASSERT_EQ(book.record(case_out_of_scope("larkmoor-109"), {"--weigh-anyway"}).code, 0);
    EXPECT_FALSE(cli::read_casebook(book.path())[1].causes.empty());
    EXPECT_EQ(cli::read_casebook(book.path())[1].gate, "out_of_scope");
}

TEST(Casebook, TheFirstRecordingBeforeTheFinalCauseStandsForTheCase) {
    const Book book;
    ASSERT_EQ(book.record(case_text("larkmoor-110")).code, 0);
    EXPECT_EQ(book.record(case_text("larkmoor-110")).code, 3) << "twice without --again";
    ASSERT_EQ(book.record(case_text("larkmoor-110"), {"--again", "--priors", "even"}).code, 0);
    auto entries = cli::read_casebook(book.path());
    ASSERT_EQ(entries.size(), 1U);
    EXPECT_EQ(entries[0].priors_title, cli::read_recordings(book.path())[0].priors_title);
    EXPECT_EQ(entries[0].of, 2U);
    EXPECT_EQ(cli::read_recordings(book.path()).size(), 2U);
    EXPECT_EQ(lines_of(book.exported().out).size(), 2U);
    EXPECT_EQ(lines_of(book.exported({"--all-recordings"}).out).size(), 3U);

    // Out of scope first, weighed before the final cause, weighed again after it: the middle one stands.
    ASSERT_EQ(book.record(case_out_of_scope("larkmoor-111")).code, 4);
    ASSERT_EQ(book.record(case_text("larkmoor-111"), {"--again"}).code, 0);
    ASSERT_EQ(book.outcome({"larkmoor-111", "classic_distal"}).code, 0);
    const Outcome late = book.record(case_text("larkmoor-111"), {"--again", "--priors", "even"});
    EXPECT_EQ(late.code, 0);
    EXPECT_NE(late.err.find("has its final cause already"), std::string::npos) << late.err;
    entries = cli::read_casebook(book.path());
    ASSERT_EQ(entries.size(), 2U);
    EXPECT_EQ(entries[1].place, 2U);
    EXPECT_FALSE(entries[1].causes.empty());

    // Weighed only after the final cause was known: the first recording stands, without a posterior.
    ASSERT_EQ(book.record(case_out_of_scope("larkmoor-112")).code, 4);
    ASSERT_EQ(book.outcome({"larkmoor-112", "classic_distal"}).code, 0);
    ASSERT_EQ(book.record(case_text("larkmoor-112"), {"--again"}).code, 0);
    entries = cli::read_casebook(book.path());
    ASSERT_EQ(entries.size(), 3U);
    EXPECT_EQ(entries[2].place, 1U);
    EXPECT_TRUE(entries[2].causes.empty());
}

TEST(Casebook, DoesNotTakeOverAFinalCauseOfTheCaseFile) {
    const Book book;
    const Outcome outcome = book.record(case_text("larkmoor-113") + "final_cause: proximal\n");
    EXPECT_EQ(outcome.code, 0);
    EXPECT_NE(in_one_line(outcome.err).find("was not taken over"), std::string::npos) << outcome.err;
    EXPECT_EQ(cli::read_casebook(book.path())[0].outcome(), nullptr);
}

TEST(Casebook, HashedIdsAreFoundByThePlainOne) {
    const Book book;
    ASSERT_EQ(book.record(case_text("larkmoor-114"), {"--salted"}).code, 0);
    EXPECT_EQ(text_of(book.path()).find("larkmoor-114"), std::string::npos);
    EXPECT_EQ(book.exported().out.find("larkmoor-114"), std::string::npos);
    EXPECT_EQ(book.record(case_text("larkmoor-114")).code, 3) << "known by its hash";
    ASSERT_EQ(book.outcome({"larkmoor-114", "proximal"}).code, 0);
    EXPECT_NE(in_one_line(book.list({"larkmoor-114"}).out).find("final cause proximal"), std::string::npos);
    EXPECT_EQ(book.list({"larkmoor-115"}).code, 2);
    const auto entries = cli::read_casebook(book.path());
    ASSERT_EQ(entries.size(), 1U);
    EXPECT_EQ(entries[0].case_id.size(), 71U);
    const std::string salt = sql_text(book.path(), "SELECT hex(salt) FROM casebook");
    EXPECT_EQ(salt.size(), 2 * cli::salt_bytes);
    const Book other;
    ASSERT_EQ(other.record(case_text("larkmoor-114"), {"--salted"}).code, 0);
    EXPECT_NE(cli::read_casebook(other.path())[0].case_id, entries[0].case_id)
        << "each casebook has its own salt";
}

TEST(Casebook, ASaltKeptApartIsNotInTheBook) {
    const Book book;
    const std::string salt_file = book.dir().file("salt");
    ASSERT_EQ(book.record(case_text("larkmoor-116"), {"--salt-file", salt_file}).code, 0);
    const std::string salt = text_of(salt_file);
    ASSERT_EQ(salt.size(), cli::salt_bytes);
    EXPECT_EQ(std::filesystem::status(salt_file).permissions(),
              std::filesystem::perms::owner_read | std::filesystem::perms::owner_write);
    EXPECT_EQ(text_of(book.path()).find(salt), std::string::npos);
    EXPECT_EQ(cli::read_casebook(book.path())[0].case_id, cli::salted(salt, "larkmoor-116"));
    EXPECT_EQ(book.outcome({"larkmoor-116", "proximal"}).code, 2) << "without its salt";
    EXPECT_EQ(book.outcome({"larkmoor-116", "proximal", "--salt-file", salt_file}).code, 0);
    book.dir().write("other", std::string(cli::salt_bytes, 'x'));
    EXPECT_EQ(book.outcome({"larkmoor-116", "proximal", "--salt-file", book.dir().file("other")}).code, 3);
    book.dir().write("short", "x");
    EXPECT_EQ(book.outcome({"larkmoor-116", "proximal", "--salt-file", book.dir().file("short")}).code, 3);
}

// FIPS 180-4's own example, "abc", with the salt empty and with it split off.
TEST(SaltedId, IsTheSha256OfSaltAndId) {
    const std::string abc = "sha256:ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad";
    EXPECT_EQ(cli::salted("", "abc"), abc);
    EXPECT_EQ(cli::salted("a", "bc"), abc);
    EXPECT_NE(cli::new_salt(), cli::new_salt());
}

TEST(Casebook, FinalCausesFromAFileAreEnteredAllOrNone) {
    const Book book;
    const std::string acidosis =
        ", serum: {bicarbonate: 14 mmol/L, sodium: 140 mmol/L, chloride: 116 mmol/L}}\n";
    ASSERT_EQ(
        book.record("- {case: l-1" + acidosis + "- {case: 'l,2'" + acidosis + "- {case: l-3" + acidosis).code,
        0);
    const Outcome bad =
        book.outcomes("case,final_cause\nl-1,proximal\nl-4,proximal\n\"l,2\",proxmal\nl-3,\n");
    EXPECT_EQ(bad.code, 3);
    EXPECT_NE(bad.err.find("o.csv:3:1: error[bad-choice]"), std::string::npos) << bad.err;
    EXPECT_NE(bad.err.find("o.csv:4:7: error[unknown-cause]"), std::string::npos) << bad.err;
    EXPECT_NE(bad.err.find("o.csv:5:5: error[empty-value]"), std::string::npos) << bad.err;
    for (const CasebookEntry& entry : cli::read_casebook(book.path())) {
        EXPECT_EQ(entry.outcome(), nullptr) << entry.case_id;
    }
    EXPECT_EQ(book.outcomes("case,final_cause\nl-1,proximel\n", {"--outside"}).code, 3)
        << "a near miss in a file is never meant";
    const Outcome good = book.outcomes(
        "\xEF\xBB\xBF"
        "final_cause,case\r\nproximal,l-1\r\n\r\nextrarenal,\"l,2\"\r\ntoluene,l-3",
        {"--outside"});
    EXPECT_EQ(good.code, 0) << good.err;
    EXPECT_NE(in_one_line(good.out).find("Entered 3 final causes"), std::string::npos) << good.out;
    EXPECT_EQ(book.outcomes("case,final_cause\nl-1,proximal\nl-3,toluene\n").code, 3)
        << "an outside cause is asked for again";
    EXPECT_EQ(book.outcomes("case,final_cause\nl-1,proximal\n").code, 0);
}

TEST(Casebook, ListsAsCsvAndJson) {
    const Book book;
    ASSERT_EQ(book.record(case_text("=larkmoor-117")).code, 0);
    const auto csv = lines_of(book.list({"--as", "csv"}).out);
    ASSERT_EQ(csv.size(), 2U);
    EXPECT_EQ(fields_of(csv[0]).size(), fields_of(csv[1]).size());
    EXPECT_EQ(fields_of(csv[1])[0], "'=larkmoor-117") << "no formula for a spreadsheet";
    EXPECT_EQ(fields_of(csv[1])[2], "0");
    EXPECT_EQ(fields_of(csv[1])[4], "classic_distal");
    const std::string file = book.dir().file("list.json");
    ASSERT_EQ(book.list({"--as", "json", "--out", file}).code, 0);
    const Json json = Json::parse(text_of(file));
    EXPECT_EQ(json["cases"][0]["case"], "=larkmoor-117");
    EXPECT_EQ(json["cases"][0]["final_cause"], nullptr);
    EXPECT_FALSE(json["caution"].get<std::string>().empty());
}

TEST(Casebook, TextIsHarmlessAndFitsEightyColumns) {
    const Book book;
    ASSERT_EQ(
        book.record(
                "case: \"larkmoor\u202e-118 of a very long name that goes on and on beyond the column that "
                "holds it\"\n" +
                case_text("x").substr(8))
            .code,
        0);
    const std::string text = book.list().out;
    EXPECT_NE(text.find("\\u202e"), std::string::npos) << text;
    for (const std::string& line : lines_of(text)) {
        EXPECT_LE(cli::text_width(line), cli::page_width) << line;
    }
}

TEST(Casebook, IsMarkedAndOnlyAddedTo) {
    const Book book;
    ASSERT_EQ(book.record(case_text("larkmoor-119")).code, 0);
    ASSERT_EQ(book.outcome({"larkmoor-119", "proximal"}).code, 0);
    EXPECT_EQ(sql_text(book.path(), "PRAGMA application_id"), std::to_string(0x53744362));
    EXPECT_EQ(sql_text(book.path(), "PRAGMA user_version"), "1");
    EXPECT_EQ(sql_text(book.path(), "PRAGMA journal_mode"), "wal");
    for (const char* table : {"casebook", "source", "recording", "probability", "outcome"}) {
        EXPECT_FALSE(sql(book.path(), std::string("DELETE FROM ") + table)) << table;
    }
    EXPECT_FALSE(sql(book.path(), "UPDATE outcome SET final_cause = 'extrarenal'"));
    EXPECT_FALSE(sql(book.path(), "UPDATE probability SET posterior = 1"));
    EXPECT_FALSE(
        sql(book.path(),
            "INSERT INTO outcome VALUES(NULL, 'larkmoor-119', 'now', 'extrarenal', 0, NULL, NULL, 1)"))
        << "a second first final cause";
}

TEST(DaysBetween, CountsWholeDays) {
    EXPECT_EQ(cli::days_between("2026-12-01T10:00:00Z", "2026-12-02T09:59:59Z"), 0);
    EXPECT_EQ(cli::days_between("2026-12-01T10:00:00Z", "2026-12-02T10:00:00Z"), 1);
    EXPECT_EQ(cli::days_between("2024-02-28T00:00:00Z", "2024-03-01T00:00:00Z"), 2);
    EXPECT_EQ(cli::days_between("2026-12-02T10:00:00Z", "2026-12-01T10:00:00Z"), -1);
    EXPECT_EQ(cli::days_between("2026-13-02T10:00:00Z", "2026-12-01T10:00:00Z"), std::nullopt);
    EXPECT_EQ(cli::days_between("yesterday", "2026-12-01T10:00:00Z"), std::nullopt);
    EXPECT_EQ(cli::days_between(cli::utc_now(), cli::utc_now()), 0);
}

}  // namespace
}  // namespace steelyard::test
