// SPDX-License-Identifier: Apache-2.0
#include "steelyard/document/strict_map.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <iterator>

namespace steelyard::document {

namespace {
std::string_view kind_name(const Node& node) noexcept {
    switch (node.kind) {
        case Kind::sequence:
            return "a list";
        case Kind::mapping:
            return "a mapping";
        case Kind::scalar:
            break;
    }
    return node.is_null() ? "empty" : "a single value";
}

std::string joined(std::span<const std::string> words) {
    return fmt::format("{}", fmt::join(words.begin(), words.end(), ", "));
}
}  // namespace

std::optional<std::string> read_text_value(const Node& node, std::string_view what, Diagnostics& faults) {
    if (node.kind != Kind::scalar) {
        faults.add(node.where(), Code::wrong_type,
                   fmt::format("{} is {}, but must be a text", what, kind_name(node)));
        return std::nullopt;
    }
    if (node.is_null() || node.text.empty()) {
        faults.add(node.where(), Code::empty_value, fmt::format("{} is empty", what));
        return std::nullopt;
    }
    return node.text;
}

std::optional<std::string> read_choice(const Node& node, std::string_view what,
                                       std::span<const std::string_view> choices, Diagnostics& faults) {
    std::optional<std::string> word = read_text_value(node, what, faults);
    if (!word || std::find(choices.begin(), choices.end(), *word) != choices.end()) {
        return word;
    }
    const std::vector<std::string> known(choices.begin(), choices.end());
    const std::string close = nearest(*word, known);
    faults.add(node.where(), Code::bad_choice,
               fmt::format("{} is \"{}\", but must be one of {}", what, *word, joined(known)),
               close.empty() ? std::string() : fmt::format("did you mean {}?", close));
    return std::nullopt;
}

bool is_identifier(std::string_view text) noexcept {
    const auto is_letter = [](char c) { return c >= 'a' && c <= 'z'; };
    return !text.empty() && is_letter(text.front()) && std::all_of(text.begin(), text.end(), [&](char c) {
        return is_letter(c) || (c >= '0' && c <= '9') || c == '_';
    });
}

std::optional<std::string> read_identifier(const Node& node, std::string_view what, Diagnostics& faults) {
    std::optional<std::string> name = read_text_value(node, what, faults);
    if (name && !is_identifier(*name)) {
        faults.add(node.where(), Code::bad_identifier,
                   fmt::format("{} is \"{}\", which is not a name", what, *name),
                   "a name has lower-case letters, digits and underscores, and begins with a letter");
        return std::nullopt;
    }
    return name;
}

std::optional<std::vector<std::string>> read_texts(const Node& node, std::string_view what,
                                                   Diagnostics& faults) {
    if (node.kind != Kind::sequence) {
        faults.add(node.where(), Code::wrong_type,
                   fmt::format("{} is {}, but must be a list of texts", what, kind_name(node)),
                   "write the texts in brackets, [one, two]");
        return std::nullopt;
    }
    std::vector<std::string> texts;
    bool sound = true;
    for (std::size_t i = 0; i < node.items.size(); ++i) {
        std::optional<std::string> text =
            read_text_value(node.items[i], fmt::format("{}[{}]", what, i + 1), faults);
        sound = sound && text;
        texts.push_back(std::move(text).value_or(std::string()));
    }
    return sound ? std::optional(std::move(texts)) : std::nullopt;
}

StrictMap::StrictMap(const Node& node, std::string what, Diagnostics& faults)
    : what_(std::move(what)), faults_(faults) {
    if (node.kind == Kind::mapping) {
        node_ = &node;
        return;
    }
    faults_.add(node.where(), Code::wrong_type,
                fmt::format("{} is {}, but must be a mapping of keys to values",
                            what_.empty() ? "the document" : what_, kind_name(node)));
}

std::string StrictMap::name(std::string_view key) const {
    return what_.empty() ? std::string(key) : fmt::format("{}.{}", what_, key);
}

const Node* StrictMap::required(std::string_view key) {
    if (!usable()) {
        return nullptr;
    }
    if (node_->find(key) == nullptr) {
        known_.emplace_back(key);
        faults_.add(node_->where(), Code::missing_key, fmt::format("the key {} is missing", name(key)));
        return nullptr;
    }
    return optional(key);
}

const Node* StrictMap::optional(std::string_view key) {
    if (!usable()) {
        return nullptr;
    }
    known_.emplace_back(key);
    const Node* value = node_->find(key);
    if (value != nullptr && value->is_null()) {
        faults_.add(value->where(), Code::empty_value, fmt::format("{} is empty", name(key)),
                    "give it a value, or leave the key out if it may be left out");
        return nullptr;
    }
    return value;
}

std::optional<double> StrictMap::required_number(std::string_view key, double low, double high) {
    const Node* value = required(key);
    return value == nullptr ? std::nullopt : read_number(*value, name(key), faults_, low, high);
}

std::optional<double> StrictMap::optional_number(std::string_view key, double low, double high) {
    const Node* value = optional(key);
    return value == nullptr ? std::nullopt : read_number(*value, name(key), faults_, low, high);
}

std::optional<std::string> StrictMap::required_text(std::string_view key) {
    const Node* value = required(key);
    return value == nullptr ? std::nullopt : read_text_value(*value, name(key), faults_);
}

std::optional<std::string> StrictMap::optional_text(std::string_view key) {
    const Node* value = optional(key);
    return value == nullptr ? std::nullopt : read_text_value(*value, name(key), faults_);
}

std::optional<std::string> StrictMap::required_choice(std::string_view key,
                                                      std::span<const std::string_view> choices) {
    const Node* value = required(key);
    return value == nullptr ? std::nullopt : read_choice(*value, name(key), choices, faults_);
}

std::optional<std::string> StrictMap::optional_choice(std::string_view key,
                                                      std::span<const std::string_view> choices) {
    const Node* value = optional(key);
    return value == nullptr ? std::nullopt : read_choice(*value, name(key), choices, faults_);
}

bool StrictMap::require_format(std::string_view expected) {
    if (!usable()) {
        return false;
    }
    known_.emplace_back("format");
    const std::string hint = fmt::format("the first line must be `format: {}`", expected);
    const Node* value = node_->find("format");
    if (value == nullptr) {
        faults_.add(node_->where(), Code::bad_format, "the file does not say its format", hint);
        return false;
    }
    if (value->kind != Kind::scalar || value->text != expected) {
        faults_.add(value->where(), Code::bad_format,
                    value->kind == Kind::scalar
                        ? fmt::format("the format is \"{}\", but must be {}", value->text, expected)
                        : fmt::format("the format is {}, but must be {}", kind_name(*value), expected));
        return false;
    }
    const Entry& first = node_->entries.front();
    if (first.key != "format") {
        faults_.add({value->where().file, first.line, first.column}, Code::bad_format,
                    fmt::format("the key {} comes before format", first.key), hint);
    }
    return true;
}

void StrictMap::finish() {
    if (!usable()) {
        return;
    }
    for (const Entry& entry : node_->entries) {
        if (std::find(known_.begin(), known_.end(), entry.key) != known_.end()) {
            continue;
        }
        // A key already given is no help, unless nothing else is close.
        std::vector<std::string> absent;
        std::copy_if(known_.begin(), known_.end(), std::back_inserter(absent),
                     [this](const std::string& key) { return node_->find(key) == nullptr; });
        const std::string close = nearest(entry.key, absent);
        faults_.add({node_->where().file, entry.line, entry.column}, Code::unknown_key,
                    fmt::format("the key {} is not known here", name(entry.key)),
                    close.empty() ? fmt::format("known keys: {}", joined(known_))
                                  : fmt::format("did you mean {}?", close));
    }
}

}  // namespace steelyard::document
