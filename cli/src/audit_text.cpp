// SPDX-License-Identifier: Apache-2.0
// An audit as text: whether the probabilities can be believed comes first, then what this cannot say, then
// the figures.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "audit_page.hpp"
#include "steelyard/cli/numbers.hpp"
#include "steelyard/cli/terminal.hpp"

namespace steelyard::cli {
namespace {

class AuditText {
  public:
    AuditText(const Audit& audit, bool colour) : audit_(audit), words_(words_of(audit)), page_(colour) {}

    std::string write() {
        head();
        belief();
        comparison();
        limits();
        patients();
        if (audit_.figures) {
            scores();
            calibration();
            telling_apart();
            confusion();
            reliability();
            usefulness();
            strata();
            months();
        }
        outside();
        groups();
        origin();
        return page_.take();
    }

  private:
    const engine::AuditFigures& figures() const { return *audit_.figures; }

    void columns(const std::string& name, const std::vector<std::pair<std::string, std::size_t>>& cells,
                 std::size_t name_width) {
        std::string text = "  " + padded(shortened(name, name_width), name_width);
        for (const auto& [cell, width] : cells) {
            text += padded_left(cell, width);
        }
        text.erase(text.find_last_not_of(' ') + 1);
        page_.line(text);
    }

    /// Cut so that a column holds; what was cut is in the full title elsewhere, or in JSON.
    static std::string shortened(const std::string& text, std::size_t width) {
        const std::string safe = visible(text);
        if (text_width(safe) < width) {
            return safe;
        }
        std::string cut;
        for (std::size_t at = 0; at < safe.size() && text_width(cut) + 5 <= width;) {
            std::size_t end = at + 1;
            while (end < safe.size() && (static_cast<unsigned char>(safe[end]) & 0xC0U) == 0x80U) {
                ++end;
            }
            cut += safe.substr(at, end - at);
            at = end;
        }
        return cut + "...";
    }

    void head() {
        page_.line(std::string(page_width, '='));
        page_.paragraph(
            fmt::format("Audit of {} with a final diagnosis", patients_of(audit_.patients.diagnosed)), "",
            "  ");
        page_.line(std::string(page_width, '='));
    }

    void belief() {
        page_.heading("Can these probabilities be believed?");
        page_.paragraph(words_.headline);
        for (const std::string& remark : words_.remarks) {
            page_.item(remark);
        }
    }

    void comparison() {
        if (!audit_.against) {
            return;
        }
        const engine::PairedComparison& pair = audit_.against->difference;
        page_.heading("Which is better?");
        page_.paragraph(words_.comparison);
        page_.paragraph(
            "A: the tables and priors at the end of this page. B: " + other_name() +
            ". Differences are taken patient by patient; where the interval holds 0 they may be chance.");
        columns("", {{"A", 8}, {"B", 8}, {"A less B", 30}}, 30);
        const auto line = [&](const char* name, double first, double second, double difference,
                              const std::optional<engine::BootstrapInterval>& interval) {
            columns(name,
                    {{fmt::format("{:.3f}", first), 8},
                     {fmt::format("{:.3f}", second), 8},
                     {number_with_interval(difference, interval, 3), 30}},
                    30);
        };
        line("Log score (low is good)", pair.log_score.first, pair.log_score.second,
             pair.log_score.difference, pair.log_score.interval);
        line("Brier score (low is good)", pair.brier.first, pair.brier.second, pair.brier.difference,
             pair.brier.interval);
        line("Leading cause right", pair.top_1.first, pair.top_1.second, pair.top_1.difference,
             pair.top_1.interval);
        if (pair.hand_till) {
            line("Causes told apart", pair.hand_till->first, pair.hand_till->second,
                 pair.hand_till->difference, pair.hand_till->interval);
        }
    }

    std::string other_name() const {
        const Provenance& other = audit_.against->other;
        std::string name;
        if (other.tables_digest != audit_.provenance.tables_digest) {
            name = "tables " + other.tables_title;
        }
        if (other.priors_digest != audit_.provenance.priors_digest) {
            name += (name.empty() ? "" : ", ") + ("priors " + other.priors_title);
        }
        return name.empty() ? "the same again" : name;
    }

    void limits() {
        page_.heading("What this cannot say");
        for (const std::string& limit : words_.limits) {
            page_.item(limit);
        }
    }

    void patients() {
        page_.heading("Patients");
        const auto line = [&](const std::string& name, std::uint64_t count) {
            columns(name, {{grouped(count), 14}}, 60);
        };
        line("Read", audit_.flow.read);
        line("  could not be read", audit_.flow.set_aside);
        line("  out of scope, not weighed", audit_.flow.out_of_scope);
        line("  weighed", audit_.flow.weighed);
        line("    with a final cause that was weighed", audit_.patients.diagnosed);
        line("    with another final cause", audit_.patients.outside);
        line("    without a final cause", audit_.patients.undiagnosed);
        if (audit_.lost.patients > 0) {
            line(fmt::format("    dropped: fewer than {} in their cell", audit_.head.least_cell),
                 audit_.lost.patients);
        }
        if (audit_.patients.caution > 0) {
            page_.paragraph(fmt::format("Of those scored, {} were to be read with caution.",
                                        grouped(audit_.patients.caution)));
        }
        std::string list;
        for (const auto& [cause, count] : audit_.out_of_scope) {
            if (!cause.empty()) {
                list += fmt::format("{}{} ({})", list.empty() ? "" : "; ", cause, grouped(count));
            }
        }
        if (!list.empty()) {
            page_.paragraph("Final causes of those out of scope: " + list + ".");
        }
    }

    void scores() {
        const engine::ProperScores& scores = figures().scores;
        const engine::AuditIntervals* intervals = figures().intervals ? &*figures().intervals : nullptr;
        const auto interval =
            [&](const std::optional<engine::BootstrapInterval> engine::AuditIntervals::*of) {
                return intervals != nullptr ? intervals->*of : std::optional<engine::BootstrapInterval>();
            };
        page_.heading("How good they are, all causes together");
        page_.paragraph(fmt::format("Brackets: {} interval.", percent_as_typed(audit_.asked.level)));
        columns("", {{"these", 23}, {"by frequency", 14}, {"expected", 10}}, 31);
        columns(
            "Log score (0 is best)",
            {{number_with_interval(scores.log_score, interval(&engine::AuditIntervals::log_score), 3), 23},
             {fmt::format("{:.3f}", scores.log_score_of_base_rates), 14},
             {fmt::format("{:.3f}", scores.expected_log_score), 10}},
            31);
        columns("Brier score (0 best, 2 worst)",
                {{number_with_interval(scores.brier, interval(&engine::AuditIntervals::brier), 3), 23},
                 {fmt::format("{:.3f}", scores.brier_of_base_rates), 14},
                 {fmt::format("{:.3f}", scores.expected_brier), 10}},
                31);
        columns("Leading cause is the final one", {{percent_with_interval(figures().calls.top[0]), 23}}, 31);
        columns("Final one among the two first", {{percent_with_interval(figures().calls.top[1]), 23}}, 31);
        if (figures().pairs.hand_till) {
            columns("Two causes told apart",
                    {{number_with_interval(*figures().pairs.hand_till,
                                           interval(&engine::AuditIntervals::hand_till), 3),
                      23}},
                    31);
        }
        page_.paragraph(
            "By frequency: the score of giving everybody the shares of the final causes here. Expected: what "
            "the "
            "probabilities promise of themselves. Told apart: how often, of two patients with different "
            "causes, "
            "the one who has a cause was given more of it (Hand and Till's M; 0.5 is chance, 1 always).");
        engine::BrierDecomposition sum;
        for (const engine::CauseFigures& cause : figures().cause) {
            sum.reliability += cause.by_bin.reliability;
            sum.resolution += cause.by_bin.resolution;
            sum.uncertainty += cause.by_bin.uncertainty;
            sum.within_bin_variance += cause.by_bin.within_bin_variance;
            sum.within_bin_covariance += cause.by_bin.within_bin_covariance;
        }
        page_.paragraph(
            fmt::format("The Brier score in parts: {:.3f} wrongly stated (0 is best) - {:.3f} told by the "
                        "findings (more is "
                        "better) + {:.3f} open before any finding, and {:+.3f} within bins.",
                        sum.reliability, sum.resolution, sum.uncertainty,
                        sum.within_bin_variance - sum.within_bin_covariance));
        if (audit_.too_many_to_resample) {
            page_.paragraph(
                "2^31 patients and more are not resampled: intervals by resampling are left out.");
        }
    }

    std::string mark_of(std::size_t k) const {
        const CauseVerdict& verdict = words_.causes[k];
        if (!verdict.told) {
            return "too few";
        }
        if (verdict.commoner || verdict.rarer) {
            return verdict.commoner ? "commoner" : "rarer";
        }
        if (verdict.too_sure || verdict.too_cautious) {
            return verdict.too_sure ? "too sure" : "cautious";
        }
        return "fits";
    }

    void calibration() {
        page_.heading("Is each cause as probable as it was said to be?");
        columns("", {{"patients", 9}, {"given", 7}, {"found", 6}, {"slope", 20}, {"", 9}}, 27);
        for (std::size_t k = 0; k < audit_.causes.size(); ++k) {
            const engine::CauseCalibration& cause = figures().cause[k].calibration;
            const bool told = words_.causes[k].told;
            columns(short_name(audit_.causes[k]),
                    {{grouped(audit_.causes[k].patients), 9},
                     {percent(cause.mean_forecast), 7},
                     {fmt::format("{:.0f} %", 100.0 * cause.observed_share), 6},
                     {told ? number_with_interval(cause.slope, 2) : "-", 20},
                     {mark_of(k), 9}},
                    27);
        }
        page_.paragraph(
            "Given: the mean of its probabilities. Found: the share of patients who had it. Slope: 1 is "
            "right, "
            "below 1 its probabilities were too sure, above 1 too cautious. \"Fits\": nothing speaks against "
            "it.");
        const engine::TemperatureFit& temperature = figures().temperature;
        if (temperature.status == engine::FitStatus::found && temperature.exponent) {
            page_.paragraph(
                fmt::format("All causes together: the final causes fit best when every probability is raised "
                            "to the power {} "
                            "and rescaled; 1 is right, below 1 they were too sure.",
                            number_with_interval(temperature.exponent, 2)));
        }
        if (const auto& test = figures().spiegelhalter) {
            page_.paragraph(fmt::format(
                "Were they calibrated, a Brier score so far off would come about by chance in {} of series "
                "(Spiegelhalter's z {:.2f}).",
                percent(test->p_two_sided), test->z));
        }
        if (const auto& test = figures().recalibration.full_against_none) {
            page_.paragraph(
                fmt::format("Redoing all causes at once (multinomial recalibration, {} coefficients) would "
                            "fit better; were "
                            "they calibrated, so much better would come about by chance in {} of series.",
                            test->degrees, percent(test->p)));
        }
    }

    void telling_apart() {
        page_.heading("Is each cause told from the others?");
        page_.paragraph(
            "Named: it led. Of those who have it, how many it led for; of those who have another, how many "
            "it did "
            "not lead for; of those it led for, how many have it; of those it did not lead for, how many do "
            "not.");
        columns("", {{"have it: named", 19}, {"have not: not", 19}}, 34);
        columns("", {{"named: have it", 19}, {"not: have not", 19}}, 34);
        for (std::size_t k = 0; k < audit_.causes.size(); ++k) {
            const engine::CallAccuracy& calls = figures().calls.cause[k];
            const auto& area = figures().cause[k].area;
            columns(short_name(audit_.causes[k]),
                    {{percent_with_interval(calls.sensitivity), 19},
                     {percent_with_interval(calls.specificity), 19}},
                    34);
            std::string curve = "  area -";
            if (area) {
                curve = area->interval ? "  area " + number_with_interval(area->interval, 2)
                                       : fmt::format("  area {:.2f}", area->value);
            }
            columns(curve,
                    {{percent_with_interval(calls.positive_predictive_value), 19},
                     {percent_with_interval(calls.negative_predictive_value), 19}},
                    34);
        }
        page_.paragraph(
            "Area: the chance that a patient who has it was given more of it than one who has not (under the "
            "ROC "
            "curve; 0.5 is chance, 1 always). What a named cause is worth depends on the priors too.");
    }

    void confusion() {
        page_.heading("Final cause (rows) and leading cause (columns)");
        const std::size_t k = audit_.causes.size();
        constexpr std::size_t most_columns = 8;
        if (k > most_columns) {
            page_.paragraph("Too many causes for this page: see --as csv.");
            return;
        }
        const auto letter = [](std::size_t at) { return std::string(1, static_cast<char>('a' + at)); };
        const std::size_t name_width = page_width - 4 - 6 * k;
        std::vector<std::pair<std::string, std::size_t>> cells;
        for (std::size_t at = 0; at < k; ++at) {
            cells.emplace_back(letter(at), 6);
        }
        columns("", cells, name_width);
        for (std::size_t row = 0; row < k; ++row) {
            cells.clear();
            for (std::size_t column = 0; column < k; ++column) {
                const double count = figures().calls.confusion(static_cast<Eigen::Index>(row),
                                                               static_cast<Eigen::Index>(column));
                cells.emplace_back(
                    count < 99999.5 ? fmt::format("{:.0f}", count) : fmt::format("{:.0e}", count), 6);
            }
            columns(letter(row) + " " + short_name(audit_.causes[row]), cells, name_width);
        }
    }

    void reliability() {
        page_.heading("What was given to the leading cause, and how often it was right");
        columns("", {{"patients", 10}, {"mean given", 12}, {"was right", 20}}, 16);
        for (const engine::ReliabilityBin& bin : figures().leader.bins) {
            columns(fmt::format("{} to {} %", plain(100.0 * bin.low), plain(100.0 * bin.high)),
                    {{fmt::format("{:.0f}", bin.count), 10},
                     {percent(bin.mean_forecast), 12},
                     {percent_with_interval(bin.observed), 20}},
                    16);
        }
        const engine::CalibrationError& error = figures().leader.error;
        page_.paragraph(fmt::format(
            "On average the two differ by {:.1f} percentage points (expected calibration error). That is "
            "never 0: "
            "calibrated probabilities would show {:.1f} by chance, and above {:.1f} one time in twenty.",
            100.0 * error.value, 100.0 * error.expected_if_calibrated,
            100.0 * error.percentile_95_if_calibrated));
        page_.paragraph("Curves of each cause: --as csv or --as json.");
    }

    void usefulness() {
        if (figures().net_benefit.empty()) {
            return;
        }
        const auto cause =
            std::find_if(audit_.causes.begin(), audit_.causes.end(),
                         [&](const AuditedCause& one) { return one.id == audit_.asked.cause; });
        page_.heading(fmt::format("Would acting on them do good? {}", short_name(*cause)));
        columns("act from", {{"treated", 9}, {"net benefit", 26}, {"treating all", 14}, {"none", 8}}, 12);
        for (std::size_t i = 0; i < figures().net_benefit.size(); ++i) {
            const engine::NetBenefit& net = figures().net_benefit[i];
            const auto interval = figures().intervals ? figures().intervals->net_benefit[i]
                                                      : std::optional<engine::BootstrapInterval>();
            columns(percent_as_typed(net.threshold),
                    {{percent(net.treated), 9},
                     {number_with_interval(net.value, interval, 3), 26},
                     {fmt::format("{:.3f}", net.treat_all), 14},
                     {"0", 8}},
                    12);
        }
        page_.paragraph(
            "Patients rightly treated, less those wrongly treated weighed by the odds of the threshold, per "
            "patient. "
            "Good is done where it lies above both treating all and treating none.");
    }

    void strata() {
        if (audit_.strata.empty()) {
            return;
        }
        std::string by;
        for (const std::string& column : audit_.head.by) {
            by += (by.empty() ? "" : " / ") + column;
        }
        page_.heading("By " + visible(by));
        columns("", {{"patients", 9}, {"log score", 23}, {"leader given", 13}, {"right", 8}}, 24);
        for (const AuditedStratum& stratum : audit_.strata) {
            const std::string name = stratum.stratum.empty() ? "(not known)" : stratum.stratum;
            if (!stratum.figures) {
                columns(name, {{"0", 9}}, 24);
                continue;
            }
            const engine::AuditFigures& of = *stratum.figures;
            const auto interval =
                of.intervals ? of.intervals->log_score : std::optional<engine::BootstrapInterval>();
            columns(name,
                    {{grouped(stratum.patients.diagnosed), 9},
                     {number_with_interval(of.scores.log_score, interval, 2), 23},
                     {percent(mean_leader(of)), 13},
                     {percent(of.calls.top.front().value), 8}},
                    24);
        }
        page_.paragraph(
            "Strata differ in their patients as well as in how good the probabilities are, and with many "
            "strata "
            "some stand out by chance. All figures of each: --as json.");
    }

    void months() {
        if (!audit_.months) {
            return;
        }
        page_.heading("Over time");
        columns("", {{"patients", 9}, {"log score", 11}, {"expected", 10}, {"limits", 18}}, 12);
        bool any_outside = false;
        for (std::size_t i = 0; i < audit_.months->months.size(); ++i) {
            const engine::ScorePeriod& period = audit_.months->chart.periods[i];
            if (!period.log_score) {
                columns(audit_.months->months[i], {{"0", 9}}, 12);
                continue;
            }
            any_outside = any_outside || period.outside;
            columns(audit_.months->months[i],
                    {{fmt::format("{:.0f}", period.patients), 9},
                     {fmt::format("{:.2f}", *period.log_score), 11},
                     {fmt::format("{:.2f}", *period.expected), 10},
                     {fmt::format("{:.2f} to {:.2f}", *period.low, *period.high), 18},
                     {period.outside ? "outside" : "", 10}},
                    12);
        }
        page_.paragraph(fmt::format(
            "{} Limits: the mean of all months and three standard errors either way, so that about 1 month "
            "in 300 "
            "lies outside by chance. Expected: what that month's probabilities promised.",
            any_outside
                ? "Some month lies outside its limits: look for what changed then in patients, laboratory or "
                  "tables."
                : "No month lies outside its limits."));
        if (audit_.months->without_month > 0) {
            page_.paragraph(patients_of(audit_.months->without_month) +
                            " have no date and are left out here.");
        }
    }

    static std::string flagged(const FlaggedPatients& of) {
        return of.share ? fmt::format("{} of {}", grouped(of.flagged), grouped(of.judged)) : "-";
    }

    void outside() {
        if (audit_.patients.outside == 0) {
            return;
        }
        page_.heading("Final causes that were not weighed");
        page_.paragraph(
            "The probabilities add up to 1 over the causes weighed, so one of these led all the same. "
            "Flagged: the "
            "report said that no cause explains the findings.");
        columns("", {{"patients", 9}, {"flagged", 14}, {"leader given", 14}}, 38);
        constexpr std::size_t most_shown = 20;
        for (std::size_t i = 0; i < std::min(audit_.fit.causes.size(), most_shown); ++i) {
            const FlaggedPatients& cause = audit_.fit.causes[i];
            columns(cause.cause,
                    {{grouped(cause.patients), 9}, {flagged(cause), 14}, {percent(cause.mean_leader), 14}},
                    38);
        }
        if (audit_.fit.causes.size() > most_shown) {
            page_.paragraph(
                fmt::format("And {} more causes: --as csv.", audit_.fit.causes.size() - most_shown));
        }
        columns("all of these",
                {{grouped(audit_.fit.outside.patients), 9},
                 {flagged(audit_.fit.outside), 14},
                 {percent(audit_.fit.outside.mean_leader), 14}},
                38);
        if (audit_.fit.inside.patients > 0) {
            columns("those with a cause that was weighed",
                    {{grouped(audit_.fit.inside.patients), 9},
                     {flagged(audit_.fit.inside), 14},
                     {percent(audit_.fit.inside.mean_leader), 14}},
                    38);
        }
        if (audit_.fit.area) {
            page_.paragraph(
                fmt::format("A patient from outside had more unusual findings than one from inside in {} of "
                            "pairs (50 % is "
                            "chance). Those whose disease resembles one of the list are not flagged.",
                            percent(audit_.fit.area->value)));
        }
    }

    void groups() {
        if (!audit_.asked.dependence) {
            return;
        }
        page_.heading("How much findings repeat each other: a suggestion");
        page_.paragraph(
            "rho is 0 when findings of a group each count in full and 1 when together they count as one. "
            "Below is "
            "what makes the final causes of these patients likeliest. Read it as a suggestion; it is written "
            "to a "
            "file only with --write-groups.");
        columns("", {{"patients", 10}, {"now", 7}, {"estimated", 23}}, 34);
        for (const GroupEstimate& group : audit_.groups) {
            std::string estimate = "cannot be told";
            if (group.fitted) {
                estimate = fmt::format("{:.2f} ({:.2f} to {:.2f})", group.fitted->rho, group.fitted->low,
                                       group.fitted->high);
            }
            columns(
                group.name,
                {{grouped(group.patients), 10}, {fmt::format("{:.2f}", group.rho_now), 7}, {estimate, 23}},
                34);
        }
        page_.paragraph(
            "Brackets: 95 % interval. Patients: those with two or more findings of the group. There is "
            "reason to "
            "change rho only where the interval leaves out what it is now.");
        const std::string yaml = groups_yaml(audit_);
        if (yaml.empty()) {
            page_.paragraph("No group gives reason to change its rho.");
            return;
        }
        page_.line();
        for (std::size_t at = 0; at < yaml.size();) {
            const std::size_t end = yaml.find('\n', at);
            page_.line("    " + yaml.substr(at, end - at));
            at = end + 1;
        }
    }

    void origin() {
        page_.line();
        page_.line(std::string(page_width, '-'));
        const Provenance& from = audit_.provenance;
        page_.paragraph(fmt::format("Tables: {} ({}, {})", from.tables_title, from.tables_name,
                                    from.tables_digest.substr(0, 23)),
                        "", "  ");
        if (audit_.head.tables_digest != from.tables_digest) {
            page_.paragraph(fmt::format("The cases were read with other tables of the same bands: {} ({})",
                                        audit_.head.tables_title, audit_.head.tables_digest.substr(0, 23)),
                            "", "  ");
        }
        page_.paragraph(fmt::format("Priors: {} ({}, {})", from.priors_title, from.priors_name,
                                    from.priors_digest.substr(0, 23)),
                        "", "  ");
        page_.line(fmt::format("Program: steelyard {}; seed {}, {} replicates", from.version,
                               audit_.asked.seed, audit_.asked.replicates));
        page_.paragraph(std::string("Caution: ") + caution_text, "", "  ");
        if (!audit_.tables_caution.empty()) {
            page_.paragraph("These tables: " + audit_.tables_caution, "", "  ");
        }
    }

    const Audit& audit_;
    AuditWords words_;
    Page page_;
};

}  // namespace

std::string audit_text(const Audit& audit, bool colour) {
    return AuditText(audit, colour).write();
}

}  // namespace steelyard::cli
