// SPDX-License-Identifier: Apache-2.0
#include "steelyard/document/node.hpp"

#include <algorithm>
#include <array>

namespace steelyard::document {

SourcePosition Node::where() const {
    return {file ? *file : std::string(), line, column};
}

bool Node::is_null() const noexcept {
    // The spellings of YAML 1.2's core schema.
    constexpr std::array<std::string_view, 5> nulls{"", "~", "null", "Null", "NULL"};
    return kind == Kind::scalar && !quoted && std::find(nulls.begin(), nulls.end(), text) != nulls.end();
}

const Node* Node::find(std::string_view key) const noexcept {
    const auto found =
        std::find_if(entries.begin(), entries.end(), [key](const Entry& entry) { return entry.key == key; });
    return found == entries.end() ? nullptr : &found->value;
}

}  // namespace steelyard::document
