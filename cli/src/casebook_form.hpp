// SPDX-License-Identifier: Apache-2.0
#pragma once
// The form of a casebook: how it is told from other files, its tables, and what SQLite's errors mean for its
// user.

#include <string>

#include "database.hpp"

namespace steelyard::cli {

/// Marks the file as a casebook (SQLite's application_id): the letters StCb.
inline constexpr std::int64_t casebook_application = 0x53744362;
/// The form of its tables (SQLite's user_version).
inline constexpr std::int64_t casebook_form = 1;

/// What the first bytes of a file tell, before SQLite touches it.
enum class CasebookFile { absent, empty, casebook };

/// @param for_writing  whether the file was named as one to write to
/// @throws document::LoadError  it is no casebook, or of a newer form
/// @throws OutputError          named for writing, it is a folder or no file at all
CasebookFile inspect_casebook(const std::string& path, bool for_writing);

/// Whether a log or journal with something in it stands beside the file: then the file alone need not be
/// whole.
bool has_casebook_log(const std::string& path);

/// Makes the tables of a new casebook, unless another program has just done so; true when they were made.
/// @param salt, salt_check  how ids are hashed: both empty when they are not; `salt` empty when it is kept
/// apart
bool start_casebook(const Database& database, const std::string& now, const std::string& salt,
                    const std::string& salt_check);

/// That the tables are those of a casebook, and nothing was added that acts on its own. @throws
/// document::LoadError
void check_casebook(const Database& database, const std::string& path);

/// A casebook to read, in a folder where nothing may be written too. @throws DatabaseError,
/// document::LoadError
Database open_casebook_for_reading(const std::string& path, std::chrono::milliseconds wait);

/// A DatabaseError in words: OutputError or document::LoadError. @param waited  [s]
[[noreturn]] void tell_casebook_error(const DatabaseError& error, const std::string& path, bool for_writing,
                                      double waited);

/// The same as a fault of the file. @throws document::LoadError
[[noreturn]] void refuse_casebook(const std::string& path, const std::string& message,
                                  const std::string& hint, bool wrong_form);

}  // namespace steelyard::cli
