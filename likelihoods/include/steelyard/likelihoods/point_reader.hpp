// SPDX-License-Identifier: Apache-2.0
#pragma once
// The quick way from a panel to its pattern, gate and urgent values, for a panel in which every value is a
// plain number: the same rules as derive(), gate(), read_pattern() and urgent_values(), without their words.
// Of a million cases nearly all can be read so; the others (`<5`, a formula without a value) are read the
// general way, and a test holds the two ways equal.

#include <cstdint>
#include <limits>
#include <memory>
#include <string>
#include <string_view>
#include <vector>

#include "steelyard/likelihoods/pattern_code.hpp"

namespace steelyard::likelihoods {

/// Quantities by number: analytes first, in their order, then the derived ones in theirs.
int quantity_count();
/// -1 when the id is no quantity.
int quantity_number(std::string_view id) noexcept;

inline constexpr double not_known = std::numeric_limits<double>::quiet_NaN();

/// A panel as numbers.
struct PointPanel {
    std::vector<double> value;        ///< by number of the quantity [canonical unit]; not_known
    std::vector<std::int16_t> level;  ///< by number of the feature; -1 when not known
    double age = not_known;           ///< [a]
    Sex sex = Sex::unknown;
};

/// What batch work needs to know of a panel.
struct BatchReading {
    PatternCode code;
    GateStatus gate = GateStatus::in_scope;
    /// Bit 2i: the low limit i of the set is reached; bit 2i + 1: its high limit.
    std::uint64_t urgent = 0;

    bool operator==(const BatchReading&) const = default;
};

/// The same of a panel read the general way.
BatchReading batch_reading(const TableSet& set, const Pattern& pattern, const GateResult& gate,
                           const std::vector<UrgentValue>& urgent);

/// Reads panels of one table set, one after another. Not for use by several threads at once.
class PointReader {
  public:
    /// Whether a set can be read this way at all: it has at most 32 urgent limits.
    static bool can_read(const TableSet& set);

    explicit PointReader(const TableSet& set);
    PointReader(PointReader&&) noexcept;
    PointReader& operator=(PointReader&&) noexcept;
    PointReader(const PointReader&) = delete;
    PointReader& operator=(const PointReader&) = delete;
    ~PointReader();

    /// A panel with nothing known, of the right sizes.
    PointPanel empty_panel() const;
    /// By the names of the set's vocabulary; -1 when there is none.
    int feature_number(std::string_view feature) const noexcept;
    int level_number(int feature, std::string_view level) const noexcept;

    /// @param panel    computed quantities are added to it
    /// @param reading  filled when true is returned
    /// @returns false  when this panel must be read the general way
    bool read(PointPanel& panel, BatchReading& reading);

  private:
    class Impl;
    std::unique_ptr<Impl> impl_;
};

}  // namespace steelyard::likelihoods
