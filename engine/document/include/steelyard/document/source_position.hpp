// SPDX-License-Identifier: Apache-2.0
#pragma once
// Where in a text something stands. Lines and columns are 1-based; a column counts bytes, not characters.

#include <compare>
#include <string>

namespace steelyard::document {

struct SourcePosition {
    std::string file;  ///< path as the user gave it, `-` for standard input, `shipped:...` for built-in files
    int line = 0;      ///< 1-based; 0 when the fault belongs to the file as a whole
    int column = 0;    ///< 1-based, in bytes; 0 when the fault belongs to the file as a whole

    auto operator<=>(const SourcePosition&) const = default;
};

/// `file:line:column`, or just `file` when there is no line.
std::string to_string(const SourcePosition& position);

}  // namespace steelyard::document
