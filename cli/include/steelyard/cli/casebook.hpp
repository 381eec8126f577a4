// SPDX-License-Identifier: Apache-2.0
#pragma once
// A clinic's register in one file: what the program said of a case when it was weighed, and the final cause
// that was found later. docs/formats.md, "Casebook".

#include <chrono>
#include <cstddef>
#include <optional>
#include <string>
#include <vector>

namespace steelyard::cli {

/// How long a command waits for another one that is writing to the same casebook.
inline constexpr std::chrono::milliseconds casebook_patience = std::chrono::seconds(30);

/// A cause as it was weighed.
struct CauseAtTheTime {
    std::string cause;
    double prior = 0.0;      ///< probability, in full precision
    double posterior = 0.0;  ///< probability, in full precision
};

/// A final cause as it was entered.
struct CasebookOutcome {
    std::string final_cause;
    bool outside = false;  ///< none of the causes of the tables with which the case was recorded
    std::string entered;   ///< UTC, `2026-12-01T09:30:00Z`
    std::string why;       ///< of an amendment: the reason given; empty otherwise
};

/// One recording of a case, and what is known of the case since.
struct CasebookEntry {
    std::string case_id;    ///< the id, or its salted hash
    std::string recorded;   ///< UTC, `2026-12-01T09:30:00Z`
    std::size_t place = 1;  ///< of this recording among those of the case, from 1
    std::size_t of = 1;     ///< how many recordings the case has
    bool counts = true;     ///< this recording is the one that stands for its case, see read_casebook()

    std::string gate;                    ///< `in_scope`, `caution` or `out_of_scope`
    std::vector<CauseAtTheTime> causes;  ///< in the order of the tables; empty when the case was not weighed
    std::string pattern;                 ///< likelihoods::code_in_characters()

    std::string version;  ///< of the program
    std::string tables_title, tables_digest;
    std::string reading_digest;  ///< tables with the same one give the pattern the same meaning
    std::string priors_title, priors_digest;
    std::vector<std::string> tables_causes;  ///< all causes of the tables, weighed or not

    std::vector<CasebookOutcome> outcomes;  ///< in the order in which they were entered; the last one holds

    /// The final cause as it stands, or nullptr.
    const CasebookOutcome* outcome() const noexcept { return outcomes.empty() ? nullptr : &outcomes.back(); }
    /// The cause with the largest posterior, the first of equals, or nullptr.
    const CauseAtTheTime* leader() const noexcept;
};

/// One entry for each case, in the order in which cases were first recorded: the recording that stands for
/// the case, with its final cause. That is the first one that was weighed before any final cause was entered,
/// so that nothing learnt later can improve it, or the first recording when none was.
/// @throws document::LoadError  the file is missing, no casebook, of a newer form, or damaged
std::vector<CasebookEntry> read_casebook(const std::string& path,
                                         std::chrono::milliseconds wait = casebook_patience);

/// All recordings, in the order in which they were made; the same otherwise.
std::vector<CasebookEntry> read_recordings(const std::string& path,
                                           std::chrono::milliseconds wait = casebook_patience);

}  // namespace steelyard::cli
