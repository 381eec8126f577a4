// SPDX-License-Identifier: Apache-2.0
#pragma once
// Short forms for tests of the reader.

#include <optional>
#include <sstream>
#include <string>
#include <string_view>
#include <vector>

#include "steelyard/document/node.hpp"

namespace steelyard::test {

/// The tree of a text and the faults as `line:column code`, in order.
struct Reading {
    std::optional<document::Node> tree;
    document::Diagnostics list;
    std::vector<std::string> faults;
};

inline std::vector<std::string> brief(const document::Diagnostics& faults) {
    std::vector<std::string> lines;
    for (const document::Diagnostic& fault : faults.sorted()) {
        lines.push_back(std::to_string(fault.where.line) + ':' + std::to_string(fault.where.column) + ' ' +
                        std::string(document::to_string(fault.code)));
    }
    return lines;
}

inline Reading reading(std::string_view text, document::Syntax syntax = document::Syntax::yaml,
                       const document::Limits& limits = {}) {
    Reading result;
    result.tree = document::parse(text, "text", syntax, result.list, limits);
    result.faults = brief(result.list);
    return result;
}

inline std::string printed(const document::Diagnostics& faults) {
    std::ostringstream out;
    document::print(out, faults);
    return out.str();
}

/// A tree on one line, each value with its place: `1:1{a@1:1=1:4'x'}`; texts in quotes are shown in double
/// quotes.
inline std::string shown(const document::Node& node) {
    std::string text = std::to_string(node.line) + ':' + std::to_string(node.column);
    switch (node.kind) {
        case document::Kind::scalar:
            return text + (node.quoted ? '"' + node.text + '"' : '\'' + node.text + '\'');
        case document::Kind::sequence:
            text += '[';
            for (const document::Node& item : node.items) {
                text += (text.back() == '[' ? "" : " ") + shown(item);
            }
            return text + ']';
        case document::Kind::mapping:
            text += '{';
            for (const document::Entry& entry : node.entries) {
                text += (text.back() == '{' ? "" : " ") + entry.key + '@' + std::to_string(entry.line) + ':' +
                        std::to_string(entry.column) + '=' + shown(entry.value);
            }
            return text + '}';
    }
    return text;
}

}  // namespace steelyard::test
