// SPDX-License-Identifier: Apache-2.0
#pragma once
// SQLite behind two types that close what they open. Errors are exceptions with SQLite's code, so that who
// opened the file can say in words what they mean for its user.

#include <chrono>
#include <cstdint>
#include <memory>
#include <optional>
#include <stdexcept>
#include <string>
#include <string_view>

struct sqlite3;
struct sqlite3_stmt;

namespace steelyard::cli {

class DatabaseError : public std::runtime_error {
  public:
    DatabaseError(int code, const std::string& message) : std::runtime_error(message), code_(code) {}
    /// SQLite's primary result code.
    int code() const noexcept { return code_; }

  private:
    int code_;
};

enum class Access {
    read,             ///< what is there; nothing is written
    read_unchanging,  ///< the same where no file may be made beside it: nobody else may write meanwhile
    write,            ///< a file that is there
    write_or_start    ///< the file is made when it is not there
};

class Database;

/// A prepared statement: bound, stepped through, used again.
class Statement {
  public:
    /// @throws DatabaseError
    Statement(const Database& database, std::string_view sql);

    Statement& bind(int place, std::string_view text);
    Statement& bind(int place, double value);
    Statement& bind(int place, std::int64_t value);
    Statement& bind_bytes(int place, std::string_view bytes);
    Statement& bind_nothing(int place);

    /// The next row; false at the end. @throws DatabaseError
    bool step();
    /// Runs to the end and makes the statement ready to be used again. @throws DatabaseError
    void run();
    void reset() noexcept;

    bool is_nothing(int column) const noexcept;
    std::string text(int column) const;  ///< text or bytes
    double number(int column) const noexcept;
    std::int64_t integer(int column) const noexcept;

  private:
    struct Finalise {
        void operator()(sqlite3_stmt* statement) const noexcept;
    };
    void check(int code) const;

    sqlite3* connection_;
    std::unique_ptr<sqlite3_stmt, Finalise> statement_;
};

/// A connection to one file. Triggers and views of a file made by others cannot call functions that do harm.
class Database {
  public:
    /// @param wait  for a lock that another program holds
    /// @throws DatabaseError
    Database(const std::string& path, Access access, std::chrono::milliseconds wait);

    /// Runs statements that return nothing. @throws DatabaseError
    void run(const std::string& sql) const;
    /// The first column of the only row of a query. @throws DatabaseError
    std::int64_t integer(std::string_view sql) const;
    std::string text(std::string_view sql) const;
    bool is_read_only() const noexcept;
    std::int64_t last_id() const noexcept;  ///< of the row added last
    sqlite3* connection() const noexcept { return connection_.get(); }

  private:
    struct Close {
        void operator()(sqlite3* connection) const noexcept;
    };
    std::unique_ptr<sqlite3, Close> connection_;
};

/// One transaction that may write: everything since its start is kept by commit() or never was.
class Transaction {
  public:
    /// Waits until nobody else writes. @throws DatabaseError
    explicit Transaction(const Database& database);
    Transaction(const Transaction&) = delete;
    Transaction& operator=(const Transaction&) = delete;
    Transaction(Transaction&&) = delete;
    Transaction& operator=(Transaction&&) = delete;
    ~Transaction();
    /// Returns when the disk has it. @throws DatabaseError
    void commit();

  private:
    const Database& database_;
    bool open_ = true;
};

}  // namespace steelyard::cli
