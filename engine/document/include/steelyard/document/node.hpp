// SPDX-License-Identifier: Apache-2.0
#pragma once
// A read document as a tree of values, each of which knows where it stands in the text.

#include <memory>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "steelyard/document/diagnostic.hpp"

namespace steelyard::document {

enum class Kind { scalar, sequence, mapping };

struct Entry;

/// One value. A scalar keeps its text as written; quoted scalars are text even when they look like numbers.
class Node {
  public:
    Kind kind = Kind::scalar;
    bool quoted = false;                      ///< a scalar in quotes (or a JSON string)
    std::string text;                         ///< of a scalar
    std::vector<Node> items;                  ///< of a sequence
    std::vector<Entry> entries;               ///< of a mapping, in order of the text; keys are unique
    int line = 0, column = 0;                 ///< 1-based
    std::shared_ptr<const std::string> file;  ///< shared by all nodes of a document

    SourcePosition where() const;
    bool is_null() const noexcept;  ///< an empty plain scalar, `~` or `null`
    /// The value at a key of a mapping, or nullptr.
    const Node* find(std::string_view key) const noexcept;
};

struct Entry {
    std::string key;
    int line = 0, column = 0;  ///< of the key
    Node value;
};

/// Caps on what is read; anything larger is refused before a tree is built.
struct Limits {
    std::size_t bytes = std::size_t{8} * 1024 * 1024;
    int depth = 24;
    std::size_t values = 500'000;
};

enum class Syntax { yaml, json };

/// JSON for names ending in .json, YAML for names ending in .yaml or .yml (flow style begins with a bracket
/// too). Under other names, as for standard input, JSON for text that begins with `{` or `[` and YAML
/// otherwise.
Syntax syntax_of(std::string_view file_name, std::string_view text);

/// Reads one document strictly: UTF-8 without control characters (a byte order mark is skipped), one
/// document, no anchors, aliases, tags, merge keys, `%` lines or duplicate keys, within the limits. Faults go
/// to `faults`, and the text is remembered there. The result is empty when there is no usable tree; after a
/// duplicate key, an anchor or a tag there is one (the first of the keys stays), so that a reader can go on
/// and report its own faults too. An empty value stands at its key, or at the dash of its list item. Nothing
/// is thrown on any text.
std::optional<Node> parse(std::string_view text, const std::string& file, Syntax syntax, Diagnostics& faults,
                          const Limits& limits = {});

/// The text of a file, or of standard input for `-`; a fault and empty when it cannot be read or is over the
/// limit.
std::optional<std::string> read_text(const std::string& path, Diagnostics& faults, const Limits& limits = {});

}  // namespace steelyard::document
