// SPDX-License-Identifier: Apache-2.0
#include "casebook_file.hpp"

#include <fmt/format.h>
#include <sqlite3.h>
#include <sys/stat.h>
#include <unistd.h>

#include <algorithm>
#include <cerrno>
#include <cstdlib>
#include <fstream>
#include <iterator>
#include <sstream>
#include <system_error>
#include <thread>

#include "casebook_form.hpp"
#include "open_inputs.hpp"
#include "salted_id.hpp"
#include "steelyard/cli/output.hpp"
#include "steelyard/cli/terminal.hpp"
#include "utc_time.hpp"

namespace steelyard::cli {
namespace {

/// What is hashed beside the salt to tell a wrong salt from the right one.
constexpr std::string_view salt_test = "steelyard casebook";

/// Runs `action`, and says in words for the user of this casebook what goes wrong in SQLite.
template <class Action>
auto in_words(const CasebookOpening& opening, const Action& action) {
    try {
        return action();
    } catch (const DatabaseError& error) {
        tell_casebook_error(error, opening.path, true, std::chrono::duration<double>(opening.wait).count());
    }
}

std::string joined(const std::vector<std::string>& words) {
    std::string text;
    for (const std::string& word : words) {
        text += (text.empty() ? "" : " ") + word;
    }
    return text;
}

void add_words(const std::string& text, std::vector<std::string>& words) {
    std::istringstream in(text);
    for (std::string word; in >> word;) {
        if (std::find(words.begin(), words.end(), word) == words.end()) {
            words.push_back(word);
        }
    }
}

std::string read_salt(const std::string& path) {
    std::ifstream in(path, std::ios::binary);
    std::string salt{std::istreambuf_iterator<char>(in), {}};
    if (!in || salt.size() != salt_bytes) {
        refuse_casebook(path, fmt::format("the file is no salt: it must hold {} bytes", salt_bytes),
                        "name the file that was made when the casebook was started", false);
    }
    return salt;
}

/// Makes a salt's file, readable to its owner alone; whole, or not at all. Another program may be first.
void make_salt_file(const std::string& path) {
    const std::string salt = new_salt();
    std::string name = path + ".XXXXXX";
    const int file = mkstemp(name.data());
    const bool made = file >= 0 &&
                      ::write(file, salt.data(), salt.size()) == static_cast<ssize_t>(salt.size()) &&
                      fsync(file) == 0 && (link(name.c_str(), path.c_str()) == 0 || errno == EEXIST);
    const int error = errno;
    if (file >= 0) {
        close(file);
        unlink(name.c_str());
    }
    if (!made) {
        throw OutputError(fmt::format("cannot write {}: {}", path, std::generic_category().message(error)));
    }
}

/// The salt that a new casebook is to use.
std::string salt_to_start_with(const CasebookOpening& opening) {
    if (opening.salt_file.empty()) {
        return opening.salted ? new_salt() : std::string();
    }
    struct stat status {};
    if (stat(opening.salt_file.c_str(), &status) != 0 && errno == ENOENT) {
        make_salt_file(opening.salt_file);
    }
    return read_salt(opening.salt_file);
}

/// The salt of an open casebook; empty where ids are kept as they are.
std::string salt_of(const Database& database, const std::string& path, const std::string& salt_file) {
    const std::string check = database.text("SELECT salt_check FROM casebook");
    if (check.empty()) {
        if (!salt_file.empty()) {
            throw UsageError(
                fmt::format("--salt-file: {} keeps ids as they are, without a salt", visible(path)));
        }
        return {};
    }
    const std::string inside = database.text("SELECT salt FROM casebook");
    if (!inside.empty()) {
        if (!salt_file.empty()) {
            throw UsageError(fmt::format("--salt-file: {} keeps its salt itself", visible(path)));
        }
        return inside;
    }
    if (salt_file.empty()) {
        throw UsageError(
            fmt::format("{} keeps its salt apart: name the salt's file with --salt-file", visible(path)));
    }
    const std::string salt = read_salt(salt_file);
    if (salted(salt, salt_test) != check) {
        refuse_casebook(salt_file, fmt::format("the salt is not that of {}", visible(path)),
                        "name the file that was made when the casebook was started", false);
    }
    return salt;
}

/// Switches to the write-ahead log, in which readers and a writer do not wait for each other. Needs the file
/// alone for a moment, and SQLite does not wait for that by itself.
void use_write_ahead_log(const Database& database, std::chrono::milliseconds wait) {
    const auto end = std::chrono::steady_clock::now() + wait;
    while (true) {
        try {
            database.run("PRAGMA journal_mode = WAL");
            return;
        } catch (const DatabaseError& error) {
            if (error.code() != SQLITE_BUSY || std::chrono::steady_clock::now() >= end) {
                throw;
            }
        }
        std::this_thread::sleep_for(std::chrono::milliseconds(5));
    }
}

}  // namespace

CasebookWriter::CasebookWriter(CasebookOpening opening) : opening_(std::move(opening)), now_(utc_now()) {
    const CasebookFile state = inspect_casebook(opening_.path, true);
    if (state != CasebookFile::casebook && !opening_.may_start) {
        refuse_casebook(opening_.path, "there is no casebook", "`steelyard casebook record` starts one",
                        false);
    }
    in_words(opening_, [&] {
        database_.emplace(opening_.path, opening_.may_start ? Access::write_or_start : Access::write,
                          opening_.wait);
        if (state != CasebookFile::casebook) {
            const std::string salt = salt_to_start_with(opening_);
            started_ = start_casebook(*database_, now_, opening_.salt_file.empty() ? salt : "",
                                      salt.empty() ? "" : salted(salt, salt_test));
        }
        check_casebook(*database_, opening_.path);
        if (database_->is_read_only()) {
            throw DatabaseError(SQLITE_READONLY, "the file is read-only");
        }
        use_write_ahead_log(*database_, opening_.wait);
        database_->run("PRAGMA synchronous = FULL; PRAGMA foreign_keys = ON");
        transaction_.emplace(*database_);
        salt_ = salt_of(*database_, opening_.path, opening_.salt_file);
        if (opening_.salted && salt_.empty()) {
            throw UsageError(
                fmt::format("--salted: {} was started without; hashing only the new ids would let no "
                            "case be found again",
                            visible(opening_.path)));
        }
    });
}

std::string CasebookWriter::kept_id(std::string_view case_id) const {
    return salt_.empty() ? std::string(case_id) : salted(salt_, case_id);
}

CasebookWriter::Known CasebookWriter::known(std::string_view case_id) {
    return in_words(opening_, [&] {
        const std::string id = kept_id(case_id);
        Known known;
        Statement recordings(*database_,
                             "SELECT s.tables_causes FROM recording r JOIN source s ON s.id = r.source "
                             "WHERE r.case_id = ? ORDER BY r.id");
        for (recordings.bind(1, id); recordings.step(); ++known.recordings) {
            add_words(recordings.text(0), known.causes);
        }
        Statement outcome(*database_,
                          "SELECT final_cause FROM outcome WHERE case_id = ? ORDER BY id DESC LIMIT 1");
        if (outcome.bind(1, id).step()) {
            known.final_cause = outcome.text(0);
        }
        return known;
    });
}

std::vector<std::string> CasebookWriter::case_ids() {
    return in_words(opening_, [&] {
        std::vector<std::string> ids;
        Statement all(*database_, "SELECT DISTINCT case_id FROM recording");
        while (all.step()) {
            ids.push_back(all.text(0));
        }
        return ids;
    });
}

void CasebookWriter::record(const CasebookSource& source, const Recording& recording) {
    in_words(opening_, [&] {
        Statement add_source(*database_, "INSERT OR IGNORE INTO source VALUES(NULL, ?, ?, ?, ?, ?, ?, ?)");
        add_source.bind(1, source.version)
            .bind(2, source.tables_title)
            .bind(3, source.tables_digest)
            .bind(4, source.reading_digest)
            .bind(5, source.priors_title)
            .bind(6, source.priors_digest)
            .bind(7, joined(source.tables_causes))
            .run();
        Statement add(*database_,
                      "INSERT INTO recording SELECT NULL, ?, ?, id, ?, ? FROM source WHERE version = ? AND "
                      "tables_digest = ? AND priors_digest = ?");
        add.bind(1, kept_id(recording.case_id))
            .bind(2, now_)
            .bind(3, recording.gate)
            .bind(4, recording.pattern)
            .bind(5, source.version)
            .bind(6, source.tables_digest)
            .bind(7, source.priors_digest)
            .run();
        const std::int64_t id = database_->last_id();
        Statement add_cause(*database_, "INSERT INTO probability VALUES(?, ?, ?, ?, ?)");
        std::int64_t place = 0;
        for (const CauseAtTheTime& cause : recording.causes) {
            add_cause.bind(1, id)
                .bind(2, place++)
                .bind(3, cause.cause)
                .bind(4, cause.prior)
                .bind(5, cause.posterior)
                .run();
        }
    });
}

void CasebookWriter::add_outcome(std::string_view case_id, const std::string& cause, bool outside,
                                 const std::string& why) {
    in_words(opening_, [&] {
        Statement add(
            *database_,
            "INSERT INTO outcome SELECT NULL, ?1, ?2, ?3, ?4, CASE WHEN ?5 IS NULL THEN NULL ELSE "
            "(SELECT max(id) FROM outcome WHERE case_id = ?1) END, ?5, (SELECT max(id) FROM recording)");
        add.bind(1, kept_id(case_id)).bind(2, now_).bind(3, cause).bind(4, std::int64_t{outside ? 1 : 0});
        why.empty() ? add.bind_nothing(5) : add.bind(5, why);
        add.run();
    });
}

CasebookWriter::Counts CasebookWriter::counts() {
    return in_words(opening_, [&] {
        Counts counts;
        counts.cases = database_->integer("SELECT count(DISTINCT case_id) FROM recording");
        counts.open = counts.cases - database_->integer("SELECT count(DISTINCT case_id) FROM outcome");
        return counts;
    });
}

void CasebookWriter::commit() {
    in_words(opening_, [&] { transaction_->commit(); });
}

std::vector<std::string> kept_ids(const std::string& path, const std::string& salt_file,
                                  const std::vector<std::string>& case_ids, std::chrono::milliseconds wait) {
    try {
        const Database database = open_casebook_for_reading(path, wait);
        const std::string salt = salt_of(database, path, salt_file);
        std::vector<std::string> ids;
        ids.reserve(case_ids.size());
        for (const std::string& id : case_ids) {
            ids.push_back(salt.empty() ? id : salted(salt, id));
        }
        return ids;
    } catch (const DatabaseError& error) {
        tell_casebook_error(error, path, false, std::chrono::duration<double>(wait).count());
    }
}

}  // namespace steelyard::cli
