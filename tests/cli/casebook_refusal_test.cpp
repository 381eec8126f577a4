// SPDX-License-Identifier: Apache-2.0
// What is no casebook is refused and left as it is; every refusal says why, with the right exit code.
#include <gtest/gtest.h>
#include <sys/stat.h>

#include <algorithm>
#include <functional>

#include "casebook_book.hpp"
#include "outcome_lines.hpp"
#include "steelyard/cli/casebook.hpp"

namespace steelyard::test {
namespace {

/// Every command against this file.
std::vector<std::vector<std::string>> all_commands_on(const std::string& path) {
    static const WorkDir cases;
    static const std::string one = cases.write("case.yaml", case_text("larkmoor-201"));
    return {{"casebook", "record", one, "--casebook", path},
            {"casebook", "outcome", "larkmoor-201", "proximal", "--casebook", path},
            {"casebook", "list", "--casebook", path},
            {"casebook", "export", "--casebook", path}};
}

void expect_refused_untouched(const std::string& path, const std::string& words) {
    const std::string before = text_of(path);
    for (const auto& command : all_commands_on(path)) {
        const Outcome outcome = run_here(command);
        EXPECT_EQ(outcome.code, 3) << command[1] << outcome.err;
        EXPECT_EQ(outcome.out, "") << command[1];
        EXPECT_NE(in_one_line(outcome.err).find(words), std::string::npos)
            << command[1] << ": " << outcome.err;
    }
    EXPECT_EQ(text_of(path), before);
}

TEST(NoCasebook, AnotherKindOfFileIsRefusedUntouched) {
    const WorkDir dir(quick_folder());
    expect_refused_untouched(dir.write("notes.txt", "not a casebook\n" + std::string(200, 'x')),
                             "no casebook");
    expect_refused_untouched(dir.write("short.txt", "x"), "no casebook");
}

TEST(NoCasebook, AnotherSqliteFileIsRefusedUntouched) {
    const WorkDir dir(quick_folder());
    const std::string path = dir.file("other.db");
    ASSERT_TRUE(sql(path, "CREATE TABLE patients(name); INSERT INTO patients VALUES('x')"));
    expect_refused_untouched(path, "no casebook");
    EXPECT_EQ(std::distance(std::filesystem::directory_iterator(dir.path()), {}), 1)
        << "nothing beside it either";
}

TEST(NoCasebook, ANewerFormIsRefusedUntouched) {
    const Book book;
    ASSERT_EQ(book.record(case_text("larkmoor-202")).code, 0);
    ASSERT_TRUE(sql(book.path(), "PRAGMA user_version = 2"));
    expect_refused_untouched(book.path(), "form 2");
}

TEST(NoCasebook, AMarkedFileWithOtherTablesIsRefused) {
    const Book book;
    ASSERT_EQ(book.record(case_text("larkmoor-203")).code, 0);
    ASSERT_TRUE(sql(book.path(), "DROP TRIGGER outcome_stays"));
    for (const auto& command : all_commands_on(book.path())) {
        const Outcome outcome = run_here(command);
        EXPECT_EQ(outcome.code, 3) << outcome.err;
        EXPECT_NE(outcome.err.find("outcome_stays"), std::string::npos) << outcome.err;
    }
    const Book meddled;
    ASSERT_EQ(meddled.record(case_text("larkmoor-203")).code, 0);
    ASSERT_TRUE(sql(meddled.path(),
                    "CREATE TRIGGER more AFTER INSERT ON outcome BEGIN INSERT INTO casebook VALUES('x', "
                    "NULL, NULL); END"));
    EXPECT_EQ(meddled.outcome({"larkmoor-203", "proximal"}).code, 3);
}

TEST(NoCasebook, ATruncatedFileIsRefused) {
    const Book book;
    ASSERT_EQ(book.record(case_text("larkmoor-204")).code, 0);
    const std::string whole = text_of(book.path());
    for (const std::size_t size :
         {std::size_t{50}, std::size_t{512}, std::size_t{4096}, whole.size() - 4096, whole.size() - 1}) {
        const WorkDir dir(quick_folder());
        const std::string path = dir.write("cut.casebook", whole.substr(0, size));
        for (const auto& command : all_commands_on(path)) {
            const Outcome outcome = run_here(command);
            EXPECT_EQ(outcome.code, 3) << command[1] << " at " << size << ": " << outcome.out << outcome.err;
        }
    }
}

TEST(NoCasebook, ADamagedFileIsRefusedByWhoReadsIt) {
    const Book book;
    ASSERT_EQ(book.record(case_text("larkmoor-205")).code, 0);
    std::string bytes = text_of(book.path());
    for (std::size_t at = 4096; at < bytes.size(); at += 7) {
        bytes[at] = '\x5A';
    }
    book.dir().write("ward.casebook", bytes);
    EXPECT_EQ(book.list().code, 3);
    EXPECT_EQ(book.exported().code, 3);
    EXPECT_EQ(book.outcome({"larkmoor-205", "proximal"}).code, 3);
}

TEST(NoCasebook, AnImpossibleProbabilityIsRefused) {
    const Book book;
    ASSERT_EQ(book.record(case_text("larkmoor-206")).code, 0);
    const std::string trigger =
        sql_text(book.path(), "SELECT sql FROM sqlite_master WHERE name = 'probability_stays'");
    ASSERT_TRUE(sql(book.path(),
                    "DROP TRIGGER probability_stays; UPDATE probability SET posterior = 1.5; " + trigger));
    const Outcome outcome = book.list();
    EXPECT_EQ(outcome.code, 3);
    EXPECT_NE(outcome.err.find("1.5"), std::string::npos) << outcome.err;
}

TEST(NoCasebook, AMissingOrEmptyFileIsStartedByRecordAlone) {
    const Book book;
    EXPECT_EQ(book.list().code, 3);
    EXPECT_EQ(book.exported().code, 3);
    EXPECT_EQ(book.outcome({"larkmoor-207", "proximal"}).code, 3);
    EXPECT_FALSE(std::filesystem::exists(book.path()));
    book.dir().write("ward.casebook", "");
    EXPECT_EQ(book.list().code, 3);
    EXPECT_EQ(book.record(case_text("larkmoor-207")).code, 0);
    EXPECT_EQ(book.list().code, 0);
}

TEST(NoCasebook, APlaceThatCannotBeWrittenIsTheCommandLinesFault) {
    const WorkDir dir(quick_folder());
    for (const std::string& path : {std::string("/nowhere/at/all.casebook"), std::string("/proc/x.casebook"),
                                    dir.path().string(), std::string("/dev/null")}) {
        const Outcome outcome = run_here(all_commands_on(path).front());
        EXPECT_EQ(outcome.code, 2) << path << outcome.err;
        EXPECT_EQ(outcome.out, "");
        EXPECT_NE(outcome.err.find("cannot write"), std::string::npos) << outcome.err;
    }
    EXPECT_EQ(run_here({"casebook", "list", "--casebook", dir.path().string()}).code, 3);
    EXPECT_EQ(run_here({"casebook", "list", "--casebook", ""}).code, 2);
}

TEST(NoCasebook, AFaultyCaseStartsNothing) {
    const Book book;
    EXPECT_EQ(book.record("case: larkmoor-209\nserum: {potassium: 2.9}\n").code, 3);
    EXPECT_FALSE(std::filesystem::exists(book.path()));
}

TEST(LockedCasebook, IsWaitedForAndThenSaidToBeLocked) {
    const Book book;
    ASSERT_EQ(book.record(case_text("larkmoor-210")).code, 0);
    sqlite3* other = nullptr;
    ASSERT_EQ(sqlite3_open(book.path().c_str(), &other), SQLITE_OK);
    ASSERT_EQ(sqlite3_exec(other, "BEGIN IMMEDIATE", nullptr, nullptr, nullptr), SQLITE_OK);
    const Outcome outcome = book.outcome({"larkmoor-210", "proximal", "--wait", "0"});
    EXPECT_EQ(outcome.code, 2);
    EXPECT_NE(in_one_line(outcome.err).find("locked for 0 s"), std::string::npos) << outcome.err;
    EXPECT_EQ(book.list({"--wait", "0"}).code, 0) << "readers do not wait for a writer";
    sqlite3_close(other);
    EXPECT_EQ(book.outcome({"larkmoor-210", "proximal", "--wait", "0"}).code, 0);
}

/// Runs `action` in a process of a user who owns nothing here, where this process may become one.
int as_nobody(const std::function<int()>& action) {
    const pid_t child = fork();
    if (child == 0) {
        constexpr uid_t nobody = 65534;
        if (geteuid() == 0 && (setgid(nobody) != 0 || setuid(nobody) != 0)) {
            _exit(99);
        }
        _exit(action());
    }
    int status = 0;
    waitpid(child, &status, 0);
    return WIFEXITED(status) ? WEXITSTATUS(status) : 128 + WTERMSIG(status);
}

TEST(ReadOnlyFolder, CanBeReadFromAndNotBeWrittenTo) {
    const Book book;
    ASSERT_EQ(book.record(case_text("larkmoor-211")).code, 0);
    ASSERT_EQ(chmod(book.path().c_str(), 0444), 0);
    ASSERT_EQ(chmod(book.dir().path().c_str(), 0555), 0);
    const std::string before = text_of(book.path());
    EXPECT_EQ(as_nobody([&] { return static_cast<int>(cli::read_casebook(book.path()).size()); }), 1);
    EXPECT_EQ(as_nobody([&] { return book.outcome({"larkmoor-211", "proximal"}).code; }), 2);
    EXPECT_EQ(text_of(book.path()), before);
    ASSERT_EQ(chmod(book.dir().path().c_str(), 0755), 0);
}

class WrongCasebookWords : public ::testing::TestWithParam<std::vector<std::string>> {};

TEST_P(WrongCasebookWords, ExitWithTwoAndChangeNothing) {
    const Book book;
    ASSERT_EQ(book.record(case_text("larkmoor-212")).code, 0);
    const std::string before = text_of(book.path());
    const std::string one = book.dir().write("case.yaml", case_text("larkmoor-213"));
    std::vector<std::string> words = {"casebook"};
    words.insert(words.end(), GetParam().begin(), GetParam().end());
    words.insert(words.end(), {"--casebook", book.path()});
    std::replace(words.begin(), words.end(), std::string("-"), one);
    const Outcome outcome = run_here(words);
    EXPECT_EQ(outcome.code, 2) << outcome.err;
    EXPECT_EQ(outcome.out, "");
    EXPECT_NE(outcome.err, "");
    EXPECT_EQ(text_of(book.path()), before);
}

INSTANTIATE_TEST_SUITE_P(
    Words, WrongCasebookWords,
    ::testing::Values(
        std::vector<std::string>{}, std::vector<std::string>{"record"},
        std::vector<std::string>{"record", "-", "--salted"},
        std::vector<std::string>{"record", "-", "--salt-file", "/tmp/no-such-salt"},
        std::vector<std::string>{"record", "-", "--exclude", "proximl"},
        std::vector<std::string>{"record", "-", "--wait", "-1"},
        std::vector<std::string>{"outcome", "larkmoor-212"},
        std::vector<std::string>{"outcome", "larkmoor-213", "proximal"},
        std::vector<std::string>{"outcome", "larkmoor-212", "proximl"},
        std::vector<std::string>{"outcome", "larkmoor-212", "Proximal"},
        std::vector<std::string>{"outcome", "larkmoor-212", "x y", "--outside"},
        std::vector<std::string>{"outcome", "larkmoor-212", "proximal", "--amend"},
        std::vector<std::string>{"outcome", "larkmoor-212", "proximal", "--amend", "--why", " "},
        std::vector<std::string>{"outcome", "larkmoor-212", "proximal", "--amend", "--why", "none yet"},
        std::vector<std::string>{"outcome", "larkmoor-212", "proximal", "--why", "x"},
        std::vector<std::string>{"outcome", "larkmoor-212", "proximal", "--from", "-"},
        std::vector<std::string>{"outcome"}, std::vector<std::string>{"list", "--open", "--all"},
        std::vector<std::string>{"list", "larkmoor-213"}, std::vector<std::string>{"list", "--as", "xml"},
        std::vector<std::string>{"export", "--as", "json"},
        std::vector<std::string>{"export", "--out", "/nowhere/at/all"}));

struct BadLines {
    const char* text;
    const char* where;
    document::Code code;
};

class BadOutcomeFile : public ::testing::TestWithParam<BadLines> {};

TEST_P(BadOutcomeFile, IsToldWithItsPlace) {
    document::Diagnostics faults;
    cli::read_outcome_lines(GetParam().text, "o.csv", faults);
    ASSERT_EQ(faults.size(), 1U) << GetParam().text;
    const document::Diagnostic fault = faults.sorted().front();
    EXPECT_EQ(document::to_string(fault.where), GetParam().where) << fault.message;
    EXPECT_EQ(fault.code, GetParam().code) << fault.message;
}

INSTANTIATE_TEST_SUITE_P(
    Files, BadOutcomeFile,
    ::testing::Values(BadLines{"", "o.csv", document::Code::empty_document},
                      BadLines{"case\na\n", "o.csv:1:1", document::Code::missing_key},
                      BadLines{"case,final_cause,sex\n", "o.csv:1:18", document::Code::unknown_key},
                      BadLines{"case,final_cause,case\n", "o.csv:1:18", document::Code::duplicate_key},
                      BadLines{"case,final_cause\na\n", "o.csv:2:1", document::Code::syntax},
                      BadLines{"case,final_cause\na,b,c\n", "o.csv:2:1", document::Code::syntax},
                      BadLines{"case,final_cause\n\n,b\n", "o.csv:3:1", document::Code::empty_value},
                      BadLines{"case,final_cause\na,\n", "o.csv:2:3", document::Code::empty_value},
                      BadLines{"case,final_cause\na,b\nc,d\na,e\n", "o.csv:4:1",
                               document::Code::conflicting_values},
                      BadLines{"case,final_cause\na,\"b\n", "o.csv:2:3", document::Code::syntax},
                      BadLines{"case,final_cause\na,\"b\"c\n", "o.csv:2:6", document::Code::syntax},
                      BadLines{"case,final_cause\na,b\"c\n", "o.csv:2:4", document::Code::syntax},
                      BadLines{"case,final_cause\na,b\rc,d\n", "o.csv:2:5", document::Code::syntax}));

}  // namespace
}  // namespace steelyard::test
