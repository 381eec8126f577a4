// SPDX-License-Identifier: Apache-2.0
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <set>

#include "steelyard/cli/numbers.hpp"
#include "steelyard/cli/report.hpp"
#include "steelyard/cli/terminal.hpp"
#include "steelyard/engine/ledger.hpp"

namespace steelyard::cli {
namespace {

using likelihoods::GateStatus;
using likelihoods::TableSet;
using likelihoods::Use;

constexpr std::size_t title_width = 47;
constexpr std::size_t bar_width = 11;

std::string with_unit(const std::string& number, std::string_view ucum) {
    const std::string unit = unit_shown(ucum);
    return unit.empty() ? number : number + " " + unit;
}

/// Whether the share read is one that the table's `least` has raised. Raised shares lie a hair below it,
/// because the row is normalised afterwards.
bool at_least_allowed(const likelihoods::EvidenceRow& row, const likelihoods::EvidenceTable& table,
                      double log_likelihood) {
    return row.least_acted && std::exp(log_likelihood) <= table.least * (1.0 + 1e-9);
}

/// Writes one report; each member adds a part, in the order of reading.
class TextReport {
  public:
    TextReport(const Weighing& weighing, const TableSet& tables, const Provenance& provenance, bool colour)
        : weighing_(weighing), tables_(tables), provenance_(provenance), colour_(colour) {}

    std::string write() {
        head();
        urgent();
        scope();
        if (weighing_.weighed) {
            posterior();
            ledger();
        } else {
            not_weighed();
        }
        set_aside();
        unchecked();
        not_known();
        unread();
        left_out();
        sources();
        origin();
        return std::move(text_);
    }

  private:
    // Everything a file or a case supplied passes through here, so nothing of it reaches a terminal
    // unescaped.
    void line(std::string_view text = {}) {
        text_ += visible(text);
        text_ += '\n';
    }
    void coloured_line(const std::string& text) {
        text_ += text;
        text_ += '\n';
    }
    void heading(std::string_view text) {
        line();
        coloured_line(emphasised(visible(text), colour_));
    }
    void paragraph(std::string_view text, std::string_view first = "  ", std::string_view rest = "  ") {
        text_ += wrapped(visible(text), first, rest);
    }

    void head() {
        std::string who;
        if (weighing_.panel.sex != likelihoods::Sex::unknown) {
            who = weighing_.panel.sex == likelihoods::Sex::female ? "female" : "male";
        }
        if (weighing_.panel.age) {
            who += (who.empty() ? "" : ", ") + plain(*weighing_.panel.age) + " years";
        }
        line(std::string(page_width, '='));
        text_ +=
            wrapped("Case " + visible(weighing_.panel.case_id) + (who.empty() ? "" : ": " + who), "", "  ");
        line(std::string(page_width, '='));
    }

    void urgent() {
        if (weighing_.urgent.empty()) {
            return;
        }
        line();
        coloured_line(alarming("URGENT: act by local policy before reading on", colour_));
        for (const likelihoods::UrgentValue& value : weighing_.urgent) {
            paragraph(
                fmt::format("{} {} {} at or {} {} (limit: {})", tables_.title_of(value.quantity),
                            with_unit(value.shown, value.unit), value.certain ? "is" : "may be",
                            value.is_low ? "below" : "above", with_unit(plain(value.limit, 6), value.unit),
                            grounds_in_words(value.grounds)),
                "  ! ", "    ");
            cite(value.grounds, tables_.sources);
        }
    }

    void scope() {
        std::string_view status = "Yes: in scope";
        if (weighing_.gate.status == GateStatus::caution) {
            status = "Read with caution";
        } else if (weighing_.gate.status == GateStatus::out_of_scope) {
            status = "No: out of scope";
        }
        heading(fmt::format("Does the question apply? {}", status));
        for (const std::string& reason : weighing_.gate.reasons) {
            paragraph(visible(reason), "  - ", "    ");
        }
    }

    void not_weighed() {
        heading("Not weighed");
        paragraph(
            "The tables speak of normal-gap metabolic acidosis only, so no probabilities are given. If the "
            "reason "
            "above does not hold for this patient, ask again with --weigh-anyway.");
    }

    void posterior() {
        line();
        coloured_line(emphasised(padded("How likely each cause is", title_width + 2) +
                                     padded_left("prior", 7) + padded_left("posterior", 11) + "  |: prior",
                                 colour_));
        if (weighing_.weighed_anyway) {
            paragraph(
                "Weighed because it was asked for: this panel is out of scope, and the tables do not speak "
                "of it.",
                "  ! ", "    ");
        }
        for (const std::size_t index : weighing_.ranking) {
            const WeighedCause& cause = weighing_.causes[index];
            std::string title = cause.title;
            if (text_width(title) > title_width) {
                line("  " + title);
                title.clear();
            }
            line("  " + padded(title, title_width) + padded_left(percent(cause.prior), 7) +
                 padded_left(percent(cause.posterior), 11) + "  " + bar(cause));
        }
        line();
        paragraph(separation_sentence(weighing_));
        const std::string grounds = grounds_sentence(weighing_);
        if (!grounds.empty()) {
            paragraph(grounds);
        }
        paragraph(
            "No interval is given: the uncertainty of the priors and of the tables is not carried into these "
            "percentages.");
    }

    static std::string bar(const WeighedCause& cause) {
        const auto cells = [](double p) {
            return static_cast<std::size_t>(std::lround(p * static_cast<double>(bar_width - 1)));
        };
        std::string text(bar_width, '.');
        std::fill_n(text.begin(), cells(cause.posterior) + (cause.posterior >= 0.005 ? 1U : 0U), '=');
        text[cells(cause.prior)] = '|';
        return text;
    }

    void ledger() {
        const WeighedCause& leader = weighing_.causes[weighing_.ranking[0]];
        const WeighedCause& next = weighing_.causes[weighing_.ranking[1]];
        heading("What this rests on");
        paragraph(fmt::format(
            "The two most probable causes, finding by finding. A: {}. B: {}. The shares say in how many of "
            "A and of B the band is expected. Weights are in decibans: +3 doubles the odds of A against B, "
            "+10 makes them tenfold, a minus sign favours B.",
            leader.title, next.title));
        line();
        std::vector<double> lines = {decibans(weighing_.prior_nats)};
        for (const LedgerEntry& entry : weighing_.ledger) {
            if (entry.reading.use == Use::read) {
                lines.push_back(decibans(entry.nats));
            }
        }
        const std::vector<double> shown = engine::rounded_to_add_up(lines, 1);
        line("  " + padded("", 44) + padded_left("A", 8) + padded_left("B", 8) + padded_left("weight", 10));
        row("Prior odds", percent(leader.prior), percent(next.prior), shown[0]);
        std::size_t at = 1;
        double total = shown[0];
        for (const LedgerEntry& entry : weighing_.ledger) {
            if (entry.reading.use != Use::read) {
                continue;
            }
            total += shown[at];
            ledger_entry(entry, shown[at]);
            ++at;
        }
        row(fmt::format("Posterior odds, {}", odds_in_words(std::exp(weighing_.total_nats))),
            percent(leader.posterior), percent(next.posterior), total);
    }

    void row(const std::string& name, const std::string& a, const std::string& b, double weight) {
        line("  " + padded(name, 44) + padded_left(a, 8) + padded_left(b, 8) +
             padded_left(signed_fixed(weight, 1), 10));
    }

    void ledger_entry(const LedgerEntry& entry, double shown) {
        const likelihoods::EvidenceTable& table = *entry.table;
        std::string seen =
            entry.reading.value ? with_unit(shown_value(entry), table.unit) : entry.reading.level;
        std::replace(seen.begin(), seen.end(), '_', ' ');
        std::string name = fmt::format("{} {}", table.title, visible(seen));
        if (text_width(name) > 43) {
            line("  " + name);
            name.clear();
        }
        const std::size_t a = weighing_.ranking[0];
        const std::size_t b = weighing_.ranking[1];
        row(name, percent(std::exp(entry.log_likelihood[a])), percent(std::exp(entry.log_likelihood[b])),
            shown);
        const auto& row_a = likelihoods::row_of(tables_, table, weighing_.causes[a].id);
        const auto& row_b = likelihoods::row_of(tables_, table, weighing_.causes[b].id);
        std::string note;
        if (entry.reading.value) {
            note = fmt::format("band {}; ", entry.reading.band);
            const likelihoods::QuantityValue* quantity = weighing_.quantities.find(table.finding);
            const likelihoods::DerivedQuantity* derived = likelihoods::find_derived(table.finding);
            if (quantity != nullptr && derived != nullptr &&
                quantity->origin == likelihoods::Origin::computed) {
                note += fmt::format("computed: {}; ", derived->formula);
            }
        } else if (table.kind == likelihoods::FindingKind::joint) {
            note = fmt::format("{}; ", entry.reading.band);
        }
        note += fmt::format("A {}, B {}", grounds_in_words(row_a.grounds), grounds_in_words(row_b.grounds));
        used_.insert_all(table, row_a.grounds, row_b.grounds);
        if (entry.reading.weight < 1.0) {
            note += fmt::format("; weight times {:.2f}: it and another finding read here both reflect {}",
                                entry.reading.weight, visible(entry.reading.group));
        }
        if (at_least_allowed(row_a, table, entry.log_likelihood[a]) ||
            at_least_allowed(row_b, table, entry.log_likelihood[b])) {
            note += fmt::format("; raised to {} %, the least that a judged share may be",
                                plain(100.0 * table.least));
        }
        for (const std::string& remark : entry.reading.remarks) {
            note += "; " + visible(remark);
        }
        paragraph(note, "      ", "      ");
    }

    /// As the laboratory wrote it when no conversion took place, so that 7.20 keeps its figures; a computed
    /// value is cut to what its inputs support.
    std::string shown_value(const LedgerEntry& entry) const {
        const likelihoods::Interval& value = *entry.reading.value;
        const auto measured = weighing_.panel.measured.find(entry.table->finding);
        if (measured != weighing_.panel.measured.end() && value.is_point() &&
            document::number_from(measured->second.as_read) == value.low) {
            return measured->second.as_read;
        }
        const likelihoods::QuantityValue* quantity = weighing_.quantities.find(entry.table->finding);
        const bool computed = quantity != nullptr && quantity->origin == likelihoods::Origin::computed;
        return in_words(value, computed ? 3 : 6);
    }

    void set_aside() {
        bool first = true;
        for (const LedgerEntry& entry : weighing_.ledger) {
            if (entry.reading.use != Use::set_aside) {
                continue;
            }
            if (first) {
                heading("Set aside: known, but not read");
                first = false;
            }
            std::string seen =
                entry.reading.value ? with_unit(shown_value(entry), entry.table->unit) : entry.reading.level;
            std::replace(seen.begin(), seen.end(), '_', ' ');
            paragraph(
                fmt::format("{} {}: {}", entry.table->title, visible(seen), visible(entry.reading.why_not)),
                "  - ", "    ");
        }
    }

    /// Conditions of the findings read of whose subject the case says nothing, each once with the findings it
    /// bears on.
    void unchecked() {
        std::vector<std::pair<std::string, std::string>> subjects;
        for (const LedgerEntry& entry : weighing_.ledger) {
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
        heading("Not stated in the case; each would bar the findings named after it");
        for (const auto& [id, findings] : subjects) {
            paragraph(fmt::format("{}: {}", tables_.title_of(id), findings), "  - ", "    ");
        }
    }

    void not_known() {
        if (!weighing_.weighed || weighing_.missing.empty()) {
            return;
        }
        heading("Not known here");
        std::string list;
        for (const MissingFinding& finding : weighing_.missing) {
            if (finding.barred.empty()) {
                list += (list.empty() ? "" : "; ") + tables_.title_of(finding.id);
            }
        }
        paragraph(
            "This is not advice to test: what may safely be done in this patient is for the clinician to "
            "say.");
        if (!list.empty()) {
            paragraph("Would be read: " + list + ".", "  - ", "    ");
        }
        const bool some_barred =
            std::any_of(weighing_.missing.begin(), weighing_.missing.end(),
                        [](const MissingFinding& finding) { return !finding.barred.empty(); });
        if (some_barred) {
            paragraph("Would not be read in this case:", "  - ", "    ");
        }
        for (const MissingFinding& finding : weighing_.missing) {
            if (!finding.barred.empty()) {
                paragraph(fmt::format("{}: {}", tables_.title_of(finding.id), finding.barred), "      ",
                          "        ");
            }
        }
    }

    void unread() {
        if (weighing_.unread.empty()) {
            return;
        }
        heading("Given, but read by no table");
        std::string list;
        for (const std::string& id : weighing_.unread) {
            list += (list.empty() ? "" : "; ") + tables_.title_of(id);
        }
        paragraph(list);
    }

    void left_out() {
        if (!weighing_.weighed || weighing_.left_out.empty()) {
            return;
        }
        heading("Causes not weighed");
        for (const LeftOut& cause : weighing_.left_out) {
            paragraph(fmt::format("{}: {}", cause.title, cause.why), "  - ", "    ");
        }
    }

    void cite(const document::Grounds& grounds, const document::Sources& sources) {
        for (const std::string& key : grounds.sources) {
            used_.add(sources, key);
        }
    }

    void sources() {
        if (used_.list.empty()) {
            return;
        }
        heading("Sources named above");
        for (const auto& [key, source] : used_.list) {
            paragraph(citation(source), "  ", "    ");
        }
    }

    void origin() {
        line();
        line(std::string(page_width, '-'));
        paragraph(fmt::format("Tables: {} ({}, {})", visible(provenance_.tables_title),
                              visible(provenance_.tables_name), provenance_.tables_digest.substr(0, 23)),
                  "", "  ");
        paragraph(fmt::format("Priors: {} ({}, {})", visible(provenance_.priors_title),
                              visible(provenance_.priors_name), provenance_.priors_digest.substr(0, 23)),
                  "", "  ");
        line("Program: steelyard " + provenance_.version);
        paragraph(std::string("Caution: ") + caution_text, "", "  ");
        if (!tables_.caution.empty()) {
            paragraph("These tables: " + visible(tables_.caution), "", "  ");
        }
    }

    /// Sources cited so far, in order of first mention.
    struct Cited {
        std::vector<std::pair<std::string, document::Source>> list;
        void add(const document::Sources& sources, const std::string& key) {
            const document::Source* source = document::find_source(sources, key);
            const bool known =
                std::any_of(list.begin(), list.end(), [&](const auto& entry) { return entry.first == key; });
            if (source != nullptr && !known) {
                list.emplace_back(key, *source);
            }
        }
        void insert_all(const likelihoods::EvidenceTable& table, const document::Grounds& a,
                        const document::Grounds& b) {
            for (const document::Grounds* grounds : {&a, &b}) {
                for (const std::string& key : grounds->sources) {
                    add(table.sources, key);
                }
            }
        }
    };

    const Weighing& weighing_;
    const TableSet& tables_;
    const Provenance& provenance_;
    bool colour_;
    std::string text_;
    Cited used_;
};

}  // namespace

std::string report_text(const Weighing& weighing, const TableSet& tables, const Provenance& provenance,
                        bool colour) {
    return TextReport(weighing, tables, provenance, colour).write();
}

}  // namespace steelyard::cli
