// SPDX-License-Identifier: Apache-2.0
// What to look at next.
#include <fmt/format.h>

#include <algorithm>

#include "report_page.hpp"
#include "steelyard/cli/numbers.hpp"
#include "steelyard/cli/terminal.hpp"

namespace steelyard::cli {
namespace {

/// The first ones by information, and in a shorter report the one likeliest to change the leader even when it
/// is none of them.
std::vector<const NextTest*> next_to_show(const ReportView& view, std::size_t most) {
    constexpr double worth_telling = 0.01;
    const std::vector<NextTest>& next = view.sensitivity->next;
    std::vector<const NextTest*> list;
    for (std::size_t i = 0; i < std::min(most, next.size()); ++i) {
        list.push_back(&next[i]);
    }
    const auto weight = [](const NextTest& test) { return test.bits > 0.0 ? test.leader_changes : 0.0; };
    const auto likeliest =
        std::max_element(next.begin(), next.end(),
                         [&](const NextTest& a, const NextTest& b) { return weight(a) < weight(b); });
    if (weight(*likeliest) >= worth_telling &&
        std::find(list.begin(), list.end(), &*likeliest) == list.end()) {
        list.back() = &*likeliest;
    }
    return list;
}

void write_next_table(const ReportView& view, Page& page, std::size_t most) {
    page.line("  " + padded("", title_width) + padded_left("bits", 7) + padded_left("new leader", 12) +
              padded_left("burden", 12));
    for (const NextTest* test : next_to_show(view, most)) {
        std::string title = view.tables.title_of(test->finding);
        if (text_width(title) >= title_width) {
            page.line("  " + title);
            title.clear();
        }
        // What only takes the place of known evidence, or lessens its weight, is not expected to tell
        // anything.
        const bool tells = test->bits > 0.0;
        page.line("  " + padded(title, title_width) +
                  padded_left(tells ? fmt::format("{:.2f}", test->bits) : "none", 7) +
                  padded_left(tells ? percent(test->leader_changes) : "", 12) +
                  padded_left(burden_of(view, test->finding), 12));
        const std::string& caution = view.tables.find_table(test->finding)->caution;
        if (view.length == Length::ordinary && burden_of(view, test->finding) == "specialised" &&
            !caution.empty()) {
            page.paragraph("caution: " + caution, "      ", "      ");
        }
    }
    if (view.sensitivity->next.size() > most) {
        page.line(fmt::format("  and {} more (--full)", view.sensitivity->next.size() - most));
    }
}

void write_pair(const ReportView& view, Page& page) {
    if (view.sensitivity->pair) {
        const NextPair& pair = *view.sensitivity->pair;
        page.paragraph(fmt::format("Best two together: {} and {}, {:.2f} bits.",
                                   in_sentence(view, pair.first), in_sentence(view, pair.second), pair.bits));
    }
    constexpr double better = 0.005;
    if (view.full() && view.sensitivity->plan && view.sensitivity->pair &&
        view.sensitivity->plan->bits > view.sensitivity->pair->bits + better) {
        const NextPlan& plan = *view.sensitivity->plan;
        page.paragraph(fmt::format("Best in turn, {:.2f} bits: first {}; then", plan.bits,
                                   in_sentence(view, plan.first)));
        const likelihoods::EvidenceTable& table = *view.tables.find_table(plan.first);
        for (std::size_t band = 0; band < plan.second.size(); ++band) {
            page.item(fmt::format(
                "{}: {}", band_shown(table.band_names[band]),
                plan.second[band].empty() ? "nothing more" : in_sentence(view, plan.second[band])));
        }
    }
}

}  // namespace

void write_next(const ReportView& view, Page& page) {
    if (view.sensitivity == nullptr) {
        return;
    }
    page.heading("What to look at next");
    if (view.sensitivity->next.empty()) {
        page.paragraph(
            view.sensitivity->beyond_burden.empty()
                ? "No finding that is not yet known would be read in this case."
                : "No finding of so light a burden that is not yet known would be read in this case.");
        return;
    }
    const bool nothing =
        std::all_of(view.sensitivity->next.begin(), view.sensitivity->next.end(),
                    [](const NextTest& test) { return test.bits < 0.01 && test.leader_changes < 0.01; });
    if (nothing && !view.full()) {
        page.paragraph(
            "No finding not yet known is expected to take away more than 0.01 bits of what is uncertain "
            "here.");
        return;
    }
    page.paragraph(
        fmt::format("Not advice to test: what may safely be done in this patient is for the clinician to "
                    "say. Bits: how much of the present "
                    "uncertainty, {:.2f} bits, is expected to go.",
                    view.sensitivity->bits_now));
    std::size_t most = 5;
    if (view.brief()) {
        most = 3;
    } else if (view.full()) {
        most = view.sensitivity->next.size();
    }
    write_next_table(view, page, most);
    if (!view.brief()) {
        write_pair(view, page);
    }
}

}  // namespace steelyard::cli
