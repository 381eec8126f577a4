// SPDX-License-Identifier: Apache-2.0
// Everything that is known of how sure an answer is, for a full report.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "report_page.hpp"
#include "steelyard/cli/numbers.hpp"
#include "steelyard/cli/terminal.hpp"

namespace steelyard::cli {
namespace {

/// A factor without powers of ten: `5.9`, `2980`, `over 10,000`, `0.18`, `near 0`.
std::string factor_shown(double factor) {
    if (factor >= 1e4) {
        return "over 10,000";
    }
    if (factor < 0.005) {
        return "near 0";
    }
    return factor >= 100.0 ? fmt::format("{:.0f}", factor) : fmt::format("{:.2g}", factor);
}

std::string factor_in_words(double factor) {
    return factor < 1.0 ? "divided by " + factor_shown(1.0 / factor) : "times " + factor_shown(factor);
}

class AllSensitivity {
  public:
    AllSensitivity(const ReportView& view, Page& page)
        : view_(view), sensitivity_(*view.sensitivity), page_(page) {}

    void write() {
        spread();
        fit();
        without();
        priors();
        rows();
        edges();
        variance();
        after();
    }

  private:
    const std::string& title(std::size_t cause) const { return view_.cause(cause).title; }
    std::string finding(const std::string& id) const { return view_.tables.title_of(id); }

    void two_columns(const std::string& name, const std::string& a, const std::string& b,
                     const std::string& c = {}) {
        std::string text =
            "  " + padded(name, title_width) + padded_left(a, 10) + padded_left(b, 10) + padded_left(c, 11);
        text.erase(text.find_last_not_of(' ') + 1);
        page_.line(text);
    }

    void spread() {
        page_.heading("How often each cause leads over the draws");
        const engine::PosteriorSpread& spread = sensitivity_.spread;
        for (const std::size_t k : view_.weighing.ranking) {
            const auto at = static_cast<Eigen::Index>(k);
            two_columns(title(k), percent(spread.leads(at)), "");
        }
        page_.paragraph(fmt::format(
            "{} draws of every table row and prior; for want of more, an interval end may be off by {:.2g} "
            "percentage "
            "points and these shares by {:.2g}.",
            spread.draws, 100.0 * std::max(spread.low_error.maxCoeff(), spread.high_error.maxCoeff()),
            100.0 * spread.leads_error.maxCoeff()));
    }

    void fit() {
        page_.heading("How well each cause fits");
        page_.paragraph(fmt::format(
            "The chance, under each cause, of findings at least as unusual as these{}. Below {} % a cause "
            "does not explain "
            "them. A high chance does not say that the right cause is listed.",
            sensitivity_.fit.exact ? "" : ", from drawn patterns", plain(100.0 * unexplained_below)));
        for (const std::size_t k : view_.weighing.ranking) {
            two_columns(title(k), percent_fine(sensitivity_.fit.surprise[k]), "");
        }
        page_.paragraph(
            fmt::format("Conflict among the findings: {:+.1f} bits; above 0 they go together worse than "
                        "unrelated findings would.",
                        sensitivity_.fit.conflict_bits));
    }

    /// Small chances matter here, so they keep a figure.
    static std::string percent_fine(double probability) {
        if (probability < 1e-4) {
            return "<0.01 %";
        }
        return probability < 0.095 ? fmt::format("{:.2g} %", 100.0 * probability) : percent(probability);
    }

    void without() {
        if (sensitivity_.without.empty()) {
            return;
        }
        page_.heading("Without each finding");
        page_.paragraph(
            "Whole percents here and below, to be compared with each other; the answer itself is no surer "
            "than its interval.");
        two_columns("", "leader has", "");
        two_columns("With all of them", percent(view_.ranked(0).posterior), "");
        for (const WithoutFinding& entry : sensitivity_.without) {
            const std::size_t leader = view_.weighing.ranking[0];
            two_columns(finding(entry.finding), percent(entry.posterior[leader]), "");
            if (entry.leader != leader) {
                page_.paragraph(fmt::format("then {} leads with {}", title(entry.leader),
                                            percent(entry.posterior[entry.leader])),
                                "      ", "      ");
            }
        }
    }

    void priors() {
        page_.heading("Priors at which a rival overtakes; all other causes in proportion");
        two_columns("", "now", "overtakes", "odds times");
        for (const Tipping& tipping : sensitivity_.tipping) {
            const auto [then, now] = percents_apart(tipping.prior, view_.cause(tipping.rival).prior);
            two_columns(title(tipping.rival), now, then, factor_shown(tipping.odds_factor));
        }
        if (!sensitivity_.range.empty()) {
            page_.heading("Posterior with every prior anywhere in its stated range (exact for these tables)");
            ranges(sensitivity_.range);
        }
        if (sensitivity_.epsilon) {
            page_.heading(fmt::format("Posterior with {} of the prior put anywhere (exact for these tables)",
                                      percent_as_typed(*sensitivity_.epsilon)));
            ranges(sensitivity_.contamination);
        }
        const std::size_t leader = view_.weighing.ranking[0];
        page_.heading(fmt::format("As the prior of \"{}\" moves", short_title(view_.cause(leader))));
        two_columns("", "prior", "posterior");
        const PriorSweep& sweep = sensitivity_.sweeps[leader];
        for (std::size_t i = 0; i < sweep.priors.size(); ++i) {
            two_columns("", percent(sweep.priors[i]), percent(sweep.posterior[i][leader]));
        }
    }

    void ranges(const std::vector<CauseRange>& list) {
        for (const std::size_t k : view_.weighing.ranking) {
            for (const CauseRange& range : list) {
                if (range.cause == k) {
                    page_.line("  " + padded(title(k), title_width) +
                               padded_left(percent_range(range.low, range.high), 20));
                }
            }
        }
    }

    void rows() {
        if (sensitivity_.rows.empty()) {
            return;
        }
        page_.heading("By how much each share would have to be wrong for another cause to lead");
        std::size_t impossible = 0;
        for (const RowFactor& row : sensitivity_.rows) {
            if (!row.possible) {
                ++impossible;
                continue;
            }
            std::string others;
            for (std::size_t i = 1; i < row.causes.size(); ++i) {
                others += fmt::format("{}\"{}\"", others.empty() ? "" : ", ",
                                      short_title(view_.cause(row.causes[i])));
            }
            page_.item(fmt::format("{} of \"{}\"{}: {}; {} its own 95 % interval ({} to {})",
                                   finding(row.finding), short_title(view_.cause(row.causes.front())),
                                   others.empty() ? "" : fmt::format(" (also taken by {})", others),
                                   factor_in_words(row.factor), row.inside ? "inside" : "outside",
                                   factor_shown(row.low), factor_shown(row.high)));
        }
        if (impossible > 0) {
            page_.item(fmt::format("{} other share{} would have to pass 100 %.", impossible,
                                   impossible == 1 ? "" : "s"));
        }
    }

    void edges() {
        if (sensitivity_.edges.empty()) {
            return;
        }
        page_.heading("Each value against its nearest band edge");
        page_.paragraph(
            "The chance is that of a repeat sample in a steady state, from the laboratory's scatter and the "
            "patient's own; "
            "illness and treatment move values more.");
        for (const ValueEdge& edge : sensitivity_.edges) {
            const std::size_t leader = view_.weighing.ranking[0];
            std::string text =
                fmt::format("{}, {}: \"{}\" {}", finding(edge.finding), beyond(view_, edge),
                            short_title(view_.cause(leader)), view_.leader_would_have(edge.posterior));
            if (edge.leader != leader) {
                text += fmt::format(", and \"{}\" leads", short_title(view_.cause(edge.leader)));
            }
            text += edge.chance ? fmt::format("; chance {} ({})", percent(*edge.chance),
                                              document::is_judged(*edge.weakest) ? "judged" : "published")
                                : "; no chance: " + edge.why_no_chance;
            for (const std::string& remark : edge.remarks) {
                text += "; " + remark;
            }
            page_.item(text);
        }
    }

    void variance() {
        if (sensitivity_.variance.empty()) {
            return;
        }
        page_.heading("Where the uncertainty of the leader's posterior comes from");
        page_.paragraph(
            "Alone: the share of its variance that would go if this were known. In all: the share that would "
            "stay if all else "
            "were known.");
        two_columns("", "alone", "in all", "error");
        for (const VarianceSource& source : sensitivity_.variance) {
            two_columns(source.source == "prior" ? "Priors" : finding(source.source),
                        fmt::format("{:.2f}", std::max(source.first, 0.0)),
                        fmt::format("{:.2f}", std::min(source.total, 1.0)),
                        fmt::format("{:.2f}", std::max(source.first_error, source.total_error)));
        }
    }

    void after() {
        if (sensitivity_.next.empty()) {
            return;
        }
        page_.heading("What each finding not yet known would do");
        const std::size_t leader = view_.weighing.ranking[0];
        for (const NextTest& test : sensitivity_.next) {
            std::string text = fmt::format("{} ({:.2f} bits, {}):", finding(test.finding), test.bits,
                                           burden_of(view_, test.finding));
            for (const AfterBand& band : test.after) {
                const auto first = static_cast<std::size_t>(
                    std::max_element(band.posterior.begin(), band.posterior.end()) - band.posterior.begin());
                std::string name = band.band;
                std::replace(name.begin(), name.end(), '_', ' ');
                text += fmt::format(
                    " {}, chance {}: {}{}", name, percent(band.probability), percent(band.posterior[leader]),
                    first == leader ? ";"
                                    : fmt::format(", \"{}\" leads with {};", short_title(view_.cause(first)),
                                                  percent(band.posterior[first])));
            }
            text.back() = '.';
            page_.item(text);
            const std::string& caution = view_.tables.find_table(test.finding)->caution;
            if (!caution.empty()) {
                page_.paragraph("Caution: " + caution, "      ", "      ");
            }
        }
    }

    const ReportView& view_;
    const Sensitivity& sensitivity_;
    Page& page_;
};

}  // namespace

void write_all_sensitivity(const ReportView& view, Page& page) {
    if (view.sensitivity != nullptr && view.weighing.weighed) {
        AllSensitivity(view, page).write();
    }
}

}  // namespace steelyard::cli
