// SPDX-License-Identifier: Apache-2.0
// One report as text, in the order in which a consultant needs it.
#include <fmt/format.h>

#include <algorithm>

#include "report_page.hpp"
#include "steelyard/cli/numbers.hpp"
#include "steelyard/cli/terminal.hpp"

namespace steelyard::cli {
namespace {

using likelihoods::GateStatus;

void write_head(const ReportView& view, Page& page) {
    const likelihoods::Panel& panel = view.weighing.panel;
    std::string who;
    if (panel.sex != likelihoods::Sex::unknown) {
        who = panel.sex == likelihoods::Sex::female ? "female" : "male";
    }
    if (panel.age) {
        who += (who.empty() ? "" : ", ") + plain(*panel.age) + " years";
    }
    page.line(std::string(page_width, '='));
    page.paragraph("Case " + panel.case_id + (who.empty() ? "" : ": " + who), "", "  ");
    page.line(std::string(page_width, '='));
}

void write_urgent(const ReportView& view, Page& page) {
    if (view.weighing.urgent.empty()) {
        return;
    }
    page.alarm("URGENT: act by local policy before reading on");
    for (const likelihoods::UrgentValue& value : view.weighing.urgent) {
        page.paragraph(
            fmt::format("{} {} {} at or {} {} (limit: {})", view.tables.title_of(value.quantity),
                        with_unit(value.shown, value.unit), value.certain ? "is" : "may be",
                        value.is_low ? "below" : "above", with_unit(plain(value.limit, 6), value.unit),
                        grounds_in_words(value.grounds)),
            "  ! ", "    ");
        page.cited.add(value.grounds, view.tables.sources);
    }
}

void write_scope(const ReportView& view, Page& page) {
    const likelihoods::GateResult& gate = view.weighing.gate;
    std::string_view status = "Yes: in scope";
    if (gate.status == GateStatus::caution) {
        status = "Read with caution";
    } else if (gate.status == GateStatus::out_of_scope) {
        status = "No: out of scope";
    }
    page.heading(fmt::format("Does the question apply? {}", status));
    if (view.brief() && gate.status == GateStatus::in_scope) {
        return;
    }
    // Where all is well one paragraph is enough; what asks for care is told point by point.
    if (view.full() || gate.status != GateStatus::in_scope) {
        for (const std::string& reason : gate.reasons) {
            page.item(reason);
        }
        return;
    }
    std::string reasons;
    for (const std::string& reason : gate.reasons) {
        reasons += (reasons.empty() ? "" : "; ") + reason;
    }
    page.paragraph(reasons + ".");
}

void write_not_weighed(Page& page) {
    page.heading("Not weighed");
    page.paragraph(
        "The tables speak of normal-gap metabolic acidosis only, so no probabilities are given. If the "
        "reason "
        "above does not hold for this patient, ask again with --weigh-anyway.");
}

void write_unread_entries(const ReportView& view, Page& page) {
    if (!view.weighing.unread.empty()) {
        page.heading("Given, but read by no table");
        page.paragraph(listed_titles(view.tables, view.weighing.unread));
    }
}

void write_left_out(const ReportView& view, Page& page) {
    if (!view.weighing.weighed || view.weighing.left_out.empty()) {
        return;
    }
    page.heading("Causes not weighed");
    for (const LeftOut& cause : view.weighing.left_out) {
        page.item(fmt::format("{}: {}", cause.title, cause.why));
    }
}

void write_sources(Page& page) {
    if (page.cited.list().empty()) {
        return;
    }
    page.heading("Sources named above");
    const std::vector<document::Source> sources = page.cited.list();
    for (const document::Source& source : sources) {
        page.paragraph(citation(source), "  ", "    ");
    }
}

void write_origin(const ReportView& view, const Provenance& provenance, Page& page) {
    page.line();
    page.line(std::string(page_width, '-'));
    page.paragraph(fmt::format("Tables: {} ({}, {})", provenance.tables_title, provenance.tables_name,
                               provenance.tables_digest.substr(0, 23)),
                   "", "  ");
    page.paragraph(fmt::format("Priors: {} ({}, {})", provenance.priors_title, provenance.priors_name,
                               provenance.priors_digest.substr(0, 23)),
                   "", "  ");
    const Sensitivity* sensitivity = view.sensitivity;
    page.line("Program: steelyard " + provenance.version +
              (sensitivity != nullptr
                   ? fmt::format("; seed {}, {} draws", sensitivity->seed, sensitivity->spread.draws)
                   : std::string()));
    if (sensitivity != nullptr) {
        constexpr double promised = 0.005;
        const engine::PosteriorSpread& spread = sensitivity->spread;
        const double error = std::max(spread.low_error.maxCoeff(), spread.high_error.maxCoeff());
        if (error > promised) {
            page.paragraph(fmt::format("For want of more draws an interval end may be off by {:.1f} "
                                       "percentage points (--draws).",
                                       100.0 * error),
                           "", "  ");
        }
    }
    page.paragraph(std::string("Caution: ") + caution_text, "", "  ");
    if (!view.tables.caution.empty()) {
        page.paragraph("These tables: " + view.tables.caution, "", "  ");
    }
}

}  // namespace

std::string report_text(const Weighing& weighing, const Sensitivity* sensitivity,
                        const likelihoods::TableSet& tables, const Provenance& provenance, Length length,
                        bool colour) {
    const ReportView view{weighing, sensitivity, tables, length};
    Page page(colour);
    write_head(view, page);
    write_urgent(view, page);
    write_scope(view, page);
    if (weighing.weighed) {
        write_fit_warning(view, page);
        write_posterior(view, page);
        write_overturning(view, page);
        write_next(view, page);
        write_ledger(view, page);
    } else {
        write_not_weighed(page);
    }
    write_unread_findings(view, page);
    if (!view.brief()) {
        write_unread_entries(view, page);
    }
    if (view.full()) {
        write_all_sensitivity(view, page);
        write_left_out(view, page);
        write_sources(page);
    }
    write_origin(view, provenance, page);
    return page.take();
}

}  // namespace steelyard::cli
