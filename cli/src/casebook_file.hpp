// SPDX-License-Identifier: Apache-2.0
#pragma once
// The casebook as a file: what may be written to it, in one transaction for each command.

#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "database.hpp"
#include "steelyard/cli/casebook.hpp"

namespace steelyard::cli {

/// What all recordings of one run have in common.
struct CasebookSource {
    std::string version;
    std::string tables_title, tables_digest, reading_digest;
    std::string priors_title, priors_digest;
    std::vector<std::string> tables_causes;
};

/// One case as it is recorded.
struct Recording {
    std::string case_id;
    std::string gate;
    std::string pattern;
    std::vector<CauseAtTheTime> causes;  ///< empty when it was not weighed
};

/// How a casebook is opened for writing.
struct CasebookOpening {
    std::string path;
    std::chrono::milliseconds wait = casebook_patience;
    bool may_start = false;  ///< make it when there is none
    bool salted =
        false;  ///< ids are hashed: what a new casebook is told, and what an old one must agree with
    std::string salt_file;  ///< where the salt is kept apart from the casebook; empty: inside it
};

/// A casebook open for writing, inside one transaction. Nothing is kept unless commit() returns.
class CasebookWriter {
  public:
    /// @throws OutputError           the file cannot be made or written, or stays locked
    /// @throws document::LoadError   it is no casebook, of a newer form, or damaged; its salt is not that of
    /// the file
    /// @throws UsageError            `salted` or `salt_file` do not go with this casebook
    explicit CasebookWriter(CasebookOpening opening);

    bool was_started() const noexcept { return started_; }
    /// The id as this casebook keeps it: itself, or its salted hash.
    std::string kept_id(std::string_view case_id) const;

    /// How often a case was recorded, and whether it has a final cause.
    struct Known {
        std::int64_t recordings = 0;
        std::optional<std::string> final_cause;
        std::vector<std::string> causes;  ///< of the tables with which it was recorded
    };
    Known known(std::string_view case_id);
    /// Ids of all cases; hashes where ids are hashed.
    std::vector<std::string> case_ids();
    bool ids_are_hashed() const noexcept { return !salt_.empty(); }

    void record(const CasebookSource& source, const Recording& recording);
    /// @param why  the reason of an amendment; empty for a first final cause, which the case must not have
    /// yet
    void add_outcome(std::string_view case_id, const std::string& cause, bool outside,
                     const std::string& why);

    /// Cases in all, and those without a final cause.
    struct Counts {
        std::int64_t cases = 0, open = 0;
    };
    Counts counts();

    void commit();

  private:
    CasebookOpening opening_;
    std::string now_;
    std::string salt_;
    bool started_ = false;
    std::optional<Database> database_;
    std::optional<Transaction> transaction_;
};

/// Where the ids of an open casebook are hashed, the hash of an id, otherwise the id itself: to find a case
/// in what read_casebook() returned. @throws as CasebookWriter
std::vector<std::string> kept_ids(const std::string& path, const std::string& salt_file,
                                  const std::vector<std::string>& case_ids, std::chrono::milliseconds wait);

}  // namespace steelyard::cli
