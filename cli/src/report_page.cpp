// SPDX-License-Identifier: Apache-2.0
#include "report_page.hpp"

#include <fmt/format.h>

#include <algorithm>

#include "steelyard/cli/numbers.hpp"
#include "steelyard/cli/terminal.hpp"
#include "steelyard/likelihoods/words.hpp"

namespace steelyard::cli {

void Cited::add(const document::Grounds& grounds, const document::Sources& sources) {
    for (const std::string& key : grounds.sources) {
        const document::Source* source = document::find_source(sources, key);
        const bool known = std::any_of(list_.begin(), list_.end(),
                                       [&](const document::Source& entry) { return entry.key == key; });
        if (source != nullptr && !known) {
            list_.push_back(*source);
        }
    }
}

void Page::line(std::string_view text) {
    text_ += visible(text);
    text_ += '\n';
}

void Page::heading(std::string_view text) {
    text_ += '\n' + emphasised(visible(text), colour_) + '\n';
}

void Page::alarm(std::string_view text) {
    text_ += '\n' + alarming(visible(text), colour_) + '\n';
}

void Page::paragraph(std::string_view text, std::string_view first, std::string_view rest) {
    text_ += wrapped(visible(text), first, rest);
}

std::string ReportView::posterior_shown(std::size_t index) const {
    const double posterior = weighing.causes[index].posterior;
    const bool nothing_read =
        std::none_of(weighing.ledger.begin(), weighing.ledger.end(),
                     [](const LedgerEntry& entry) { return entry.reading.use == likelihoods::Use::read; });
    if (sensitivity == nullptr || nothing_read) {
        return percent(posterior);  // with nothing read it is the prior, and is shown like it
    }
    return percent_in_steps(posterior, step_of(index));
}

int ReportView::step_of(std::size_t index) const {
    const auto at = static_cast<Eigen::Index>(index);
    return supported_step(sensitivity->spread.low(at), sensitivity->spread.high(at));
}

std::string ReportView::leader_would_have(const PerCause& posterior) const {
    const std::size_t leader = weighing.ranking[0];
    return full() ? percent(posterior[leader]) : percent_in_steps(posterior[leader], step_of(leader));
}

std::string with_unit(const std::string& number, std::string_view ucum) {
    const std::string unit = unit_shown(ucum);
    return unit.empty() ? number : number + " " + unit;
}

std::string percent_range(double low, double high) {
    std::string from = percent(low);
    from.erase(from.size() - 2);  // the unit stands once, at the end
    const std::string to = percent(high);
    return from + " %" == to ? to : from + " to " + to;
}

std::string percent_as_typed(double share) {
    return plain(100.0 * share, 8) + " %";
}

std::pair<std::string, std::string> percents_apart(double a, double b) {
    std::pair<std::string, std::string> whole{percent(a), percent(b)};
    if (whole.first != whole.second) {
        return whole;
    }
    const auto finer = [](double p) {
        return p > 0.5 ? plain(100.0 * p, 5) + " %" : plain(100.0 * p, 3) + " %";
    };
    return {finer(a), finer(b)};
}

std::string listed_titles(const likelihoods::TableSet& tables, const std::vector<std::string>& ids) {
    std::string list;
    for (const std::string& id : ids) {
        list += (list.empty() ? "" : "; ") + tables.title_of(id);
    }
    return list;
}

std::string in_sentence(const ReportView& view, const std::string& finding) {
    return likelihoods::title_in_sentence(view.tables.title_of(finding));
}

std::string beyond(const ReportView& view, const ValueEdge& edge) {
    const likelihoods::EvidenceTable& table = *view.tables.find_table(edge.finding);
    return fmt::format("{} {}", edge.nearest.distance > 0.0 ? "at or above" : "below",
                       with_unit(plain(edge.nearest.edge, 6), table.unit));
}

std::string burden_of(const ReportView& view, const std::string& finding) {
    return view.tables.find_table(finding)->burden;
}

std::string band_shown(std::string name) {
    std::replace(name.begin(), name.end(), '_', ' ');
    return name;
}

}  // namespace steelyard::cli
