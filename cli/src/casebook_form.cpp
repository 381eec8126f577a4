// SPDX-License-Identifier: Apache-2.0
#include "casebook_form.hpp"

#include <fmt/format.h>
#include <sqlite3.h>
#include <sys/stat.h>

#include <algorithm>
#include <array>
#include <cerrno>
#include <filesystem>
#include <fstream>
#include <iterator>
#include <map>
#include <system_error>
#include <thread>

#include "steelyard/cli/output.hpp"
#include "steelyard/cli/terminal.hpp"
#include "steelyard/document/diagnostic.hpp"

namespace steelyard::cli {
namespace {

struct Part {
    std::string_view name;
    std::string_view sql;
};

// The texts are compared with those in the file, so a change of one is a new form. Ids of cases stand as they
// are or as hashes; no name, date of birth or path of a file has a place here.
constexpr auto tables = std::to_array<Part>(
    {{"casebook", "CREATE TABLE casebook(started TEXT NOT NULL, salt BLOB, salt_check TEXT) STRICT"},
     {"source",
      "CREATE TABLE source(id INTEGER PRIMARY KEY, version TEXT NOT NULL, tables_title TEXT NOT NULL, "
      "tables_digest TEXT NOT NULL, reading_digest TEXT NOT NULL, priors_title TEXT NOT NULL, "
      "priors_digest TEXT NOT NULL, tables_causes TEXT NOT NULL, UNIQUE(version, tables_digest, "
      "priors_digest)) "
      "STRICT"},
     {"recording",
      "CREATE TABLE recording(id INTEGER PRIMARY KEY, case_id TEXT NOT NULL, recorded TEXT NOT NULL, "
      "source INTEGER NOT NULL REFERENCES source(id), gate TEXT NOT NULL CHECK(gate IN ('in_scope', "
      "'caution', "
      "'out_of_scope')), pattern TEXT NOT NULL) STRICT"},
     {"recording_of_case", "CREATE INDEX recording_of_case ON recording(case_id)"},
     {"probability",
      "CREATE TABLE probability(recording INTEGER NOT NULL REFERENCES recording(id), place INTEGER NOT NULL, "
      "cause TEXT NOT NULL, prior REAL NOT NULL, posterior REAL NOT NULL, PRIMARY KEY(recording, place)) "
      "STRICT, "
      "WITHOUT ROWID"},
     {"outcome",
      "CREATE TABLE outcome(id INTEGER PRIMARY KEY, case_id TEXT NOT NULL, entered TEXT NOT NULL, "
      "final_cause TEXT NOT NULL, outside INTEGER NOT NULL CHECK(outside IN (0, 1)), "
      "amends INTEGER UNIQUE REFERENCES outcome(id), why TEXT, after_recording INTEGER NOT NULL "
      "REFERENCES recording(id), CHECK((amends IS NULL) = (why IS NULL))) STRICT"},
     {"first_outcome", "CREATE UNIQUE INDEX first_outcome ON outcome(case_id) WHERE amends IS NULL"}});

/// All that a casebook is made of, by name.
std::map<std::string, std::string, std::less<>> parts_of_casebook() {
    std::map<std::string, std::string, std::less<>> parts;
    for (const Part& part : tables) {
        parts.emplace(part.name, part.sql);
        if (part.sql.starts_with("CREATE TABLE")) {
            for (const std::string_view change : {"UPDATE", "DELETE"}) {
                const std::string name =
                    fmt::format("{}_{}", part.name, change == "UPDATE" ? "stays" : "is_kept");
                parts.emplace(name,
                              fmt::format("CREATE TRIGGER {} BEFORE {} ON {} BEGIN SELECT RAISE(ABORT, 'a "
                                          "casebook is only added to'); END",
                                          name, change, part.name));
            }
        }
    }
    return parts;
}

constexpr auto logs = std::to_array<const char*>({"-wal", "-journal"});

/// A number of four bytes, the high one first, as SQLite's header has it.
std::int64_t number_at(std::string_view bytes, std::size_t at) {
    std::int64_t value = 0;
    for (std::size_t i = 0; i < 4; ++i) {
        value = value * 256 + static_cast<unsigned char>(bytes[at + i]);
    }
    return value;
}

/// Whether the file ends before the pages that its header counts. SQLite itself takes what is missing of the
/// last page for zeros.
bool is_cut_short(const std::string& path, std::string_view header) {
    const std::int64_t page_size = number_at(header, 16) >> 16;  // its upper two bytes; 1 stands for 65536
    const std::int64_t expected = number_at(header, 28) * (page_size == 1 ? 65536 : page_size);
    std::error_code error;
    const auto size = std::filesystem::file_size(path, error);
    return !error && static_cast<std::int64_t>(size) < expected && !has_casebook_log(path);
}

}  // namespace

bool has_casebook_log(const std::string& path) {
    std::error_code error;
    const std::string file = std::filesystem::canonical(path, error).string();
    return std::any_of(std::begin(logs), std::end(logs), [&](const char* log) {
        std::error_code absent;
        return std::filesystem::file_size(file + log, absent) > 0 && !absent;
    });
}

void refuse_casebook(const std::string& path, const std::string& message, const std::string& hint,
                     bool wrong_form) {
    document::Diagnostics faults;
    faults.add({path, 0, 0}, wrong_form ? document::Code::bad_format : document::Code::unreadable_file,
               message, hint);
    throw document::LoadError(faults);
}

void tell_casebook_error(const DatabaseError& error, const std::string& path, bool for_writing,
                         double waited) {
    switch (error.code()) {
        case SQLITE_BUSY:
        case SQLITE_LOCKED:
        case SQLITE_PROTOCOL: {
            const std::string words =
                fmt::format("another program kept {} locked for {:g} s", visible(path), waited);
            if (for_writing) {
                throw OutputError(words + "; nothing was changed: try again, or wait longer with --wait");
            }
            refuse_casebook(path, words, "try again, or wait longer with --wait", false);
        }
        case SQLITE_CORRUPT:
        case SQLITE_NOTADB:
            refuse_casebook(path, fmt::format("the casebook is damaged ({})", error.what()),
                            "take the last good copy; nothing was changed", false);
        case SQLITE_CANTOPEN:
        case SQLITE_READONLY:
        case SQLITE_PERM:
        case SQLITE_AUTH:
        case SQLITE_IOERR:
        case SQLITE_FULL:
            if (for_writing) {
                throw OutputError(fmt::format("cannot write {}: {}; the folder must be writable too",
                                              visible(path), error.what()));
            }
            refuse_casebook(path, fmt::format("the casebook cannot be read ({})", error.what()),
                            "check the rights to read it, and to write in its folder", false);
        default:
            throw error;
    }
}

CasebookFile inspect_casebook(const std::string& path, bool for_writing) {
    struct stat status {};
    if (stat(path.c_str(), &status) != 0) {
        if (errno == ENOENT) {
            return CasebookFile::absent;
        }
        const std::string why = std::generic_category().message(errno);
        if (for_writing) {
            throw OutputError(fmt::format("cannot write {}: {}", path, why));
        }
        refuse_casebook(path, fmt::format("the casebook cannot be read: {}", why), "", false);
    }
    if (!S_ISREG(status.st_mode)) {
        const std::string why = S_ISDIR(status.st_mode) ? "it is a folder" : "it is no ordinary file";
        if (for_writing) {
            throw OutputError(fmt::format("cannot write {}: {}", path, why));
        }
        refuse_casebook(path, why, "name the casebook's file", false);
    }
    if (status.st_size == 0) {
        return CasebookFile::empty;
    }
    std::ifstream file(path, std::ios::binary);
    std::string header(100, '\0');
    file.read(header.data(), static_cast<std::streamsize>(header.size()));
    if (!file && !file.eof()) {
        refuse_casebook(path, "the casebook cannot be read", "check the rights to read it", false);
    }
    constexpr std::string_view magic("SQLite format 3\0", 16);
    if (file.gcount() != 100 || !header.starts_with(magic) || number_at(header, 68) != casebook_application) {
        refuse_casebook(path, "the file is no casebook; it was left as it is",
                        "name a casebook, or a new file for one", true);
    }
    if (number_at(header, 60) > casebook_form) {
        refuse_casebook(path,
                        fmt::format("the casebook has form {}, this program knows forms up to {}",
                                    number_at(header, 60), casebook_form),
                        "use the program that wrote it, or a newer one", true);
    }
    // Another program may be putting the pages in their place at this moment.
    for (int looks = 0; is_cut_short(path, header); ++looks) {
        if (looks == 5) {
            refuse_casebook(path, "the casebook is damaged: its end is missing", "take the last good copy",
                            false);
        }
        std::this_thread::sleep_for(std::chrono::milliseconds(20));
    }
    return CasebookFile::casebook;
}

bool start_casebook(const Database& database, const std::string& now, const std::string& salt,
                    const std::string& salt_check) {
    // With SQLite's older journal, so that the file's first bytes say what it is from its first moment on.
    Transaction transaction(database);
    if (database.integer("SELECT count(*) FROM sqlite_master") != 0) {
        return false;
    }
    database.run(fmt::format("PRAGMA application_id = {}; PRAGMA user_version = {}", casebook_application,
                             casebook_form));
    for (const Part& part : tables) {
        database.run(std::string(part.sql));
    }
    for (const auto& [name, sql] : parts_of_casebook()) {
        if (sql.starts_with("CREATE TRIGGER")) {
            database.run(sql);
        }
    }
    Statement add(database, "INSERT INTO casebook VALUES(?, ?, ?)");
    add.bind(1, now);
    salt.empty() ? add.bind_nothing(2) : add.bind_bytes(2, salt);
    salt_check.empty() ? add.bind_nothing(3) : add.bind(3, salt_check);
    add.run();
    transaction.commit();
    return true;
}

void check_casebook(const Database& database, const std::string& path) {
    auto wanted = parts_of_casebook();
    Statement parts(database, "SELECT name, sql, type FROM sqlite_master");
    while (parts.step()) {
        const auto part = wanted.find(parts.text(0));
        if (part != wanted.end() && part->second == parts.text(1)) {
            wanted.erase(part);
        } else if (parts.text(2) == "trigger") {
            refuse_casebook(path, "the casebook holds a trigger that is not its own",
                            "take the last good copy", true);
        }
    }
    if (!wanted.empty()) {
        refuse_casebook(
            path,
            fmt::format("the tables are not those of a casebook: {} is missing or has been changed",
                        wanted.begin()->first),
            "take the last good copy", true);
    }
}

}  // namespace steelyard::cli
