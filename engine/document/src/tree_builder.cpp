// SPDX-License-Identifier: Apache-2.0
#include "tree_builder.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <numeric>

#include "utf8.hpp"

namespace steelyard::document::detail {

TreeBuilder::TreeBuilder(const std::string& file, const Limits& limits, Diagnostics& faults)
    : file_(std::make_shared<const std::string>(file)), limits_(limits), faults_(faults) {}

void TreeBuilder::fault(Place place, Code code, std::string message, std::string hint) {
    faults_.add({*file_, place.line, place.column}, code, std::move(message), std::move(hint));
}

// Pointers in open_ stay good: a node's siblings are added only after it has ended.
Node* TreeBuilder::place_for_value(Place place) {
    if (++values_ > limits_.values) {
        fault(place, Code::too_many_values, fmt::format("the text holds more than {} values", limits_.values),
              "split it into several files");
        spoil();
        return nullptr;
    }
    Node* node = nullptr;
    if (open_.empty()) {
        node = &root_.emplace();
    } else if (Frame& frame = open_.back(); frame.node->kind == Kind::sequence) {
        node = &frame.node->items.emplace_back();
    } else {
        node = &frame.node->entries.back().value;
        frame.has_key = false;
    }
    node->line = place.line;
    node->column = place.column;
    node->file = file_;
    return node;
}

bool TreeBuilder::begin(Kind kind, Place place) {
    if (open_.size() >= static_cast<std::size_t>(std::max(limits_.depth, 0))) {
        fault(place, Code::too_deep, fmt::format("values are nested more than {} deep", limits_.depth));
        spoil();
        return false;
    }
    Node* node = place_for_value(place);
    if (node == nullptr) {
        return false;
    }
    node->kind = kind;
    open_.push_back({node, false});
    return true;
}

bool TreeBuilder::scalar(std::string text, bool quoted, Place place) {
    Node* node = place_for_value(place);
    if (node == nullptr) {
        return false;
    }
    if (has_control(text)) {
        fault(place, Code::bad_encoding, "the text holds a control character, written as an escape");
    }
    node->text = std::move(text);
    node->quoted = quoted;
    return true;
}

bool TreeBuilder::key(std::string text, Place place) {
    if (has_control(text)) {
        fault(place, Code::bad_encoding, "the key holds a control character, written as an escape");
    }
    Frame& frame = open_.back();
    Entry& entry = frame.node->entries.emplace_back();
    entry.key = std::move(text);
    entry.line = place.line;
    entry.column = place.column;
    frame.has_key = true;
    return true;
}

void TreeBuilder::end() {
    Node& node = *open_.back().node;
    open_.pop_back();
    if (node.kind == Kind::mapping) {
        refuse_duplicates(node);
    }
}

bool TreeBuilder::expects_key() const noexcept {
    return !open_.empty() && open_.back().node->kind == Kind::mapping && !open_.back().has_key;
}

std::optional<Place> TreeBuilder::pending_key() const noexcept {
    if (open_.empty() || !open_.back().has_key) {
        return std::nullopt;
    }
    const Entry& entry = open_.back().node->entries.back();
    return Place{entry.line, entry.column};
}

bool TreeBuilder::in_sequence() const noexcept {
    return !open_.empty() && open_.back().node->kind == Kind::sequence;
}

// Sorts an index, so that a mapping of many thousand keys costs no more than n log n.
void TreeBuilder::refuse_duplicates(Node& mapping) {
    std::vector<Entry>& entries = mapping.entries;
    std::vector<std::size_t> order(entries.size());
    std::iota(order.begin(), order.end(), std::size_t{0});
    std::sort(order.begin(), order.end(), [&entries](std::size_t a, std::size_t b) {
        const int compared = entries[a].key.compare(entries[b].key);
        return compared != 0 ? compared < 0 : a < b;
    });
    std::vector<bool> repeated(entries.size(), false);
    std::size_t first = 0;  // in `order`: the first entry with the key
    for (std::size_t i = 1; i < order.size(); ++i) {
        const Entry& entry = entries[order[i]];
        if (entry.key != entries[order[first]].key) {
            first = i;
            continue;
        }
        repeated[order[i]] = true;
        fault({entry.line, entry.column}, Code::duplicate_key,
              fmt::format("the key {} is given twice", entry.key),
              fmt::format("it is first given on line {}", entries[order[first]].line));
    }
    std::size_t kept = 0;
    for (std::size_t i = 0; i < entries.size(); ++i) {
        if (!repeated[i]) {
            if (kept != i) {
                entries[kept] = std::move(entries[i]);
            }
            ++kept;
        }
    }
    entries.resize(kept);
}

std::optional<Node> TreeBuilder::take() {
    if (!usable_ || !complete()) {
        return std::nullopt;
    }
    return std::move(root_);
}

bool has_control(std::string_view text) noexcept {
    // Bytes first: nearly all texts are plain.
    const auto suspicious = [](char c) {
        const auto byte = static_cast<unsigned char>(c);
        return (byte < 0x20 && c != '\t' && c != '\n' && c != '\r') || byte == 0x7F || byte == 0xC2;
    };
    for (std::size_t i = 0; i < text.size(); ++i) {
        if (!suspicious(text[i])) {
            continue;
        }
        const std::optional<CodePoint> point = code_point_at(text, i);
        if (point && is_control(point->value)) {
            return true;
        }
    }
    return false;
}

}  // namespace steelyard::document::detail
