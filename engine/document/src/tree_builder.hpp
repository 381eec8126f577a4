// SPDX-License-Identifier: Apache-2.0
#pragma once
// Builds a Node tree from the events of a parser, YAML's or JSON's, under the limits and with unique keys.

#include <memory>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "steelyard/document/node.hpp"

namespace steelyard::document::detail {

/// Line and column, 1-based.
struct Place {
    int line = 0, column = 0;
};

class TreeBuilder {
  public:
    TreeBuilder(const std::string& file, const Limits& limits, Diagnostics& faults);

    // Each returns false when reading must stop; the fault is then recorded.
    [[nodiscard]] bool begin(Kind kind, Place place);  ///< a sequence or a mapping
    [[nodiscard]] bool scalar(std::string text, bool quoted, Place place);
    [[nodiscard]] bool key(std::string text, Place place);
    void end();  ///< of the sequence or mapping begun last

    /// In a mapping, before the next key.
    bool expects_key() const noexcept;
    /// In a mapping, after a key: where that key is.
    std::optional<Place> pending_key() const noexcept;
    bool in_sequence() const noexcept;
    /// A root value is there and every sequence and mapping has ended.
    bool complete() const noexcept { return root_ && open_.empty(); }

    void fault(Place place, Code code, std::string message, std::string hint = {});
    /// From here on the tree would mislead: it is dropped at the end, though reading goes on to find more
    /// faults.
    void spoil() noexcept { usable_ = false; }

    /// The tree, or empty when there is none to use.
    std::optional<Node> take();

  private:
    struct Frame {
        Node* node = nullptr;
        bool has_key = false;  ///< in a mapping: its last entry waits for a value
    };

    [[nodiscard]] Node* place_for_value(Place place);
    void refuse_duplicates(Node& mapping);

    std::shared_ptr<const std::string> file_;
    Limits limits_;
    Diagnostics& faults_;
    std::optional<Node> root_;
    std::vector<Frame> open_;
    std::size_t values_ = 0;
    bool usable_ = true;
};

/// Whether a read text has a control character other than tab and line ends, as escapes can smuggle one in.
bool has_control(std::string_view text) noexcept;

/// Each parser: false when reading stopped early; faults are in the builder's list.
bool parse_yaml(std::string_view text, TreeBuilder& tree);
bool parse_json(std::string_view text, TreeBuilder& tree);

}  // namespace steelyard::document::detail
