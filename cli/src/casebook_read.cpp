// SPDX-License-Identifier: Apache-2.0
#include <fmt/format.h>
#include <sqlite3.h>

#include <cmath>
#include <map>
#include <sstream>
#include <unordered_map>

#include "casebook_form.hpp"
#include "steelyard/cli/casebook.hpp"
#include "steelyard/cli/terminal.hpp"

namespace steelyard::cli {
namespace {

double probability(const Statement& row, int column, const std::string& path) {
    const double value = row.number(column);
    if (!(value >= 0.0 && value <= 1.0)) {
        refuse_casebook(path, fmt::format("the casebook is damaged: it holds the probability {}", value),
                        "take the last good copy", false);
    }
    return value;
}

/// Recordings with their sources; causes and outcomes are still to come.
std::vector<CasebookEntry> entries_of(const Database& database,
                                      std::unordered_map<std::int64_t, std::size_t>& place_of) {
    std::vector<CasebookEntry> entries;
    Statement rows(
        database,
        "SELECT r.id, r.case_id, r.recorded, r.gate, r.pattern, s.version, s.tables_title, s.tables_digest, "
        "s.reading_digest, s.priors_title, s.priors_digest, s.tables_causes FROM recording r JOIN source s "
        "ON s.id = r.source ORDER BY r.id");
    while (rows.step()) {
        CasebookEntry entry;
        entry.case_id = rows.text(1);
        entry.recorded = rows.text(2);
        entry.gate = rows.text(3);
        entry.pattern = rows.text(4);
        entry.version = rows.text(5);
        entry.tables_title = rows.text(6);
        entry.tables_digest = rows.text(7);
        entry.reading_digest = rows.text(8);
        entry.priors_title = rows.text(9);
        entry.priors_digest = rows.text(10);
        std::istringstream causes(rows.text(11));
        for (std::string cause; causes >> cause;) {
            entry.tables_causes.push_back(cause);
        }
        place_of.emplace(rows.integer(0), entries.size());
        entries.push_back(std::move(entry));
    }
    return entries;
}

struct OutcomesOfCase {
    std::vector<CasebookOutcome> outcomes;
    std::int64_t after_recording = 0;  ///< the last recording of the book when the first of them was entered
};

std::map<std::string, OutcomesOfCase, std::less<>> outcomes_of(const Database& database) {
    std::map<std::string, OutcomesOfCase, std::less<>> all;
    Statement rows(
        database,
        "SELECT case_id, final_cause, outside, entered, why, after_recording FROM outcome ORDER BY id");
    while (rows.step()) {
        OutcomesOfCase& one = all[rows.text(0)];
        if (one.outcomes.empty()) {
            one.after_recording = rows.integer(5);
        }
        one.outcomes.push_back({rows.text(1), rows.integer(2) != 0, rows.text(3), rows.text(4)});
    }
    return all;
}

std::vector<CasebookEntry> read_all(const Database& database, const std::string& path) {
    if (const std::string word = database.text("PRAGMA quick_check(1)"); word != "ok") {
        refuse_casebook(path, fmt::format("the casebook is damaged ({})", word), "take the last good copy",
                        false);
    }
    database.run("BEGIN");  // One view of the file, whatever others add meanwhile.
    std::unordered_map<std::int64_t, std::size_t> place_of;
    std::vector<CasebookEntry> entries = entries_of(database, place_of);
    Statement causes(database,
                     "SELECT recording, cause, prior, posterior FROM probability ORDER BY recording, place");
    while (causes.step()) {
        const auto place = place_of.find(causes.integer(0));
        if (place != place_of.end()) {
            entries[place->second].causes.push_back(
                {causes.text(1), probability(causes, 2, path), probability(causes, 3, path)});
        }
    }
    const auto outcomes = outcomes_of(database);

    // Which recording stands for its case: the first one weighed before the first outcome, else the first.
    std::map<std::string, std::vector<std::size_t>, std::less<>> by_case;
    std::vector<std::int64_t> ids(entries.size());
    for (const auto& [id, place] : place_of) {
        ids[place] = id;
    }
    for (std::size_t i = 0; i < entries.size(); ++i) {
        by_case[entries[i].case_id].push_back(i);
    }
    for (const auto& [case_id, places] : by_case) {
        const auto found = outcomes.find(case_id);
        std::size_t standing = places.front();
        for (const std::size_t i : places) {
            const bool in_time = found == outcomes.end() || ids[i] <= found->second.after_recording;
            if (in_time && !entries[i].causes.empty()) {
                standing = i;
                break;
            }
        }
        for (std::size_t n = 0; n < places.size(); ++n) {
            CasebookEntry& entry = entries[places[n]];
            entry.place = n + 1;
            entry.of = places.size();
            entry.counts = places[n] == standing;
            if (found != outcomes.end()) {
                entry.outcomes = found->second.outcomes;
            }
        }
    }
    database.run("COMMIT");
    return entries;
}

}  // namespace

Database open_casebook_for_reading(const std::string& path, std::chrono::milliseconds wait) {
    if (inspect_casebook(path, false) != CasebookFile::casebook) {
        refuse_casebook(path, "there is no casebook", "`steelyard casebook record` starts one", false);
    }
    try {
        Database database(path, Access::read, wait);
        check_casebook(database, path);
        return database;
    } catch (const DatabaseError& error) {
        // In a folder where nothing may be written, SQLite cannot make its files beside the casebook. What
        // stands in the casebook itself can be read all the same, unless a log beside it holds more.
        const bool kept_from_writing = error.code() == SQLITE_CANTOPEN || error.code() == SQLITE_READONLY;
        if (!kept_from_writing || has_casebook_log(path)) {
            throw;
        }
    }
    Database database(path, Access::read_unchanging, wait);
    check_casebook(database, path);
    return database;
}

const CauseAtTheTime* CasebookEntry::leader() const noexcept {
    const CauseAtTheTime* best = nullptr;
    for (const CauseAtTheTime& cause : causes) {
        if (best == nullptr || cause.posterior > best->posterior) {
            best = &cause;
        }
    }
    return best;
}

std::vector<CasebookEntry> read_recordings(const std::string& path, std::chrono::milliseconds wait) {
    try {
        return read_all(open_casebook_for_reading(path, wait), path);
    } catch (const DatabaseError& error) {
        tell_casebook_error(error, path, false, std::chrono::duration<double>(wait).count());
    }
}

std::vector<CasebookEntry> read_casebook(const std::string& path, std::chrono::milliseconds wait) {
    std::vector<CasebookEntry> entries;
    std::map<std::string, std::size_t, std::less<>> first_place;  // where a case was first met
    for (CasebookEntry& entry : read_recordings(path, wait)) {
        const auto [place, is_new] = first_place.emplace(entry.case_id, entries.size());
        if (is_new) {
            entries.push_back(std::move(entry));
        } else if (entry.counts) {
            entries[place->second] = std::move(entry);
        }
    }
    return entries;
}

}  // namespace steelyard::cli
