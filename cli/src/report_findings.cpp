// SPDX-License-Identifier: Apache-2.0
// What the answer rests on: the ledger, and the findings that were not read.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <set>

#include "report_page.hpp"
#include "steelyard/cli/numbers.hpp"
#include "steelyard/cli/terminal.hpp"
#include "steelyard/engine/ledger.hpp"

namespace steelyard::cli {
namespace {

using likelihoods::Use;

constexpr std::size_t name_width = 44;

/// Whether the share read is one that the table's `least` has raised. Raised shares lie a hair below it,
/// because the row is normalised afterwards.
bool at_least_allowed(const likelihoods::EvidenceRow& row, const likelihoods::EvidenceTable& table,
                      double log_likelihood) {
    return row.least_acted && std::exp(log_likelihood) <= table.least * (1.0 + 1e-9);
}

/// As the laboratory wrote it when no conversion took place, so that 7.20 keeps its figures; a computed value
/// is cut to what its inputs support.
std::string shown_value(const ReportView& view, const LedgerEntry& entry) {
    const likelihoods::Interval& value = *entry.reading.value;
    const auto measured = view.weighing.panel.measured.find(entry.table->finding);
    if (measured != view.weighing.panel.measured.end() && value.is_point() &&
        document::number_from(measured->second.as_read) == value.low) {
        return measured->second.as_read;
    }
    const likelihoods::QuantityValue* quantity = view.weighing.quantities.find(entry.table->finding);
    const bool computed = quantity != nullptr && quantity->origin == likelihoods::Origin::computed;
    return in_words(value, computed ? 3 : 6);
}

/// `Urine anion gap 26 mmol/L`, `Glycosuria absent`.
std::string name_and_value(const ReportView& view, const LedgerEntry& entry) {
    std::string seen =
        entry.reading.value ? with_unit(shown_value(view, entry), entry.table->unit) : entry.reading.level;
    std::replace(seen.begin(), seen.end(), '_', ' ');
    return fmt::format("{} {}", entry.table->title, seen);
}

/// One word for what a line rests on: the weaker of its two rows.
std::string_view short_basis(const document::Grounds& a, const document::Grounds& b) {
    const document::Basis weaker = std::max(a.basis, b.basis);
    return document::is_judged(weaker) ? "judged" : document::to_string(weaker);
}

class LedgerText {
  public:
    LedgerText(const ReportView& view, Page& page) : view_(view), page_(page) {}

    void write() {
        const WeighedCause& leader = view_.ranked(0);
        const WeighedCause& next = view_.ranked(1);
        page_.heading("What this rests on");
        page_.paragraph(
            fmt::format("A: {}. B: {}. In how many of each the band is expected, and the weight in decibans: "
                        "+3 doubles the odds of A, "
                        "+10 makes them tenfold, a minus sign favours B.",
                        short_title(leader), short_title(next)));
        std::vector<double> lines = {decibans(view_.weighing.prior_nats)};
        for (const LedgerEntry& entry : view_.weighing.ledger) {
            if (entry.reading.use == Use::read) {
                lines.push_back(decibans(entry.nats));
            }
        }
        const std::vector<double> shown = engine::rounded_to_add_up(lines, 1);
        row("", "A", "B", "weight", view_.full() ? "" : "basis");
        row("Prior odds", percent(leader.prior), percent(next.prior), signed_fixed(shown[0], 1), "");
        std::size_t at = 1;
        double total = shown[0];
        for (const LedgerEntry& entry : view_.weighing.ledger) {
            if (entry.reading.use == Use::read) {
                total += shown[at];
                finding(entry, signed_fixed(shown[at], 1));
                ++at;
            }
        }
        row(fmt::format("Posterior odds, {}", rough_odds(std::exp(view_.weighing.total_nats))),
            view_.posterior_shown(view_.weighing.ranking[0]),
            view_.posterior_shown(view_.weighing.ranking[1]), signed_fixed(total, 1), "");
    }

  private:
    void row(const std::string& name, const std::string& a, const std::string& b, const std::string& weight,
             std::string_view basis) {
        std::string text = "  " + padded(name, name_width) + padded_left(a, 8) + padded_left(b, 8) +
                           padded_left(weight, 8) + padded_left(basis, 9);
        text.erase(text.find_last_not_of(' ') + 1);
        page_.line(text);
    }

    void finding(const LedgerEntry& entry, const std::string& weight) {
        const likelihoods::EvidenceTable& table = *entry.table;
        const std::size_t a = view_.weighing.ranking[0];
        const std::size_t b = view_.weighing.ranking[1];
        const auto& row_a = likelihoods::row_of(view_.tables, table, view_.cause(a).id);
        const auto& row_b = likelihoods::row_of(view_.tables, table, view_.cause(b).id);
        std::string name = name_and_value(view_, entry);
        if (text_width(name) >= name_width) {
            page_.line("  " + name);
            name.clear();
        }
        row(name, percent(std::exp(entry.log_likelihood[a])), percent(std::exp(entry.log_likelihood[b])),
            weight, view_.full() ? "" : short_basis(row_a.grounds, row_b.grounds));
        if (view_.full()) {
            notes(entry, row_a, row_b);
        }
    }

    void notes(const LedgerEntry& entry, const likelihoods::EvidenceRow& row_a,
               const likelihoods::EvidenceRow& row_b) {
        const likelihoods::EvidenceTable& table = *entry.table;
        std::string note;
        if (entry.reading.value) {
            note = fmt::format("band {}; ", entry.reading.band);
            const likelihoods::QuantityValue* quantity = view_.weighing.quantities.find(table.finding);
            const likelihoods::DerivedQuantity* derived = likelihoods::find_derived(table.finding);
            if (quantity != nullptr && derived != nullptr &&
                quantity->origin == likelihoods::Origin::computed) {
                note += fmt::format("computed: {}; ", derived->formula);
            }
        } else if (table.kind == likelihoods::FindingKind::joint) {
            note = fmt::format("{}; ", entry.reading.band);
        }
        note += fmt::format("A {}, B {}", grounds_in_words(row_a.grounds), grounds_in_words(row_b.grounds));
        page_.cited.add(row_a.grounds, table.sources);
        page_.cited.add(row_b.grounds, table.sources);
        if (entry.reading.weight < 1.0) {
            note += fmt::format("; weight times {:.2f}: it and another finding read here both reflect {}",
                                entry.reading.weight, entry.reading.group);
        }
        if (at_least_allowed(row_a, table, entry.log_likelihood[view_.weighing.ranking[0]]) ||
            at_least_allowed(row_b, table, entry.log_likelihood[view_.weighing.ranking[1]])) {
            note += fmt::format("; raised to {} %, the least that a judged share may be",
                                plain(100.0 * table.least));
        }
        for (const std::string& remark : entry.reading.remarks) {
            note += "; " + remark;
        }
        page_.paragraph(note, "      ", "      ");
    }

    const ReportView& view_;
    Page& page_;
};

void write_set_aside(const ReportView& view, Page& page) {
    bool first = true;
    for (const LedgerEntry& entry : view.weighing.ledger) {
        if (entry.reading.use != Use::set_aside) {
            continue;
        }
        if (first) {
            page.heading("Set aside: known, but not read");
            first = false;
        }
        page.item(fmt::format("{}: {}", name_and_value(view, entry), entry.reading.why_not));
    }
}

/// In a full report they stand with their finding; in a shorter one they have a part of their own.
void write_remarks(const ReportView& view, Page& page) {
    bool first = true;
    for (const LedgerEntry& entry : view.weighing.ledger) {
        if (entry.reading.use != Use::read) {
            continue;
        }
        for (const std::string& remark : entry.reading.remarks) {
            if (first) {
                page.heading("To know of the values read");
                first = false;
            }
            page.item(fmt::format("{}: {}", entry.table->title, remark));
        }
    }
}

/// Conditions of the findings read of whose subject the case says nothing.
void write_unchecked(const ReportView& view, Page& page) {
    std::vector<std::pair<std::string, std::string>> subjects;  // with the findings each bears on
    for (const LedgerEntry& entry : view.weighing.ledger) {
        if (entry.reading.use != Use::read) {
            continue;
        }
        for (const std::string& id : entry.reading.unchecked) {
            const auto known = std::find_if(subjects.begin(), subjects.end(),
                                            [&](const auto& item) { return item.first == id; });
            if (known == subjects.end()) {
                subjects.emplace_back(id, entry.table->title);
            } else {
                known->second += ", " + entry.table->title;
            }
        }
    }
    if (subjects.empty()) {
        return;
    }
    if (view.full()) {
        page.heading("Not stated in the case; each would bar the findings named after it");
        for (const auto& [id, findings] : subjects) {
            page.item(fmt::format("{}: {}", view.tables.title_of(id), findings));
        }
        return;
    }
    std::vector<std::string> ids;
    ids.reserve(subjects.size());
    for (const auto& [id, findings] : subjects) {
        ids.push_back(id);
    }
    page.heading("Not stated in the case; each would bar findings that were read");
    page.paragraph(listed_titles(view.tables, ids) + ".");
}

/// Findings that would be read stand in "What to look at next"; here is what would not be read, and why.
void write_barred(const ReportView& view, Page& page) {
    bool first = true;
    for (const MissingFinding& finding : view.weighing.missing) {
        if (finding.barred.empty()) {
            continue;
        }
        if (first) {
            page.heading("Not known, and would not be read in this case");
            first = false;
        }
        page.item(fmt::format("{}: {}", view.tables.title_of(finding.id), finding.barred));
    }
}

/// What a brief report leaves out, so that nobody takes it for all there is.
void write_counts(const ReportView& view, Page& page) {
    std::vector<std::string> aside;
    std::set<std::string> unchecked;
    for (const LedgerEntry& entry : view.weighing.ledger) {
        if (entry.reading.use == Use::set_aside) {
            aside.push_back(entry.table->finding);
        } else {
            unchecked.insert(entry.reading.unchecked.begin(), entry.reading.unchecked.end());
        }
    }
    if (!aside.empty() || !unchecked.empty()) {
        page.line();
    }
    if (!aside.empty()) {
        page.paragraph("Set aside: " + listed_titles(view.tables, aside) + ".");
    }
    if (!unchecked.empty()) {
        page.paragraph(fmt::format(
            "Not stated: {} that would bar findings which were read. Without --brief each is named.",
            unchecked.size() == 1 ? "one circumstance" : fmt::format("{} circumstances", unchecked.size())));
    }
}

}  // namespace

void write_ledger(const ReportView& view, Page& page) {
    if (!view.brief()) {
        LedgerText(view, page).write();
    }
}

void write_unread_findings(const ReportView& view, Page& page) {
    if (view.brief()) {
        write_counts(view, page);
        return;
    }
    write_set_aside(view, page);
    if (!view.full()) {
        write_remarks(view, page);
    }
    write_unchecked(view, page);
    if (view.full() && view.weighing.weighed) {
        write_barred(view, page);
    }
}

}  // namespace steelyard::cli
