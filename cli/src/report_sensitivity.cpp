// SPDX-License-Identifier: Apache-2.0
// How likely each cause is, how sure that is, and what would overturn it.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "report_page.hpp"
#include "steelyard/cli/numbers.hpp"
#include "steelyard/cli/terminal.hpp"
#include "steelyard/likelihoods/words.hpp"

namespace steelyard::cli {
namespace {

/// The finding without which the leader loses most; null when none was read.
const WithoutFinding* most_needed(const ReportView& view) {
    const std::size_t leader = view.weighing.ranking[0];
    const std::vector<WithoutFinding>& list = view.sensitivity->without;
    const auto least = std::min_element(list.begin(), list.end(), [&](const auto& a, const auto& b) {
        return a.posterior[leader] < b.posterior[leader];
    });
    return least == list.end() ? nullptr : &*least;
}

void write_without(const ReportView& view, Page& page) {
    const std::size_t leader = view.weighing.ranking[0];
    std::vector<std::string> changing;
    for (const WithoutFinding& without : view.sensitivity->without) {
        if (without.leader != leader) {
            changing.push_back(without.finding);
        }
    }
    if (!changing.empty()) {
        page.item(fmt::format("{} decides: without {} another cause leads: {}.",
                              changing.size() == 1 ? "One finding" : "Each of some findings",
                              changing.size() == 1 ? "it" : "any one of them",
                              listed_titles(view.tables, changing)));
        return;
    }
    if (const WithoutFinding* needed = most_needed(view)) {
        page.item(fmt::format("No single finding decides; without {}, which it needs most, it would have {}.",
                              in_sentence(view, needed->finding), view.leader_would_have(needed->posterior)));
    }
}

void write_tipping(const ReportView& view, Page& page) {
    const Tipping& nearest =
        *std::min_element(view.sensitivity->tipping.begin(), view.sensitivity->tipping.end(),
                          [](const Tipping& a, const Tipping& b) { return a.odds_factor < b.odds_factor; });
    const WeighedCause& rival = view.cause(nearest.rival);
    const auto [then, now] = percents_apart(nearest.prior, rival.prior);
    page.item(fmt::format("Priors: \"{}\" would overtake at a prior of {} (now {}).", short_title(rival),
                          then, now));
    for (const CauseRange& range : view.sensitivity->range) {
        if (range.cause == view.weighing.ranking[0]) {
            page.item(
                fmt::format("With every prior anywhere in its stated range, the tables as they are: {}{}.",
                            percent_range(range.low, range.high),
                            view.sensitivity->range_narrowed
                                ? "; not every stated prior can be reached, since they add up to 100 %"
                                : ""));
        }
    }
}

void write_rows(const ReportView& view, Page& page) {
    std::vector<std::string> inside;
    std::size_t considered = 0;
    for (const RowFactor& row : view.sensitivity->rows) {
        considered += row.possible ? 1U : 0U;
        if (row.inside && row.possible) {
            inside.push_back(fmt::format("{} of \"{}\"", view.tables.title_of(row.finding),
                                         short_title(view.cause(row.causes.front()))));
        }
    }
    if (inside.empty()) {
        if (considered > 0) {
            page.item("Evidence: no single row's own uncertainty can overturn it.");
        }
        return;
    }
    std::string list;
    constexpr std::size_t shown = 3;
    for (std::size_t i = 0; i < std::min(inside.size(), shown); ++i) {
        list += (list.empty() ? "" : "; ") + inside[i];
    }
    page.item(fmt::format("Evidence: {} whose own uncertainty alone can overturn it (inside): {}{}.",
                          inside.size() == 1 ? "one row" : fmt::format("{} rows", inside.size()), list,
                          inside.size() > shown ? "; ..." : ""));
}

void write_values(const ReportView& view, Page& page) {
    constexpr double worth_telling = 0.01;
    constexpr std::size_t most = 3;
    std::vector<const ValueEdge*> list;
    for (const ValueEdge& edge : view.sensitivity->edges) {
        // Without a spread there is no chance: then the nearest edge alone is looked at.
        const bool decides =
            edge.chance_other ? *edge.chance_other >= worth_telling : edge.leader != view.weighing.ranking[0];
        if (decides) {
            list.push_back(&edge);
        }
    }
    std::stable_sort(list.begin(), list.end(), [](const ValueEdge* a, const ValueEdge* b) {
        return a->chance_other.value_or(0.0) > b->chance_other.value_or(0.0);
    });
    for (std::size_t i = 0; i < std::min(list.size(), most); ++i) {
        const ValueEdge& edge = *list[i];
        const likelihoods::EvidenceTable& table = *view.tables.find_table(edge.finding);
        if (!edge.chance_other) {
            page.item(
                fmt::format("Values: with {} {} \"{}\" would lead; the chance of that is not known ({}).",
                            in_sentence(view, edge.finding), beyond(view, edge),
                            short_title(view.cause(edge.leader)), edge.why_no_chance));
            continue;
        }
        page.item(fmt::format(
            "Values: a repeat of {} puts another cause first with a chance of {}; \"{}\" in the band {}.",
            in_sentence(view, edge.finding), percent(*edge.chance_other),
            short_title(view.cause(edge.other_leader)),
            table.band_names[static_cast<std::size_t>(*edge.other_band)]));
    }
    if (!list.empty() || view.sensitivity->edges.empty()) {
        return;
    }
    const std::size_t leader = view.weighing.ranking[0];
    const auto lowest = std::min_element(
        view.sensitivity->edges.begin(), view.sensitivity->edges.end(),
        [&](const ValueEdge& a, const ValueEdge& b) { return a.posterior[leader] < b.posterior[leader]; });
    page.item(
        fmt::format("Values: no repeat is likely to change the leader; past its nearest band edge it would "
                    "lose most with {} "
                    "{}, and have {}.",
                    in_sentence(view, lowest->finding), beyond(view, *lowest),
                    view.leader_would_have(lowest->posterior)));
}

/// What was asked for on the command line.
void write_asked(const ReportView& view, Page& page) {
    if (view.sensitivity->until) {
        const Until& until = *view.sensitivity->until;
        const std::string target = percent_as_typed(until.target);
        const double own = view.ranked(0).prior;
        if (until.prior) {
            const auto [then, now] = percents_apart(*until.prior, own);
            page.item(fmt::format("Its posterior is {} at a prior of {} (now {}).", target, then, now));
        } else {
            page.item(fmt::format(
                "A posterior of {} asks for less than was believed before any finding (prior {}).", target,
                percent(own)));
        }
    }
    if (view.sensitivity->epsilon && !view.full()) {
        const CauseRange& range = view.sensitivity->contamination[view.weighing.ranking[0]];
        page.item(fmt::format("With {} of the prior put anywhere: {}.",
                              percent_as_typed(*view.sensitivity->epsilon),
                              percent_range(range.low, range.high)));
    }
}

void write_variance(const ReportView& view, Page& page) {
    // Of next to nothing there are no shares worth telling, and none that are not known well enough.
    constexpr double least_sd = 0.01;
    constexpr double largest_error = 0.05;
    constexpr std::size_t most = 3;
    const std::vector<VarianceSource>& sources = view.sensitivity->variance;
    const std::size_t shown = std::min(most, sources.size());
    const double sd = view.sensitivity->spread.sd(static_cast<Eigen::Index>(view.weighing.ranking[0]));
    const bool known =
        std::all_of(sources.begin(), sources.begin() + static_cast<std::ptrdiff_t>(shown),
                    [](const VarianceSource& source) { return source.total_error <= largest_error; });
    if (sources.empty() || sd < least_sd || !known) {
        return;
    }
    std::string list;
    for (std::size_t i = 0; i < shown; ++i) {
        list +=
            fmt::format("{}{} {}", list.empty() ? "" : ", ",
                        sources[i].source == "prior" ? "the priors" : in_sentence(view, sources[i].source),
                        percent(std::clamp(sources[i].total, 0.0, 1.0)));
    }
    page.item(
        fmt::format("Its uncertainty comes from (shares overlap and need not add up to 100 %): {}.", list));
}

}  // namespace

void write_fit_warning(const ReportView& view, Page& page) {
    if (view.sensitivity == nullptr || view.sensitivity->fit.explained) {
        return;
    }
    page.alarm("No cause on the list explains these findings");
    page.paragraph(
        fmt::format("Under every cause weighed, findings as unusual as these have a chance below {} %. The "
                    "percentages that follow "
                    "only share out the causes listed; look for an error in the values, two causes at once, "
                    "or one that is not listed.",
                    plain(100.0 * unexplained_below)));
}

void write_posterior(const ReportView& view, Page& page) {
    const bool sure = view.sensitivity != nullptr;
    page.heading(padded("How likely each cause is", title_width + 2) + padded_left("prior", 6) +
                 padded_left("posterior", 11) + (sure ? padded_left("95 % interval", 14) : ""));
    if (view.weighing.weighed_anyway) {
        page.paragraph(
            "Weighed because it was asked for: this panel is out of scope, and the tables do not speak of "
            "it.",
            "  ! ", "    ");
    }
    for (const std::size_t index : view.weighing.ranking) {
        const WeighedCause& cause = view.cause(index);
        std::string title = cause.title;
        if (text_width(title) > title_width) {
            page.line("  " + title);
            title.clear();
        }
        const auto at = static_cast<Eigen::Index>(index);
        page.line("  " + padded(title, title_width) + padded_left(percent(cause.prior), 6) +
                  padded_left(view.posterior_shown(index), 11) +
                  (sure ? padded_left(percent_range(view.sensitivity->spread.low(at),
                                                    view.sensitivity->spread.high(at)),
                                      14)
                        : ""));
    }
    page.line();
    page.paragraph(separation_sentence(view.weighing, view.sensitivity));
    const std::string grounds = grounds_sentence(view.weighing);
    if (!grounds.empty()) {
        page.paragraph(grounds);
    }
    if (sure) {
        const std::string fit = fit_sentence(view.weighing, view.sensitivity->fit);
        if (!fit.empty()) {
            page.paragraph(fit);
        }
        page.paragraph(cheapest_change_sentence(*view.sensitivity, view.tables));
    }
}

void write_overturning(const ReportView& view, Page& page) {
    if (view.sensitivity == nullptr) {
        return;
    }
    if (view.brief()) {
        write_asked(view, page);
        return;
    }
    page.heading(fmt::format("What would overturn \"{}\"", short_title(view.ranked(0))));
    write_without(view, page);
    write_values(view, page);
    write_rows(view, page);
    write_tipping(view, page);
    write_asked(view, page);
    write_variance(view, page);
}

}  // namespace steelyard::cli
