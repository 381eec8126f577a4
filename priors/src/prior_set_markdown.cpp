// SPDX-License-Identifier: Apache-2.0
#include "steelyard/priors/prior_set_markdown.hpp"

#include <fmt/format.h>

namespace steelyard::priors {

namespace {

/// Text of a clinic's file inside Markdown: no markup, no table cell and no line is ended by it.
std::string escaped(std::string_view text) {
    std::string out;
    for (const char c : text) {
        switch (c) {
            case '&':
                out += "&amp;";
                break;
            case '<':
                out += "&lt;";
                break;
            case '>':
                out += "&gt;";
                break;
            case '|':
            case '\\':
            case '`':
            case '*':
            case '_':
            case '[':
            case ']':
                out += '\\';
                out += c;
                break;
            default:
                out += static_cast<unsigned char>(c) < 0x20U ? ' ' : c;
        }
    }
    return out;
}

std::string form_in_words(const PriorSet& set) {
    switch (set.given_as) {
        case GivenAs::odds_against_rest:
            return "odds against the rest";
        case GivenAs::weights:
            return set.worth > 0.0 ? fmt::format("weights, together worth {:g} patients", set.worth)
                                   : "weights";
        case GivenAs::counts:
            return fmt::format("counts of {:g} patients, half a patient added to each cause", set.worth);
    }
    return {};
}

std::string joined(const std::vector<std::string>& words) {
    std::string out;
    for (const std::string& word : words) {
        out += (out.empty() ? "" : ", ") + escaped(word);
    }
    return out;
}

std::string table_line(const PriorCause& cause) {
    const std::string basis =
        cause.grounds ? std::string(document::to_string(cause.grounds->basis)) : std::string("not stated");
    return fmt::format("| `{}` | {:.1f} | {} | {} | {} | {} |\n", cause.id, 100.0 * cause.probability,
                       escaped(cause.as_given), escaped(cause.range_as_given), basis,
                       cause.grounds ? joined(cause.grounds->sources) : std::string());
}

std::string source_line(const document::Source& source) {
    std::string line = fmt::format("- {}: {}", escaped(source.key), escaped(source.cite));
    if (!source.doi.empty()) {
        line += ". doi " + escaped(source.doi);
    }
    if (!source.seen.empty()) {
        line += " (seen: " + escaped(source.seen) + ")";
    }
    return line + "\n";
}

}  // namespace

std::string priors_markdown(const PriorSet& set) {
    std::string out =
        fmt::format("## {}\n\n{}, given as {}.\n", escaped(set.title), escaped(set.name), form_in_words(set));
    if (!set.note.empty()) {
        out += "\n" + escaped(set.note) + "\n";
    }
    out +=
        "\n| cause | prior % | as given | range | basis | source |\n| --- | ---: | ---: | --- | --- | --- "
        "|\n";
    for (const PriorCause& cause : set.causes) {
        out += table_line(cause);
    }
    std::string notes;
    for (const PriorCause& cause : set.causes) {
        if (!cause.note.empty()) {
            notes += fmt::format("- `{}`: {}\n", cause.id, escaped(cause.note));
        }
    }
    if (!notes.empty()) {
        out += "\nNotes\n\n" + notes;
    }
    if (!set.sources.empty()) {
        out += "\nSources\n\n";
        for (const document::Source& source : set.sources) {
            out += source_line(source);
        }
    }
    return out;
}

}  // namespace steelyard::priors
