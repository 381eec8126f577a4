// SPDX-License-Identifier: Apache-2.0
// Many writers at once lose nothing, and a writer that is killed at any moment leaves each batch whole or not
// at all.
#include <gtest/gtest.h>
#include <sys/wait.h>

#include <algorithm>
#include <array>
#include <chrono>
#include <csignal>
#include <functional>
#include <iostream>
#include <map>
#include <random>
#include <thread>

#include "casebook_book.hpp"
#include "casebook_file.hpp"

namespace steelyard::test {
namespace {

constexpr int cases_of_batch = 8;

const cli::CasebookSource source = {"0", "tables", "sha256:t", "sha256:r", "priors", "sha256:p", {"a", "b"}};

/// Records one batch in one transaction.
void record_batch(const std::string& path, const std::string& batch) {
    cli::CasebookOpening opening;
    opening.path = path;
    opening.may_start = true;
    cli::CasebookWriter book(opening);
    for (int i = 0; i < cases_of_batch; ++i) {
        const double a = (i + 0.5) / cases_of_batch;
        book.record(source,
                    {batch + "/" + std::to_string(i), "in_scope", "0.x", {{"a", 0.5, a}, {"b", 0.5, 1 - a}}});
    }
    book.add_outcome(batch + "/0", "a", false, "");
    book.commit();
}

/// Starts a process that runs `action` and ends without anything of this one being tidied up.
pid_t start(const std::function<void()>& action) {
    const pid_t child = fork();
    if (child == 0) {
        try {
            action();
        } catch (const std::exception& error) {
            std::cerr << error.what() << '\n';
            _exit(1);
        }
        _exit(0);
    }
    return child;
}

/// Cases per batch, each of them with its two causes.
std::map<std::string, int> batches_in(const std::string& path) {
    std::map<std::string, int> batches;
    for (const cli::CasebookEntry& entry : cli::read_casebook(path)) {
        EXPECT_EQ(entry.causes.size(), 2U);
        ++batches[entry.case_id.substr(0, entry.case_id.find('/'))];
        if (entry.case_id.ends_with("/0")) {
            EXPECT_NE(entry.outcome(), nullptr);
        }
    }
    return batches;
}

TEST(CasebookInUse, ManyWritersAtOnceLoseNothing) {
    const Book book;
    constexpr int writers = 6;
    constexpr int batches = 8;
    std::vector<pid_t> children;
    for (int w = 0; w < writers; ++w) {
        children.push_back(start([&] {
            for (int b = 0; b < batches; ++b) {
                record_batch(book.path(), std::to_string(w) + "." + std::to_string(b));
            }
        }));
    }
    for (const pid_t child : children) {
        int status = 0;
        waitpid(child, &status, 0);
        EXPECT_EQ(status, 0);
    }
    const auto found = batches_in(book.path());
    EXPECT_EQ(found.size(), static_cast<std::size_t>(writers * batches));
    for (const auto& [batch, count] : found) {
        EXPECT_EQ(count, cases_of_batch) << batch;
    }
}

TEST(CasebookInUse, ManyProgramsStartingItAtOnceLoseNothing) {
    const Book book;
    std::vector<std::thread> threads;
    std::vector<Outcome> outcomes(6);
    for (std::size_t i = 0; i < outcomes.size(); ++i) {
        const std::string file = book.dir().write("case-" + std::to_string(i) + ".yaml",
                                                  case_text("larkmoor-3" + std::to_string(i)));
        threads.emplace_back([&, i, file] {
            outcomes[i] = run({"casebook", "record", file, "--casebook", book.path()});
        });
    }
    for (std::thread& thread : threads) {
        thread.join();
    }
    for (const Outcome& outcome : outcomes) {
        EXPECT_EQ(outcome.code, 0) << outcome.err;
    }
    EXPECT_EQ(cli::read_casebook(book.path()).size(), outcomes.size());
}

/// Kills a child that records batch after batch after a random time, and looks at what is left. The child
/// tells through a pipe which batches it was promised to be kept.
void kill_and_look(const std::string& path, int round, std::chrono::microseconds after,
                   int& promised_in_all) {
    std::array<int, 2> pipe_ends{};
    ASSERT_EQ(pipe(pipe_ends.data()), 0);
    const pid_t child = start([&] {
        for (int b = 0; b < 1000; ++b) {
            record_batch(path, std::to_string(round) + "." + std::to_string(b));
            if (write(pipe_ends[1], "x", 1) != 1) {
                _exit(2);
            }
        }
    });
    close(pipe_ends[1]);
    std::this_thread::sleep_for(after);
    kill(child, SIGKILL);
    int status = 0;
    waitpid(child, &status, 0);
    ASSERT_TRUE(WIFSIGNALED(status)) << status;
    int promised = 0;
    for (char c = 0; read(pipe_ends[0], &c, 1) == 1;) {
        ++promised;
    }
    close(pipe_ends[0]);
    promised_in_all += promised;

    if (!std::filesystem::exists(path) || std::filesystem::file_size(path) == 0) {
        ASSERT_EQ(promised, 0);
        return;
    }
    EXPECT_EQ(sql_text(path, "PRAGMA integrity_check"), "ok");
    EXPECT_EQ(sql_text(path, "PRAGMA foreign_key_check"), "no row");
    // Killed before its tables were there, it is as good as empty; then nothing was promised either.
    if (sql_text(path, "SELECT count(*) FROM sqlite_master") == "0") {
        ASSERT_EQ(promised, 0);
        return;
    }
    const auto batches = batches_in(path);
    for (const auto& [batch, count] : batches) {
        EXPECT_EQ(count, cases_of_batch) << batch;
    }
    for (int b = 0; b < promised; ++b) {
        EXPECT_TRUE(batches.contains(std::to_string(round) + "." + std::to_string(b)))
            << "promised and lost: " << round << "." << b;
    }
}

TEST(KilledWhileWriting, TheCasebookHoldsEachBatchWhollyOrNotAtAll) {
    std::mt19937 random(20261201);
    int promised = 0;
    // How long batches take here and now, so that kills fall into the first few of them.
    const Book measured;
    const auto begin = std::chrono::steady_clock::now();
    for (int b = 0; b < 4; ++b) {
        record_batch(measured.path(), std::to_string(b));
    }
    const auto four =
        std::chrono::duration_cast<std::chrono::microseconds>(std::chrono::steady_clock::now() - begin);
    const int longest = static_cast<int>(std::clamp<long>(four.count(), 2000, 400'000));
    // One casebook that lives through many kills, and many that are killed while they are being started.
    const Book lasting;
    std::uniform_int_distribution<int> microseconds(0, longest);
    for (int round = 0; round < 40 && !::testing::Test::HasFatalFailure(); ++round) {
        kill_and_look(lasting.path(), round, std::chrono::microseconds(microseconds(random)), promised);
    }
    EXPECT_GT(promised, 10) << "the kills came too early to mean anything";
    std::uniform_int_distribution<int> early(0, longest / 3);
    for (int round = 0; round < 25 && !::testing::Test::HasFatalFailure(); ++round) {
        const Book fresh;
        kill_and_look(fresh.path(), round, std::chrono::microseconds(early(random)), promised);
        record_batch(fresh.path(), "afterwards");
        EXPECT_EQ(batches_in(fresh.path()).at("afterwards"), cases_of_batch);
    }
}

TEST(KilledWhileWriting, TheProgramItselfLeavesAWholeCasebook) {
    const Book book;
    std::string cases;
    for (int i = 0; i < 60; ++i) {
        cases += "- {case: l-" + std::to_string(i) +
                 ", serum: {sodium: 140 mmol/L, chloride: 116 mmol/L, bicarbonate: 14 mmol/L, potassium: 2.9 "
                 "mmol/L}}\n";
    }
    std::mt19937 random(7);
    std::uniform_int_distribution<int> milliseconds(50, 450);
    for (int round = 0; round < 8; ++round) {
        std::string batch = cases;
        for (std::size_t at = 0; (at = batch.find("case: l-", at)) != std::string::npos; at += 8) {
            batch.replace(at, 8, "case: l" + std::to_string(round) + "-");
        }
        const std::string file = book.dir().write("cases.yaml", batch);
        const pid_t child = fork();
        if (child == 0) {
            const int nowhere = open("/dev/null", O_WRONLY);
            dup2(nowhere, 1);
            dup2(nowhere, 2);
            execl(STEELYARD_PROGRAM, STEELYARD_PROGRAM, "casebook", "record", file.c_str(), "-b",
                  book.path().c_str(), nullptr);
            _exit(127);
        }
        std::this_thread::sleep_for(std::chrono::milliseconds(milliseconds(random)));
        kill(child, SIGKILL);
        int status = 0;
        waitpid(child, &status, 0);
        if (std::filesystem::exists(book.path()) && std::filesystem::file_size(book.path()) > 0) {
            EXPECT_EQ(sql_text(book.path(), "PRAGMA integrity_check"), "ok");
            EXPECT_EQ(std::stoi(sql_text(book.path(), "SELECT count(*) FROM recording")) % 60, 0);
        }
    }
    EXPECT_EQ(book.record(case_text("afterwards")).code, 0);
    EXPECT_EQ(std::stoi(sql_text(book.path(), "SELECT count(*) FROM recording")) % 60, 1);
}

}  // namespace
}  // namespace steelyard::test
