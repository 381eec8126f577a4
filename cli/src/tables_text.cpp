// SPDX-License-Identifier: Apache-2.0
// Evidence tables as text: either every cause's band probabilities, or the ratio of one cause against
// another.
#include <fmt/format.h>

#include <algorithm>

#include "steelyard/cli/numbers.hpp"
#include "steelyard/cli/report.hpp"
#include "steelyard/cli/terminal.hpp"
#include "steelyard/likelihoods/words.hpp"
#include "tables_views.hpp"

namespace steelyard::cli {
namespace {

using likelihoods::EvidenceRow;
using likelihoods::EvidenceTable;
using likelihoods::TableSet;

constexpr std::size_t letter_width = 7;

/// A, B, C, ... for the columns of causes; a set of more causes goes on with AA, AB.
std::string letter(std::size_t index) {
    const char last = static_cast<char>('A' + static_cast<char>(index % 26));
    return index < 26 ? std::string(1, last) : letter(index / 26 - 1) + last;
}

/// How a row was given; the n of a judged row is what it is worth, not patients that were seen.
std::string given_in_words(const EvidenceRow& row) {
    std::string text = row.as_given;
    const std::size_t n = text.rfind(", n ");
    if (document::is_judged(row.grounds.basis) && n != std::string::npos) {
        text.replace(n, 4, ", worth ");
    }
    return visible(text);
}

/// Beyond a thousand either way the digits of a ratio say nothing.
std::string ratio_words(double ratio) {
    if (ratio > 1000.0) {
        return "over 1000";
    }
    return ratio < 0.001 ? "under 0.001" : plain(ratio, 2);
}

std::string head(const EvidenceTable& table, bool colour) {
    const std::string unit = unit_shown(table.unit);
    const std::string title = visible(unit.empty() ? table.title : fmt::format("{} [{}]", table.title, unit));
    const std::string id = fmt::format("({}; {})", table.finding, table.burden);
    const bool fits = text_width(title) + 2 + text_width(id) <= page_width;
    return "\n" + emphasised(title, colour) + (fits ? "  " : "\n  ") + id + "\n";
}

std::string conditions(const TableSet& set, const EvidenceTable& table) {
    std::string text;
    for (const likelihoods::Condition& condition : table.usable_when) {
        text += wrapped(fmt::format("Read only {}; otherwise: {}",
                                    visible(likelihoods::condition_in_words(set, condition)),
                                    visible(condition.otherwise)),
                        "  ", "    ");
    }
    if (!table.caution.empty()) {
        text += wrapped("Caution: " + visible(table.caution), "  ", "    ");
    }
    return text;
}

std::string sources(const EvidenceTable& table) {
    std::string text;
    for (const document::Source& source : table.sources) {
        text += wrapped(citation(source), "  ", "    ");
    }
    return text;
}

std::string probabilities(const TableSet& set, const EvidenceTable& table, bool colour) {
    std::vector<std::string> causes;
    std::size_t name_width = 4;
    for (const EvidenceRow& row : table.rows) {
        causes.push_back(row.cause);
    }
    for (const std::string& name : table.band_names) {
        name_width = std::max(name_width, text_width(name));
    }
    const Eigen::ArrayXXd shares = likelihoods::band_probabilities(set, table, causes);
    std::string text = head(table, colour) + "  " + padded("band", name_width);
    for (std::size_t k = 0; k < causes.size(); ++k) {
        text += padded_left(letter(k), letter_width);
    }
    text += '\n';
    for (Eigen::Index band = 0; band < table.bands(); ++band) {
        text += "  " + padded(visible(table.band_names[static_cast<std::size_t>(band)]), name_width);
        for (Eigen::Index k = 0; k < shares.cols(); ++k) {
            text += padded_left(percent(shares(band, k)), letter_width);
        }
        text += '\n';
    }
    for (std::size_t k = 0; k < table.rows.size(); ++k) {
        const EvidenceRow& row = table.rows[k];
        text += wrapped(
            fmt::format("{}  {} ({}){}", letter(k), given_in_words(row), grounds_in_words(row.grounds),
                        row.note.empty() ? "" : ": " + visible(row.note)),
            "  ", "     ");
    }
    return text + conditions(set, table) + sources(table);
}

std::string ratios(const TableSet& set, const EvidenceTable& table, const std::string& cause,
                   const std::string& against, bool colour) {
    std::size_t name_width = 4;
    for (const std::string& name : table.band_names) {
        name_width = std::max(name_width, text_width(name));
    }
    std::string text = head(table, colour) + "  " + padded("band", name_width) + padded_left("ratio", 12) +
                       "   95 % interval\n";
    for (const BandRatio& ratio : band_ratios(set, table, cause, against)) {
        text += "  " + padded(visible(ratio.band), name_width) + padded_left(ratio_words(ratio.value), 12) +
                fmt::format("   {} to {}\n", ratio_words(ratio.low), ratio_words(ratio.high));
    }
    for (const std::string& id : {cause, against}) {
        const EvidenceRow& row = likelihoods::row_of(set, table, id);
        text += wrapped(fmt::format("{}: {} ({})", visible(set.title_of(id)), given_in_words(row),
                                    grounds_in_words(row.grounds)),
                        "  ", "    ");
    }
    return text;
}

}  // namespace

std::string tables_text(const TableSet& set, const std::vector<const EvidenceTable*>& tables,
                        const std::string& cause, const std::string& against, bool colour) {
    std::string text =
        wrapped(fmt::format("{} ({}, {})", visible(set.title), visible(set.name), set.digest.substr(0, 23)),
                "", "  ");
    if (cause.empty()) {
        text += "Chance of each band given each cause:\n";
        std::size_t k = 0;
        for (const likelihoods::Cause& entry : set.causes) {
            if (entry.parts.empty()) {
                text += fmt::format("  {}  {} ({})\n", letter(k++), visible(entry.title), entry.id);
            }
        }
        for (const likelihoods::Cause& entry : set.causes) {
            if (!entry.parts.empty()) {
                text += wrapped(fmt::format("{} ({}) takes its rows from its parts: {}", visible(entry.title),
                                            entry.id, visible(takes_words(set, entry))),
                                "  ", "    ");
            }
        }
    } else {
        text += wrapped(fmt::format("How many times likelier each band is under \"{}\" than under \"{}\"; "
                                    "the interval is that of "
                                    "the tables' own uncertainty.",
                                    visible(set.title_of(cause)), visible(set.title_of(against))),
                        "", "");
    }
    for (const EvidenceTable* table : tables) {
        text +=
            cause.empty() ? probabilities(set, *table, colour) : ratios(set, *table, cause, against, colour);
    }
    return text;
}

}  // namespace steelyard::cli
