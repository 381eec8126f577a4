// SPDX-License-Identifier: Apache-2.0
#include "steelyard/likelihoods/evidence_markdown.hpp"

#include <fmt/format.h>
#include <fmt/ranges.h>

#include <algorithm>

#include "steelyard/likelihoods/words.hpp"
#include "wording.hpp"

namespace steelyard::likelihoods {
namespace {

/// Text from a file inside a table cell or a sentence: nothing of it may act as Markdown or HTML.
std::string escaped(std::string_view text) {
    std::string out;
    for (const char c : text) {
        switch (c) {
            case '<':
                out += "&lt;";
                break;
            case '>':
                out += "&gt;";
                break;
            case '&':
                out += "&amp;";
                break;
            case '|':
            case '*':
            case '_':
            case '`':
            case '[':
            case ']':
            case '\\':
                out += '\\';
                out += c;
                break;
            case '\n':
            case '\r':
            case '\t':
                out += ' ';
                break;
            default:
                out += c;
        }
    }
    return out;
}

/// Percent with two figures where it is small, so that a band kept at 0.5 % does not read as 1 %.
std::string percent(double probability) {
    const double value = 100.0 * probability;
    if (value < 0.01) {
        return "<0.01";
    }
    return fmt::format("{:.{}f}", value, value < 0.1 ? 2 : value < 99.95 ? 1 : 2);
}

std::string grounds_text(const document::Grounds& grounds) {
    std::string text(document::to_string(grounds.basis));
    if (!grounds.sources.empty()) {
        text += fmt::format(" ({})", escaped(fmt::format("{}", fmt::join(grounds.sources, ", "))));
    }
    return text;
}

std::string end_with_stop(std::string text) {
    if (!text.empty() && text.back() != '.') {
        text += '.';
    }
    return text;
}

class Writer {
  public:
    explicit Writer(const TableSet& set) : set_(set) {}

    std::string write() {
        causes();
        for (const EvidenceTable& table : set_.tables) {
            finding(table);
        }
        dependence();
        limits();
        variation();
        sources(set_.variation.quantities.empty() ? "Sources of the limits and groups"
                                                  : "Sources of the limits, groups and variation",
                set_.sources);
        while (out_.size() >= 2 && out_.ends_with("\n\n")) {
            out_.pop_back();
        }
        return std::move(out_);
    }

  private:
    template <typename... Args>
    void line(fmt::format_string<Args...> format, Args&&... args) {
        fmt::format_to(std::back_inserter(out_), format, std::forward<Args>(args)...);
        out_ += '\n';
    }
    void blank() { out_ += '\n'; }

    std::string cause_title(std::string_view id) const {
        const Cause* cause = set_.find_cause(id);
        return escaped(cause == nullptr ? id : std::string_view(cause->title));
    }

    void causes() {
        line("### Causes");
        blank();
        line("| cause | ICD-10-CM | rows |");
        line("| --- | --- | --- |");
        for (const Cause& cause : set_.causes) {
            line("| {} | {} | {} |", escaped(cause.title), escaped(cause.icd10cm),
                 cause.parts.empty() ? std::string("its own") : composite_rows(cause));
        }
        blank();
        for (const Cause& cause : set_.causes) {
            if (!cause.note.empty()) {
                line("{}: {}", escaped(cause.title), end_with_stop(escaped(cause.note)));
                blank();
            }
        }
    }

    std::string composite_rows(const Cause& cause) const {
        std::string text = "of " + cause_title(cause.otherwise);
        for (const std::string& part : cause.parts) {
            std::vector<std::string> findings;
            for (const EvidenceTable& table : set_.tables) {
                const auto taken = cause.takes.find(table.finding);
                if (taken != cause.takes.end() && taken->second == part && part != cause.otherwise) {
                    findings.push_back(escaped(detail::in_sentence(table.title)));
                }
            }
            if (!findings.empty()) {
                text += fmt::format(", but of {} for: {}", cause_title(part), fmt::join(findings, "; "));
            }
        }
        return text;
    }

    void finding(const EvidenceTable& table) {
        line("### {}", escaped(table.title));
        blank();
        const std::string unit = detail::unit_after_number(table.unit);
        line("{}{}Effort: {}.{}", kind_text(table),
             unit.empty() ? "" : fmt::format("Unit:{}. ", escaped(unit)), table.burden, judged_text(table));
        blank();
        std::string header = "| cause |";
        std::string rule = "| --- |";
        for (const std::string& band : table.band_names) {
            header += fmt::format(
                " {} |", escaped(table.kind == FindingKind::feature ? detail::level_in_words(band) : band));
            rule += " ---: |";
        }
        line("{} as given | patients | basis and sources |", header);
        line("{} --- | ---: | --- |", rule);
        for (const EvidenceRow& row : table.rows) {
            std::string cells;
            for (Eigen::Index band = 0; band < table.bands(); ++band) {
                cells += fmt::format(" {} |", percent(row.compiled.probability(band)));
            }
            line("| {} |{} {}{} | {} | {} |", cause_title(row.cause), cells, escaped(row.as_given),
                 row.least_acted ? "; raised to the least" : "",
                 row.effective_patients > 0.0 ? fmt::format("{:.6g}", row.effective_patients) : "not stated",
                 grounds_text(row.grounds));
        }
        blank();
        notes(table);
        sources("Sources", table.sources);
    }

    std::string kind_text(const EvidenceTable& table) const {
        if (table.kind != FindingKind::joint) {
            return "";
        }
        return fmt::format("Joint table of {} and {}. ",
                           escaped(detail::in_sentence(set_.title_of(table.joint_of[0]))),
                           escaped(detail::in_sentence(set_.title_of(table.joint_of[1]))));
    }

    static std::string judged_text(const EvidenceTable& table) {
        const bool judged = std::any_of(table.rows.begin(), table.rows.end(), [](const EvidenceRow& row) {
            return document::is_judged(row.grounds.basis);
        });
        return judged ? fmt::format(" Bands of judged rows are raised to {} %, then the row is normalised.",
                                    percent(table.least))
                      : "";
    }

    void notes(const EvidenceTable& table) {
        for (const Condition& condition : table.usable_when) {
            line("- Read only {}; otherwise set aside: {}{}", escaped(condition_in_words(set_, condition)),
                 end_with_stop(escaped(condition.otherwise)),
                 condition.grounds ? fmt::format(" Basis: {}.", grounds_text(*condition.grounds)) : "");
        }
        if (!table.caution.empty()) {
            line("- Caution: {}", end_with_stop(escaped(table.caution)));
        }
        if (!table.note.empty()) {
            line("- Note: {}", end_with_stop(escaped(table.note)));
        }
        if (table.incoherence.size() > 0) {
            line(
                "- Ratios against the rest were solved for rows of each cause; they disagree with each other "
                "by at most {:.3f}.",
                table.incoherence.maxCoeff());
            if (!table.scale_is_unique) {
                line(
                    "- There are more bands than these ratios can place: the ratios between causes are as "
                    "published, but how often "
                    "each band is seen is not known.");
            }
        }
        bool any = !table.usable_when.empty() || !table.caution.empty() || !table.note.empty() ||
                   table.incoherence.size() > 0;
        for (const EvidenceRow& row : table.rows) {
            if (!row.note.empty()) {
                line("- {}: {}", cause_title(row.cause), end_with_stop(escaped(row.note)));
                any = true;
            }
        }
        if (any) {
            blank();
        }
    }

    void sources(std::string_view heading, const document::Sources& list) {
        if (list.empty()) {
            return;
        }
        line("{}:", heading);
        blank();
        for (const document::Source& source : list) {
            line("- {}: {}{}{}", escaped(source.key), end_with_stop(escaped(source.cite)),
                 source.doi.empty() ? "" : fmt::format(" doi:{}.", escaped(source.doi)),
                 source.seen.empty() ? "" : fmt::format(" Seen: {}.", escaped(source.seen)));
        }
        blank();
    }

    std::string titles(const std::vector<std::string>& findings) const {
        std::vector<std::string> names;
        names.reserve(findings.size());
        for (const std::string& finding : findings) {
            names.push_back(escaped(detail::in_sentence(set_.title_of(finding))));
        }
        return fmt::format("{}", fmt::join(names, "; "));  // titles may hold commas
    }

    void dependence() {
        if (!set_.groups.empty()) {
            line("### Findings that depend on each other");
            blank();
            line("| group | findings | rho | basis and sources |");
            line("| --- | --- | ---: | --- |");
            for (const Group& group : set_.groups) {
                line("| {} | {} | {} | {} |", escaped(group.name), titles(group.findings), group.rho,
                     grounds_text(group.grounds));
            }
            blank();
            for (const Group& group : set_.groups) {
                if (!group.why.empty()) {
                    line("- {}: {}", escaped(group.name), end_with_stop(escaped(group.why)));
                }
            }
            blank();
        }
        if (!set_.one_of.empty()) {
            line("### Findings of which one is read");
            blank();
            for (const OneOf& list : set_.one_of) {
                line("- {}: the first that can be read of: {}. {}", escaped(list.name), titles(list.findings),
                     end_with_stop(escaped(list.why)));
            }
            blank();
        }
    }

    void limits() {
        line("### Limits of the gate");
        blank();
        line("| key | value | basis and sources | note |");
        line("| --- | --- | --- | --- |");
        for (const GateEntry& entry : set_.gate_entries) {
            line("| `{}` | {} | {} | {} |", entry.key, escaped(entry.as_given), grounds_text(entry.grounds),
                 escaped(entry.note));
        }
        blank();
        if (set_.urgent.empty()) {
            return;
        }
        line("### Urgent values");
        blank();
        line("| quantity | at or below | at or above | basis and sources |");
        line("| --- | ---: | ---: | --- |");
        for (const UrgentLimit& limit : set_.urgent) {
            const QuantityKind* kind = find_quantity(limit.quantity);
            const std::string unit = kind == nullptr ? "" : escaped(detail::unit_after_number(kind->unit));
            line("| {} | {} | {} | {} |", escaped(set_.title_of(limit.quantity)),
                 limit.low ? detail::shown(*limit.low) + unit : "",
                 limit.high ? detail::shown(*limit.high) + unit : "", grounds_text(limit.grounds));
        }
        blank();
    }

    void variation_figure(std::string_view title, std::string_view part, std::string_view method,
                          const std::optional<VariationFigure>& figure) {
        if (figure) {
            line("| {} | {}{} | {}{} | {} | {} |", escaped(title), part,
                 method.empty() ? std::string() : fmt::format(", by {}", escaped(method)),
                 figure->relative ? "" : "SD ", escaped(figure->as_given), grounds_text(figure->grounds),
                 escaped(figure->note));
        }
    }

    void variation() {
        const VariationSettings& stated = set_.variation;
        if (stated.quantities.empty()) {
            return;
        }
        line("### Variation of one reading");
        blank();
        line("| quantity | part | figure | basis and sources | note |");
        line("| --- | --- | ---: | --- | --- |");
        variation_figure("All concentrations of one urine", "dilution, in common", {}, stated.urine_dilution);
        for (const Variation& entry : stated.quantities) {
            const std::string title = set_.title_of(entry.quantity);
            variation_figure(title, "analytical", {}, entry.parts.analytical);
            variation_figure(title, "within-subject", {}, entry.parts.within);
            for (const MethodVariation& other : entry.methods) {
                variation_figure(title, "analytical", other.method, other.parts.analytical);
                variation_figure(title, "within-subject", other.method, other.parts.within);
            }
        }
        blank();
    }

    const TableSet& set_;
    std::string out_;
};

}  // namespace

std::string evidence_markdown(const TableSet& set) {
    return Writer(set).write();
}

}  // namespace steelyard::likelihoods
