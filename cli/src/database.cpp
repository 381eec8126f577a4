// SPDX-License-Identifier: Apache-2.0
#include "database.hpp"

#include <fmt/format.h>
#include <sqlite3.h>

#include <limits>

namespace steelyard::cli {
namespace {

/// A path as SQLite takes it for one: names such as `:memory:` would mean something else.
std::string plain_path(const std::string& path) {
    return path.starts_with('/') ? path : "./" + path;
}

/// The same as an address with a setting, every byte that could mean something written as its number.
std::string unchanging_address(const std::string& path) {
    constexpr std::string_view plain = "ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789-._/";
    std::string address = "file:";
    for (const char c : plain_path(path)) {
        if (plain.find(c) != std::string_view::npos) {
            address += c;
        } else {
            address += fmt::format("%{:02X}", static_cast<unsigned>(static_cast<unsigned char>(c)));
        }
    }
    return address + "?immutable=1";
}

int flags_of(Access access) {
    switch (access) {
        case Access::read_unchanging:
            return SQLITE_OPEN_READONLY | SQLITE_OPEN_URI;
        case Access::write_or_start:
            return SQLITE_OPEN_READWRITE | SQLITE_OPEN_CREATE;
        default:
            // A reader too asks for both: only then does it take away the files beside the casebook at its
            // end.
            return SQLITE_OPEN_READWRITE;
    }
}

[[noreturn]] void fail(sqlite3* connection, int code) {
    throw DatabaseError(code & 0xFF,
                        connection == nullptr ? sqlite3_errstr(code) : sqlite3_errmsg(connection));
}

int length_of(std::string_view text) {
    if (text.size() > static_cast<std::size_t>(std::numeric_limits<int>::max())) {
        throw DatabaseError(SQLITE_TOOBIG, "text too long");
    }
    return static_cast<int>(text.size());
}

}  // namespace

void Statement::Finalise::operator()(sqlite3_stmt* statement) const noexcept {
    sqlite3_finalize(statement);
}

Statement::Statement(const Database& database, std::string_view sql) : connection_(database.connection()) {
    sqlite3_stmt* statement = nullptr;
    check(sqlite3_prepare_v2(connection_, sql.data(), length_of(sql), &statement, nullptr));
    statement_.reset(statement);
}

void Statement::check(int code) const {
    if (code != SQLITE_OK) {
        fail(connection_, code);
    }
}

// The library copies what it is given (SQLITE_TRANSIENT is a cast that it defines itself).
Statement& Statement::bind(int place, std::string_view text) {
    check(sqlite3_bind_text(statement_.get(), place, text.data(), length_of(text),
                            SQLITE_TRANSIENT));  // NOLINT
    return *this;
}

Statement& Statement::bind(int place, double value) {
    check(sqlite3_bind_double(statement_.get(), place, value));
    return *this;
}

Statement& Statement::bind(int place, std::int64_t value) {
    check(sqlite3_bind_int64(statement_.get(), place, value));
    return *this;
}

Statement& Statement::bind_bytes(int place, std::string_view bytes) {
    check(sqlite3_bind_blob(statement_.get(), place, bytes.data(), length_of(bytes),
                            SQLITE_TRANSIENT));  // NOLINT
    return *this;
}

Statement& Statement::bind_nothing(int place) {
    check(sqlite3_bind_null(statement_.get(), place));
    return *this;
}

bool Statement::step() {
    const int code = sqlite3_step(statement_.get());
    if (code != SQLITE_ROW && code != SQLITE_DONE) {
        fail(connection_, code);
    }
    return code == SQLITE_ROW;
}

void Statement::run() {
    while (step()) {
    }
    reset();
}

void Statement::reset() noexcept {
    sqlite3_reset(statement_.get());
}

bool Statement::is_nothing(int column) const noexcept {
    return sqlite3_column_type(statement_.get(), column) == SQLITE_NULL;
}

std::string Statement::text(int column) const {
    const void* bytes = sqlite3_column_blob(statement_.get(), column);
    const int count = sqlite3_column_bytes(statement_.get(), column);
    return bytes == nullptr ? std::string()
                            : std::string(static_cast<const char*>(bytes), static_cast<std::size_t>(count));
}

double Statement::number(int column) const noexcept {
    return sqlite3_column_double(statement_.get(), column);
}

std::int64_t Statement::integer(int column) const noexcept {
    return sqlite3_column_int64(statement_.get(), column);
}

void Database::Close::operator()(sqlite3* connection) const noexcept {
    sqlite3_close(connection);
}

Database::Database(const std::string& path, Access access, std::chrono::milliseconds wait) {
    sqlite3* connection = nullptr;
    const std::string name = access == Access::read_unchanging ? unchanging_address(path) : plain_path(path);
    const int code = sqlite3_open_v2(name.c_str(), &connection, flags_of(access), nullptr);
    connection_.reset(connection);
    if (code != SQLITE_OK) {
        fail(connection, code);
    }
    sqlite3_busy_timeout(connection, static_cast<int>(wait.count()));
    sqlite3_db_config(connection, SQLITE_DBCONFIG_DEFENSIVE, 1, nullptr);       // NOLINT: the library's own
    sqlite3_db_config(connection, SQLITE_DBCONFIG_TRUSTED_SCHEMA, 0, nullptr);  // NOLINT
    if (access == Access::read || access == Access::read_unchanging) {
        run("PRAGMA query_only = ON");
    }
}

void Database::run(const std::string& sql) const {
    const int code = sqlite3_exec(connection_.get(), sql.c_str(), nullptr, nullptr, nullptr);
    if (code != SQLITE_OK) {
        fail(connection_.get(), code);
    }
}

std::int64_t Database::integer(std::string_view sql) const {
    Statement statement(*this, sql);
    return statement.step() ? statement.integer(0) : 0;
}

std::string Database::text(std::string_view sql) const {
    Statement statement(*this, sql);
    return statement.step() ? statement.text(0) : std::string();
}

bool Database::is_read_only() const noexcept {
    return sqlite3_db_readonly(connection_.get(), "main") == 1;
}

std::int64_t Database::last_id() const noexcept {
    return sqlite3_last_insert_rowid(connection_.get());
}

Transaction::Transaction(const Database& database) : database_(database) {
    database_.run("BEGIN IMMEDIATE");
}

Transaction::~Transaction() {
    if (open_) {
        // What cannot be rolled back here is rolled back by the next who opens the file.
        sqlite3_exec(database_.connection(), "ROLLBACK", nullptr, nullptr, nullptr);
    }
}

void Transaction::commit() {
    database_.run("COMMIT");
    open_ = false;
}

}  // namespace steelyard::cli
