// SPDX-License-Identifier: Apache-2.0
#pragma once
// Panels made up so that they read into given bands: the inverse of read_pattern(), for simulated cases.
// docs/method.md, "Simulated cases".

#include <span>
#include <string>
#include <string_view>
#include <vector>

#include "steelyard/likelihoods/pattern.hpp"
#include "steelyard/likelihoods/point_reader.hpp"

namespace steelyard::likelihoods {

/// For each table of a set, in its order, the band that a case is to show (of a joint table the cell), or
/// `left_out`.
using BandsToShow = std::vector<int>;
inline constexpr int left_out = -1;

struct MadePanel {
    Panel panel;
    BandsToShow shown;  ///< as asked, less the findings that a condition of use keeps from being read
    GateStatus gate{};  ///< what the gate says of the panel
    bool is_direct =
        false;  ///< no set of analytes met all bands: every derived quantity shown is given itself
};

/// An entry that a made panel may have: its flat name and, where a number is written with one, its unit
/// (UCUM).
struct PanelEntry {
    std::string name;
    std::string_view unit;
};

/// Makes panels for one table set.
///
/// A band is met by a value on the decimals of its laboratory, uniform in the band; the open end of a first
/// or last band has a sensible outer limit. A derived quantity is met by solving its formula for one analyte,
/// the others being drawn from sensible ranges within the conditions of use; where that cannot be done it is
/// given itself. Whether a finding is kept from being read depends on the values of other findings that are
/// read and on what no table reads, never on its own band. The gate finds an acidosis with a normal gap
/// wherever the bands allow it.
class PanelMaker {
  public:
    /// @param drawn  one per table: whether cases may show it
    /// @throws std::invalid_argument  a band lies outside of what a case may state, or `drawn` has another
    /// length
    PanelMaker(const TableSet& set, std::vector<bool> drawn);

    /// How many uniform numbers a case takes.
    std::size_t numbers() const noexcept;

    /// @param bands    one per table: a band of it, or left_out (always for a table that is not drawn)
    /// @param numbers  uniform in (0, 1), as many as numbers(); a value depends only on its own one and on
    /// the bands
    /// @param reader   of the same set, to check the panel more quickly; null for the general way
    /// @throws std::invalid_argument  wrong lengths or bands
    /// @throws std::logic_error       no panel that reads so was found: a fault of this program
    MadePanel make(std::string case_id, const BandsToShow& bands, std::span<const double> numbers,
                   PointReader* reader = nullptr) const;

    /// Drawn findings that no case can show, because their conditions contradict those of other findings or
    /// lead back to themselves.
    const std::vector<std::string>& never_shown() const noexcept { return never_shown_; }

    /// Every entry that a made panel may have, in the order of reports: analytes, derived quantities,
    /// features.
    const std::vector<PanelEntry>& entries() const noexcept { return entries_; }

  private:
    class Making;

    struct Bounds {
        double low = 0.0, high = 0.0;
        bool high_open = false;
        bool low_open = false;
    };
    /// A finding to show, or one member of a joint table.
    struct Part {
        std::string id;
        int quantity = -1;  ///< index of the quantity; -1 for a feature
        std::vector<double> edges;
        std::vector<std::string> levels;
    };
    /// A condition of use, with what it is about.
    struct Asked {
        const Condition* condition = nullptr;
        int quantity = -1;      ///< index of the quantity; -1 for a feature
        bool is_shown = false;  ///< a table reads its subject
    };
    struct Plan {
        std::vector<Part> parts;
        std::vector<Asked> asked;
    };

    /// Whether a panel shows what was wanted; then also what the gate says of it.
    bool shows(MadePanel& made, PointReader* reader) const;
    bool fits(const Asked& asked, std::vector<Bounds>& bounds);
    void settle_conditions();
    void settle_order();
    void check_bands() const;
    void list_entries();

    const TableSet& set_;
    std::vector<bool> drawn_;
    std::vector<Plan> plans_;          ///< per table
    std::vector<bool> read_by_table_;  ///< per quantity: some table reads it
    std::vector<int> derived_read_;    ///< the derived quantities among them
    std::vector<Bounds> bounds_;       ///< per quantity: what conditions of use allow
    std::map<std::string, std::string, std::less<>> required_levels_;  ///< of features that no table reads
    std::vector<std::size_t> order_;  ///< tables in the order in which a case is made
    std::vector<std::string> never_shown_;
    std::vector<PanelEntry> entries_;
};

}  // namespace steelyard::likelihoods
