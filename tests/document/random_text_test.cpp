// SPDX-License-Identifier: Apache-2.0
// Properties over random trees and random texts.
#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <algorithm>
#include <nlohmann/json.hpp>

#include "support.hpp"

namespace {

using namespace steelyard::document;  // NOLINT: a test of this room
using steelyard::test::printed;
using steelyard::test::reading;

/// A value to write: a tree without places.
struct Value {
    Kind kind = Kind::scalar;
    bool quoted = true;
    std::string text;
    std::vector<Value> items;
    std::vector<std::pair<std::string, Value>> entries;
};

/// Text with what readers trip over: signs of both syntaxes, escapes, blanks, letters of two and three bytes.
rc::Gen<std::string> any_text() {
    const auto piece = rc::gen::element<std::string>(
        "a", "B", "7", " ", "  ", "\n", "\t", "\"", "'", "\\", ":", ": ", "#", " #", "-", "- ", "[", "]", "{",
        "}", ",", "&", "*", "!", "%", "@", "<<", "~", "null", "é", "€", "😀", "...", "---", "?");
    return rc::gen::map(rc::gen::container<std::vector<std::string>>(piece),
                        [](const std::vector<std::string>& all) {
                            std::string text;
                            for (const std::string& part : all) {
                                text += part;
                            }
                            return text;
                        });
}

Value any_value(int depth) {
    Value value;
    const int form = *rc::gen::inRange(0, depth > 0 ? 5 : 2);
    if (form == 0) {
        value.text = *any_text();
    } else if (form == 1) {
        value.quoted = false;
        value.text = *rc::gen::element<std::string>("1", "-2.50", "1e3", "true", "false", "null", "0");
    } else if (form < 4) {
        value.kind = form == 2 ? Kind::sequence : Kind::mapping;
        const int size = *rc::gen::inRange(0, 4);
        for (int i = 0; i < size; ++i) {
            if (value.kind == Kind::sequence) {
                value.items.push_back(any_value(depth - 1));
            } else {
                value.entries.emplace_back(*any_text() + std::to_string(i), any_value(depth - 1));
            }
        }
    } else {
        value.text = "x";
    }
    return value;
}

std::string in_quotes(const std::string& text) {
    return nlohmann::json(text).dump();
}

/// Random blanks, which neither syntax minds between tokens in brackets.
std::string blanks() {
    return *rc::gen::element<std::string>("", " ", "  ", "\n ", "\r\n  ");
}

std::string as_json(const Value& value) {
    if (value.kind == Kind::scalar) {
        return value.quoted ? in_quotes(value.text) : value.text;
    }
    std::string text = value.kind == Kind::sequence ? "[" : "{";
    std::string comma;
    for (const Value& item : value.items) {
        text += comma + blanks() + as_json(item) + blanks();
        comma = ",";
    }
    for (const auto& [key, item] : value.entries) {
        text += comma + blanks() + in_quotes(key) + ":" + blanks() + as_json(item) + blanks();
        comma = ",";
    }
    return text + (value.kind == Kind::sequence ? "]" : "}");
}

/// Block YAML, each line after the first indented; the text ends with a line end.
std::string as_yaml(const Value& value, const std::string& indent) {
    const bool empty = value.items.empty() && value.entries.empty();
    if (value.kind == Kind::scalar || empty) {
        return " " + as_json(value) + "\n";
    }
    std::string text = "\n";
    for (const Value& item : value.items) {
        text += indent + "-" + as_yaml(item, indent + "  ");
        text += *rc::gen::element<std::string>("", "\n", "# c\n", "      # c\n");
    }
    for (const auto& [key, item] : value.entries) {
        text += indent + in_quotes(key) + ":" + as_yaml(item, indent + "   ");
    }
    return text;
}

void require_same(const Value& value, const Node& node) {
    RC_ASSERT(value.kind == node.kind);
    if (value.kind == Kind::scalar) {
        RC_ASSERT(value.text == node.text);
        RC_ASSERT(value.quoted == node.quoted);
    }
    RC_ASSERT(value.items.size() == node.items.size());
    for (std::size_t i = 0; i < value.items.size(); ++i) {
        require_same(value.items[i], node.items[i]);
    }
    RC_ASSERT(value.entries.size() == node.entries.size());
    for (std::size_t i = 0; i < value.entries.size(); ++i) {
        RC_ASSERT(value.entries[i].first == node.entries[i].key);
        require_same(value.entries[i].second, node.entries[i].value);
    }
}

std::vector<std::string> lines_of(std::string_view text) {
    std::vector<std::string> lines(1);
    for (const char c : text) {
        if (c == '\n') {
            lines.emplace_back();
        } else {
            lines.back() += c;
        }
    }
    return lines;
}

/// The character at a place: the first one of a token.
char at(const std::vector<std::string>& lines, int line, int column) {
    return lines.at(static_cast<std::size_t>(line) - 1).at(static_cast<std::size_t>(column) - 1);
}

/// Each place is that of the token: quotes, brackets and words stand where the tree says.
void require_places(const Node& node, const std::vector<std::string>& lines, bool flow) {
    const char first = at(lines, node.line, node.column);
    if (node.kind == Kind::scalar) {
        RC_ASSERT(first == (node.quoted ? '"' : node.text.front()));
    } else if (flow) {
        RC_ASSERT(first == (node.kind == Kind::sequence ? '[' : '{'));
    }
    for (const Node& item : node.items) {
        require_places(item, lines, flow);
    }
    for (const Entry& entry : node.entries) {
        RC_ASSERT(at(lines, entry.line, entry.column) == '"');
        require_places(entry.value, lines, flow);
    }
}

TEST(Parse, GivesBackARandomTreeWrittenAsJson) {
    EXPECT_TRUE(rc::check([] {
        const Value value = any_value(4);
        const std::string text = blanks() + as_json(value) + blanks();
        const auto result = reading(text, Syntax::json);
        RC_LOG() << text << '\n' << printed(result.list);
        RC_ASSERT(result.tree.has_value());
        RC_ASSERT(result.faults.empty());
        require_same(value, *result.tree);
        require_places(*result.tree, lines_of(text), true);
    }));
}

TEST(Parse, GivesBackARandomTreeWrittenAsYaml) {
    EXPECT_TRUE(rc::check([] {
        const Value value = any_value(4);
        const std::string text = as_yaml(value, "");
        const auto result = reading(text);
        RC_LOG() << text << '\n' << printed(result.list);
        RC_ASSERT(result.tree.has_value());
        RC_ASSERT(result.faults.empty());
        require_same(value, *result.tree);
        require_places(*result.tree, lines_of(text), false);
    }));
}

void require_inside(const Node& node, const std::vector<std::string>& lines) {
    const auto inside = [&lines](int line, int column) {
        return line >= 1 && line <= static_cast<int>(lines.size()) && column >= 1 &&
               column <= static_cast<int>(lines[static_cast<std::size_t>(line) - 1].size()) + 1;
    };
    RC_ASSERT(inside(node.line, node.column));
    for (const Node& item : node.items) {
        require_inside(item, lines);
    }
    for (const Entry& entry : node.entries) {
        RC_ASSERT(inside(entry.line, entry.column));
        require_inside(entry.value, lines);
    }
}

/// A tree or a fault, and every place inside the text.
void require_sound(const std::string& text, Syntax syntax) {
    const auto result = reading(text, syntax);
    RC_LOG() << in_quotes(nlohmann::json(text).dump(-1, ' ', true, nlohmann::json::error_handler_t::replace))
             << '\n'
             << printed(result.list);
    RC_ASSERT(result.tree.has_value() || !result.faults.empty());
    const std::vector<std::string> lines = lines_of(
        text.starts_with("\xEF\xBB\xBF") ? std::string_view(text).substr(3) : std::string_view(text));
    for (const Diagnostic& fault : result.list.sorted()) {
        Node place;
        place.line = fault.where.line;
        place.column = fault.where.column;
        require_inside(place, lines);
    }
    if (result.tree) {
        require_inside(*result.tree, lines);
    }
}

TEST(Parse, GivesATreeOrFaultsInsideTheTextForRandomBytes) {
    EXPECT_TRUE(rc::check([](const std::string& text) {
        require_sound(text, Syntax::yaml);
        require_sound(text, Syntax::json);
    }));
}

TEST(Parse, GivesATreeOrFaultsInsideTheTextForRandomSigns) {
    EXPECT_TRUE(rc::check([] {
        const std::string text = *any_text();
        require_sound(text, Syntax::yaml);
        require_sound(text, Syntax::json);
    }));
}

TEST(Parse, GivesATreeOrFaultsInsideTheTextWhenAGoodTextIsDamaged) {
    EXPECT_TRUE(rc::check([] {
        const Value value = any_value(3);
        const bool yaml = *rc::gen::arbitrary<bool>();
        std::string text = yaml ? as_yaml(value, "") : as_json(value);
        const std::string damage = *any_text();
        const auto place = *rc::gen::inRange<std::size_t>(0, text.size() + 1);
        const auto length = *rc::gen::inRange<std::size_t>(0, 4);
        text.replace(place, std::min(length, text.size() - place), damage);
        require_sound(text, yaml ? Syntax::yaml : Syntax::json);
    }));
}

}  // namespace
