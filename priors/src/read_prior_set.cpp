// SPDX-License-Identifier: Apache-2.0
// Text to PriorSet. Every fault of the file is reported in one run, so each check goes on as far as it can
// and the set is only used when the list of faults stayed empty.
#include <fmt/format.h>

#include <array>
#include <cmath>
#include <span>

#include "coherence.hpp"
#include "steelyard/document/strict_map.hpp"
#include "steelyard/priors/odds.hpp"
#include "steelyard/priors/prior_set.hpp"

namespace steelyard::priors {

namespace {

using document::Code;
using document::Diagnostics;
using document::Entry;
using document::Node;
using document::SourcePosition;
using document::StrictMap;

/// Jeffreys' start: half a patient for every cause, so that a cause not yet seen keeps a prior above 0. A
/// prior of 0 could never be undone by any evidence. The same start is used for counts in evidence tables.
constexpr double jeffreys_start = 0.5;

constexpr std::array<std::string_view, 3> form_words{"odds_against_rest", "weights", "counts"};
constexpr std::array<std::string_view, 3> value_keys{"odds", "weight", "count"};
constexpr std::array<GivenAs, 3> forms{GivenAs::odds_against_rest, GivenAs::weights, GivenAs::counts};

std::string_view value_key(GivenAs form) noexcept {
    return value_keys.at(static_cast<std::size_t>(form));
}

const Entry* find_entry(const Node& mapping, std::string_view key) noexcept {
    for (const Entry& entry : mapping.entries) {
        if (entry.key == key) {
            return &entry;
        }
    }
    return nullptr;
}

SourcePosition key_position(const Entry& entry) {
    SourcePosition where = entry.value.where();
    where.line = entry.line;
    where.column = entry.column;
    return where;
}

/// A key that is there although the form of the set has no use for it: a fault at the key.
void refuse_key(StrictMap& map, const Node& node, std::string_view key, const std::string& message,
                const std::string& hint, Diagnostics& faults) {
    if (const Entry* entry = find_entry(node, key)) {
        map.optional(key);
        faults.add(key_position(*entry), Code::conflicting_keys, map.name(key) + " " + message, hint);
    }
}

std::optional<double> read_odds(const Node& node, const std::string& what, Diagnostics& faults) {
    if (node.kind != document::Kind::scalar) {
        faults.add(node.where(), Code::wrong_type, what + " must be odds, not a list or mapping",
                   "write it like \"1:3\" or as one number above 0");
        return std::nullopt;
    }
    const std::optional<double> odds = parse_odds(node.text);
    if (!odds) {
        faults.add(
            node.where(), Code::bad_odds,
            fmt::format("{} is '{}', but odds must be two numbers above 0 like \"1:3\", or one such number, "
                        "from {:g} to {:g}",
                        what, node.text, least_given, most_given),
            "a probability p is odds of p to 1 - p; a cause that cannot occur is left out of the set");
    }
    return odds;
}

std::optional<double> read_count(const Node& node, const std::string& what, Diagnostics& faults) {
    const std::optional<double> count = document::read_number(node, what, faults, 0.0, most_given);
    if (count && std::floor(*count) != *count) {
        faults.add(node.where(), Code::wrong_type,
                   fmt::format("{} is {}, but patients come in whole numbers", what, node.text),
                   "proportions are given with `given_as: weights`");
        return std::nullopt;
    }
    return count;
}

std::optional<double> read_given(const Node& node, const std::string& what, GivenAs form,
                                 Diagnostics& faults) {
    switch (form) {
        case GivenAs::odds_against_rest:
            return read_odds(node, what, faults);
        case GivenAs::weights:
            return document::read_number(node, what, faults, least_given, most_given);
        case GivenAs::counts:
            return read_count(node, what, faults);
    }
    return std::nullopt;
}

/// The range of a cause whose value is already read (or faulty: `given` is then empty).
void read_range(const Node& node, const std::string& what, GivenAs form, std::optional<double> given,
                PriorCause& cause, Diagnostics& faults) {
    if (node.kind != document::Kind::sequence || node.items.size() != 2) {
        faults.add(node.where(), Code::bad_interval,
                   what + " must be a list of two values, the low one first",
                   form == GivenAs::odds_against_rest ? R"(such as ["1:6", "1:2"])" : "such as [2, 8]");
        return;
    }
    const Node& first = node.items.front();
    const Node& second = node.items.back();
    const std::optional<double> low = read_given(first, what + "[0]", form, faults);
    const std::optional<double> high = read_given(second, what + "[1]", form, faults);
    if (!low || !high) {
        return;
    }
    if (*low > *high) {
        faults.add(node.where(), Code::bad_interval,
                   fmt::format("{} runs from {} down to {}", what, first.text, second.text),
                   "put the low value first");
        return;
    }
    if (given && (*given < *low || *given > *high)) {
        faults.add(node.where(), Code::bad_interval,
                   fmt::format("{} from {} to {} does not hold the value {}", what, first.text, second.text,
                               cause.as_given),
                   "widen the range or correct the value");
        return;
    }
    cause.range_low = low;
    cause.range_high = high;
    cause.range_as_given = first.text + " to " + second.text;
}

/// The value keys of a cause under one form.
/// @returns  whether the value itself could be read
bool read_value(StrictMap& map, const Entry& entry, GivenAs form, PriorCause& cause, Diagnostics& faults) {
    const std::string_view own = value_key(form);
    bool other_given = false;
    for (std::size_t i = 0; i < forms.size(); ++i) {
        if (forms.at(i) != form) {
            other_given = other_given || find_entry(entry.value, value_keys.at(i)) != nullptr;
            refuse_key(map, entry.value, value_keys.at(i),
                       fmt::format("belongs to `given_as: {}`, but this set is given as {}", form_words.at(i),
                                   to_string(form)),
                       fmt::format("write `{}` here, or change `given_as`", own), faults);
        }
    }
    // A value under the wrong key is one mistake and is reported once.
    const bool own_given = find_entry(entry.value, own) != nullptr;
    const Node* node = own_given || !other_given ? map.required(own) : map.optional(own);
    std::optional<double> given;
    if (node != nullptr) {
        cause.as_given = node->text;
        given = read_given(*node, map.name(own), form, faults);
        cause.given = given.value_or(0.0);
    }
    if (form == GivenAs::counts) {
        refuse_key(map, entry.value, "range",
                   "has no use under counts: the counts themselves say how firm they are",
                   "leave it out, or give weights", faults);
    } else if (const Node* range = map.optional("range")) {
        read_range(*range, map.name("range"), form, given, cause, faults);
    }
    return given.has_value();
}

void check_known(const Entry& entry, std::span<const std::string> known, Diagnostics& faults) {
    if (known.empty()) {
        return;
    }
    std::string list;
    for (const std::string& id : known) {
        if (id == entry.key) {
            return;
        }
        list += (list.empty() ? "" : ", ") + id;
    }
    const std::string close = document::nearest(entry.key, known);
    faults.add(key_position(entry), Code::unknown_cause,
               fmt::format("'{}' is no cause of the table set", entry.key),
               close.empty() ? "its causes are " + list : fmt::format("did you mean {}?", close));
}

/// The causes of the set. @returns  whether every one could be read
bool read_causes(const Node& node, std::optional<GivenAs> form, std::span<const std::string> known,
                 PriorSet& set, Diagnostics& faults) {
    bool whole = form.has_value();
    for (const Entry& entry : node.entries) {
        if (!document::is_identifier(entry.key)) {
            faults.add(key_position(entry), Code::bad_identifier,
                       fmt::format("'{}' is no name of a cause", entry.key),
                       "names are lower-case letters, digits and underscores, beginning with a letter");
        } else {
            check_known(entry, known, faults);
        }
        StrictMap map(entry.value, "causes." + entry.key, faults);
        if (!map.usable()) {
            whole = false;
            continue;
        }
        PriorCause cause;
        cause.id = entry.key;
        cause.where = key_position(entry);
        if (form) {
            whole = read_value(map, entry, *form, cause, faults) && whole;
        } else {
            for (const std::string_view key : value_keys) {
                map.optional(key);  // which of them is right cannot be said, so none is called unknown
            }
            map.optional("range");
        }
        // A prior may go without a stated basis; a report then says that none was stated.
        if (entry.value.find("basis") != nullptr || entry.value.find("source") != nullptr) {
            cause.grounds = document::read_grounds(map, set.sources, false, faults);
        }
        cause.note = map.optional_text("note").value_or("");
        map.finish();
        set.causes.push_back(std::move(cause));
    }
    if (node.entries.size() < 2) {
        faults.add(node.where(), Code::too_few_causes,
                   fmt::format("`causes` names {}, but a weighing needs at least two", node.entries.size()),
                   "name every cause that the clinic wants weighed");
        return false;
    }
    return whole;
}

void read_worth(StrictMap& map, const Node& root, std::optional<GivenAs> form, PriorSet& set,
                Diagnostics& faults) {
    if (!form || *form == GivenAs::weights) {
        set.worth = map.optional_number("worth", least_given, most_given).value_or(0.0);
        return;
    }
    refuse_key(
        map, root, "worth",
        fmt::format("belongs to `given_as: weights`, but this set is given as {}", to_string(*form)),
        *form == GivenAs::counts ? "counts are worth the patients they count" : "give each cause a `range`",
        faults);
}

/// Fills the probabilities of a set whose values are all read; refuses odds that do not cohere and a register
/// without patients.
void normalise(const Entry& causes, PriorSet& set, Diagnostics& faults) {
    const auto count = static_cast<double>(set.causes.size());
    double sum = 0.0;
    for (const PriorCause& cause : set.causes) {
        sum += cause.given;
    }
    switch (set.given_as) {
        case GivenAs::odds_against_rest:
            set.given_sum = detail::probability_sum(set.causes);
            if (!detail::coheres(set.given_sum)) {
                faults.add(
                    key_position(causes), Code::incoherent_odds,
                    fmt::format(
                        "the odds against the rest stand for probabilities that sum to {:.4g}, but must "
                        "sum to 1 within {}",
                        set.given_sum, detail::coherence_tolerance),
                    "the nearest coherent set in the same proportions is " +
                        detail::nearest_coherent_yaml(set.causes));
                return;
            }
            for (PriorCause& cause : set.causes) {
                cause.probability = probability_of_odds(cause.given) / set.given_sum;
            }
            return;
        case GivenAs::weights:
            for (PriorCause& cause : set.causes) {
                cause.probability = cause.given / sum;
            }
            return;
        case GivenAs::counts:
            if (sum == 0.0) {
                faults.add(key_position(causes), Code::out_of_range,
                           "the counts are all 0: a register without patients is no prior",
                           "use weights until there are patients to count");
                return;
            }
            set.worth = sum;
            for (PriorCause& cause : set.causes) {
                cause.probability = (cause.given + jeffreys_start) / (sum + jeffreys_start * count);
            }
            return;
    }
}

/// The name a text has inside its folder: what the digest is taken over, so that a shipped set and its file
/// agree.
std::string name_in_folder(const std::string& file) {
    const std::size_t cut = file.find_last_of("/:");
    return cut == std::string::npos ? file : file.substr(cut + 1);
}

std::optional<GivenAs> read_form(StrictMap& map) {
    const std::optional<std::string> word = map.required_choice("given_as", form_words);
    if (word) {
        for (const GivenAs form : forms) {
            if (*word == to_string(form)) {
                return form;
            }
        }
    }
    return std::nullopt;
}

void read_root(const Node& root, std::span<const std::string> known, PriorSet& set, Diagnostics& faults) {
    StrictMap map(root, "", faults);
    if (!map.usable() || !map.require_format("steelyard.prior-set/1")) {
        return;
    }
    set.title = map.required_text("title").value_or("");
    set.note = map.optional_text("note").value_or("");
    set.sources = document::read_sources(map, faults);
    const std::optional<GivenAs> form = read_form(map);
    set.given_as = form.value_or(GivenAs::weights);
    read_worth(map, root, form, set, faults);
    if (const Node* causes = map.required("causes")) {
        const StrictMap is_mapping(*causes, "causes", faults);
        if (is_mapping.usable() && read_causes(*causes, form, known, set, faults)) {
            normalise(*find_entry(root, "causes"), set, faults);
        }
    }
    map.finish();
}

}  // namespace

PriorSet read_prior_set(std::string_view text, const std::string& file,
                        const std::vector<std::string>& known_causes) {
    Diagnostics faults;
    faults.remember_text(file, text);
    PriorSet set;
    set.name = file;
    const std::optional<Node> root = document::parse(text, file, document::syntax_of(file, text), faults);
    if (root) {
        read_root(*root, known_causes, set, faults);
    }
    if (!faults.empty()) {
        throw document::LoadError(std::move(faults));
    }
    set.digest = document::digest({{name_in_folder(file), std::string(text)}});
    return set;
}

PriorSet load_prior_set(const std::string& path, const std::vector<std::string>& known_causes) {
    Diagnostics faults;
    const std::optional<std::string> text = document::read_text(path, faults);
    if (!text) {
        throw document::LoadError(std::move(faults));
    }
    return read_prior_set(*text, path, known_causes);
}

}  // namespace steelyard::priors
