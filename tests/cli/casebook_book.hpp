// SPDX-License-Identifier: Apache-2.0
#pragma once
// A casebook of a test, and cases to put into it.

#include <sqlite3.h>

#include <string>
#include <vector>

#include "run_here.hpp"

namespace steelyard::test {

/// A case in scope, in which classic distal acidosis leads.
inline std::string case_text(const std::string& id) {
    return "case: " + id +
           "\nserum: {sodium: 140 mmol/L, potassium: 2.9 mmol/L, chloride: 116 mmol/L, bicarbonate: 14 "
           "mmol/L, "
           "albumin: 40 g/L}\narterial: {ph: 7.28, pco2: 30 mmHg}\nurine: {ph: 6.9, sodium: 62 mmol/L}\n";
}

/// The same without an acidosis: out of scope.
inline std::string case_out_of_scope(const std::string& id) {
    return "case: " + id +
           "\nserum: {sodium: 140 mmol/L, potassium: 4.1 mmol/L, chloride: 104 mmol/L, "
           "bicarbonate: 26 mmol/L}\n";
}

/// A folder with a casebook in it that need not exist yet.
class Book {
  public:
    std::string path() const { return dir_.file("ward.casebook"); }
    const WorkDir& dir() const { return dir_; }

    Outcome record(const std::string& text, std::vector<std::string> options = {}) const {
        options.insert(options.begin(),
                       {"casebook", "record", dir_.write("cases.yaml", text), "--casebook", path()});
        return run_here(options);
    }
    Outcome outcome(std::vector<std::string> words) const {
        words.insert(words.begin(), {"casebook", "outcome", "--casebook", path()});
        return run_here(words);
    }
    /// Final causes from a file `o.csv`.
    Outcome outcomes(const std::string& text, std::vector<std::string> words = {}) const {
        words.insert(words.begin(), {"--from", dir_.write("o.csv", text)});
        return outcome(words);
    }
    Outcome list(std::vector<std::string> options = {}) const {
        options.insert(options.begin(), {"casebook", "list", "--casebook", path()});
        return run_here(options);
    }
    Outcome exported(std::vector<std::string> options = {}) const {
        options.insert(options.begin(), {"casebook", "export", "--casebook", path()});
        return run_here(options);
    }

  private:
    WorkDir dir_{quick_folder()};
};

/// Runs SQL on a file as any SQLite program would; false when SQLite refuses.
inline bool sql(const std::string& path, const std::string& statements) {
    sqlite3* connection = nullptr;
    const bool done = sqlite3_open(path.c_str(), &connection) == SQLITE_OK &&
                      sqlite3_exec(connection, statements.c_str(), nullptr, nullptr, nullptr) == SQLITE_OK;
    sqlite3_close(connection);
    return done;
}

/// The first column of the first row, as text.
inline std::string sql_text(const std::string& path, const std::string& query) {
    sqlite3* connection = nullptr;
    sqlite3_stmt* statement = nullptr;
    std::string text = "no row";
    if (sqlite3_open(path.c_str(), &connection) == SQLITE_OK &&
        sqlite3_prepare_v2(connection, query.c_str(), -1, &statement, nullptr) == SQLITE_OK &&
        sqlite3_step(statement) == SQLITE_ROW) {
        const unsigned char* value = sqlite3_column_text(statement, 0);
        text =
            value == nullptr ? "null" : reinterpret_cast<const char*>(value);  // NOLINT: the library's text
    }
    sqlite3_finalize(statement);
    sqlite3_close(connection);
    return text;
}

}  // namespace steelyard::test
