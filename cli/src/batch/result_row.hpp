// SPDX-License-Identifier: Apache-2.0
#pragma once
// The result of one case as a row of CSV.

#include <cstdint>
#include <string>
#include <string_view>
#include <vector>

#include "pattern_scorer.hpp"
#include "steelyard/likelihoods/point_reader.hpp"

namespace steelyard::cli {

class ResultRows {
  public:
    ResultRows(const likelihoods::TableSet& tables, const std::vector<WeighedCause>& causes,
               bool weigh_anyway);

    /// `case`, one column for each cause, `leader`, `gate`, `set_aside`, `urgent`, then those carried along.
    std::string header(const std::vector<std::string>& carried) const;

    /// What follows the case's name up to `set_aside`, with the comma before it: the same for every case of
    /// one pattern and gate.
    std::string pattern_part(std::string_view code, likelihoods::GateStatus gate) const;
    /// What `urgent` says: `serum_potassium low`, several parted by semicolons.
    std::string urgent_part(std::uint64_t urgent) const;
    bool is_weighed(likelihoods::GateStatus gate) const {
        return weigh_anyway_ || gate != likelihoods::GateStatus::out_of_scope;
    }

  private:
    const likelihoods::TableSet& tables_;
    PatternScorer scorer_;
    bool weigh_anyway_;
};

/// Rows of one thread: looks up what is shared, and first of all what it used itself before.
class RowWriter {
  public:
    RowWriter(const ResultRows& rows, SharedTexts& shared);
    /// Adds one row without its line end and without what is carried.
    void add(std::string& out, std::string_view case_id, const likelihoods::BatchReading& reading);

  private:
    void add_urgent(std::string& out, std::uint64_t urgent) const;

    struct Met {
        std::size_t hash = 0;
        const SharedTexts::Entry* entry = nullptr;
    };
    static constexpr std::size_t remembered = 32768;

    const ResultRows& rows_;
    SharedTexts& shared_;
    std::vector<Met> met_;
    std::string key_;
};

/// A field from outside; most are plain and go in as they are.
void add_csv_field(std::string& out, std::string_view text);

}  // namespace steelyard::cli
