// SPDX-License-Identifier: Apache-2.0
#pragma once
// Reading the keys of a mapping so that nothing is overlooked: what is asked for must be there and be of the
// right kind, and what nobody asked for is a fault, with the nearest known key as a hint.

#include <limits>
#include <optional>
#include <span>
#include <string>
#include <string_view>
#include <vector>

#include "steelyard/document/node.hpp"

namespace steelyard::document {

/// A number from a plain scalar: one leading `+` allowed, the whole text, locale-free, finite, not overflowed
/// and not underflowed to zero, in [low, high]. On a fault: not_a_number, not_finite or out_of_range at the
/// node, and empty. `what` names the value in the message (`rows.proximal.share`).
std::optional<double> read_number(const Node& node, std::string_view what, Diagnostics& faults,
                                  double low = -std::numeric_limits<double>::infinity(),
                                  double high = std::numeric_limits<double>::infinity());

/// The number written by all of `text`, by the same rules but without a fault list; empty if it is not one.
std::optional<double> number_from(std::string_view text) noexcept;

/// Non-empty text of a scalar.
std::optional<std::string> read_text_value(const Node& node, std::string_view what, Diagnostics& faults);

/// One of the given words.
std::optional<std::string> read_choice(const Node& node, std::string_view what,
                                       std::span<const std::string_view> choices, Diagnostics& faults);

/// A name of the formats: lower-case letters, digits and underscores, beginning with a letter.
std::optional<std::string> read_identifier(const Node& node, std::string_view what, Diagnostics& faults);
bool is_identifier(std::string_view text) noexcept;

/// Numbers of a sequence.
std::optional<std::vector<double>> read_numbers(const Node& node, std::string_view what, Diagnostics& faults,
                                                double low = -std::numeric_limits<double>::infinity(),
                                                double high = std::numeric_limits<double>::infinity());

/// Texts of a sequence; a single scalar is not a sequence.
std::optional<std::vector<std::string>> read_texts(const Node& node, std::string_view what,
                                                   Diagnostics& faults);

/// The closest of `known` to `word` by edit distance (at most a third of its length), or empty.
std::string nearest(std::string_view word, std::span<const std::string> known);

/// Reads a mapping key by key. Call `finish()` last: keys that were never asked for become `unknown_key`
/// faults.
class StrictMap {
  public:
    /// A fault (wrong_type) when the node is no mapping; every later call then finds nothing and stays
    /// silent.
    StrictMap(const Node& node, std::string what, Diagnostics& faults);

    bool usable() const noexcept { return node_ != nullptr; }
    const std::string& what() const noexcept { return what_; }
    /// The name of a key in messages: `what.key`, or `key` at the top.
    std::string name(std::string_view key) const;
    const Node* required(
        std::string_view key);  ///< missing_key at the mapping when absent; empty_value when null
    const Node* optional(std::string_view key);  ///< nullptr when absent; empty_value when present but null

    std::optional<double> required_number(std::string_view key,
                                          double low = -std::numeric_limits<double>::infinity(),
                                          double high = std::numeric_limits<double>::infinity());
    std::optional<double> optional_number(std::string_view key,
                                          double low = -std::numeric_limits<double>::infinity(),
                                          double high = std::numeric_limits<double>::infinity());
    std::optional<std::string> required_text(std::string_view key);
    std::optional<std::string> optional_text(std::string_view key);
    std::optional<std::string> required_choice(std::string_view key,
                                               std::span<const std::string_view> choices);
    std::optional<std::string> optional_choice(std::string_view key,
                                               std::span<const std::string_view> choices);

    /// The `format:` key, which must come first and equal `expected` (`steelyard.prior-set/1`); bad_format
    /// otherwise. True when the rest can be read as that format, even if the key does not come first.
    bool require_format(std::string_view expected);

    void finish();

  private:
    const Node* node_ = nullptr;
    std::string what_;
    Diagnostics& faults_;
    std::vector<std::string> known_;
};

}  // namespace steelyard::document
