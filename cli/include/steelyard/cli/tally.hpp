// SPDX-License-Identifier: Apache-2.0
#pragma once
// What an audit runs on: how many patients had which pattern of bands, which gate status, which final cause,
// in which stratum and month. Whole numbers only, so that any split of the cases over threads, files or
// machines adds up to the same tally, and to the same bytes when written. It holds no case, no name, no value
// and no date.

#include <cstdint>
#include <functional>
#include <map>
#include <optional>
#include <stdexcept>
#include <string>
#include <string_view>
#include <unordered_map>
#include <vector>

#include "steelyard/likelihoods/pattern_code.hpp"

namespace steelyard::cli {

/// Something that a tally cannot take, in words: too many different strata, or two tallies that do not belong
/// together.
class TallyError : public std::runtime_error {
  public:
    using std::runtime_error::runtime_error;
};

struct TalliedFinding {
    std::string id;
    int states = 0;  ///< of likelihoods::states_of()

    bool operator==(const TalliedFinding&) const = default;
};

/// What the cells of a tally mean. Tallies with the same head, versions apart, can be merged.
struct TallyHead {
    std::vector<std::string> versions;  ///< of the programs that read the cases; sorted, distinct
    std::string tables_title, tables_digest;
    std::string reading_digest;       ///< likelihoods::reading_digest() of the tables
    std::vector<std::string> causes;  ///< of the tables, in their order
    std::vector<TalliedFinding> findings;
    std::vector<std::string> by;   ///< columns whose values, joined by ` / `, are the strata; empty for none
    bool months = false;           ///< whether the month of each case is kept
    std::uint64_t least_cell = 1;  ///< cells of fewer patients have been dropped

    bool operator==(const TallyHead&) const = default;
};
/// The head of a tally read with these tables by this program.
TallyHead tally_head(const likelihoods::TableSet& tables, std::vector<std::string> by, bool months);

/// What became of every case. read = weighed + out_of_scope + set_aside, and weighed = diagnosed + outside +
/// undiagnosed, always; cells dropped later as too small are counted here still.
struct TallyFlow {
    std::uint64_t read = 0;
    std::uint64_t weighed = 0;
    std::uint64_t out_of_scope = 0;
    std::uint64_t set_aside = 0;    ///< could not be read
    std::uint64_t diagnosed = 0;    ///< weighed, with a final cause of the tables
    std::uint64_t outside = 0;      ///< weighed, with another final cause
    std::uint64_t undiagnosed = 0;  ///< weighed, without a final cause

    bool operator==(const TallyFlow&) const = default;
};

/// What the suppression of small cells has taken away. After a merge the sum over the parts: a cell lost in
/// two of them counts twice.
struct TallyLoss {
    std::uint64_t cells = 0;
    std::uint64_t patients = 0;

    bool operator==(const TallyLoss&) const = default;
};

/// One cell as seen from outside; the views last as long as the tally is not changed.
struct TallyCell {
    std::string_view code;
    likelihoods::GateStatus gate;  ///< in_scope or caution
    std::string_view cause;        ///< empty: no final cause
    std::string_view stratum;
    std::string_view month;  ///< `2025-03`; empty when not kept or not known
    std::uint64_t patients;
};

class Tally {
  public:
    /// Distinct final causes, strata or months beyond this are taken for a mistake: a column of names.
    static constexpr std::size_t most_words = 1000;
    /// The longest final cause or stratum [bytes].
    static constexpr std::size_t longest_word = 200;
    /// The most patients of a tally: a whole number that every reader of JSON keeps.
    static constexpr std::uint64_t most_patients = std::uint64_t{1} << 53U;

    explicit Tally(TallyHead head);

    const TallyHead& head() const noexcept { return head_; }
    TallyFlow flow() const noexcept;
    TallyLoss lost() const noexcept { return lost_; }
    /// Patients out of scope by final cause; less than flow().out_of_scope when small counts were dropped.
    const std::map<std::string, std::uint64_t, std::less<>>& out_of_scope() const noexcept {
        return out_of_scope_;
    }
    std::size_t cells() const noexcept { return counts_.size(); }

    /// Counts patients. Of those out of scope only the final cause is kept.
    /// @param code     as likelihoods::code_of() gives it   @param cause  a cause of the tables, any other
    ///                 final cause as written, or empty
    /// @param stratum  empty when none is kept, or none is known   @param month  `YYYY-MM`, or empty
    /// @throws TallyError  too many or too long words, not UTF-8, too many patients
    /// @throws std::invalid_argument  a code, month or stratum that the head does not allow
    void add(std::string_view code, likelihoods::GateStatus gate, std::string_view cause,
             std::string_view stratum = {}, std::string_view month = {}, std::uint64_t patients = 1);
    /// Counts rows that could not be read.
    void add_set_aside(std::uint64_t rows = 1);

    /// Adds another tally; in any order and grouping the result is the same.
    /// @throws TallyError  says in words what differs
    void merge(const Tally& other);

    /// The tally without cells, and without counts of patients out of scope, of fewer than `least` patients;
    /// what is lost is counted. docs/formats.md says what this protects and what not.
    Tally suppressed(std::uint64_t least) const;

    /// Every cell, in the order of the written file: by code in characters, gate, cause, stratum and month,
    /// each compared byte by byte.
    void for_each(const std::function<void(const TallyCell&)>& visit) const;

  private:
    friend class TallyReader;

    /// Words as small numbers.
    class Words {
      public:
        std::optional<std::size_t> find(std::string_view word) const;
        std::size_t append(std::string_view word);
        const std::vector<std::string>& list() const noexcept { return list_; }

      private:
        struct Hash {
            using is_transparent = void;
            std::size_t operator()(std::string_view text) const noexcept {
                return std::hash<std::string_view>{}(text);
            }
        };
        std::vector<std::string> list_;
        std::unordered_map<std::string, std::size_t, Hash, std::equal_to<>> numbers_;
    };
    struct KeyHash {
        std::size_t operator()(std::uint64_t key) const noexcept;
    };

    std::size_t word(Words& words, std::string_view text, const char* what);
    std::size_t code_number(std::string_view code);
    void count(std::uint64_t& total, std::uint64_t patients);
    std::vector<int> states() const;

    TallyHead head_;
    Words codes_, causes_, strata_, months_;
    std::unordered_map<std::uint64_t, std::uint64_t, KeyHash> counts_;
    std::map<std::string, std::uint64_t, std::less<>> out_of_scope_;
    std::uint64_t all_ = 0;  ///< rows counted, for the limit
    std::uint64_t out_of_scope_total_ = 0, set_aside_ = 0, diagnosed_ = 0, outside_ = 0, undiagnosed_ = 0;
    TallyLoss lost_;
};

}  // namespace steelyard::cli
