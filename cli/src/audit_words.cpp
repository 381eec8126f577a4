// SPDX-License-Identifier: Apache-2.0
// What an audit comes to, in words: first whether the probabilities can be believed, then what is too sure or
// too cautious, what cannot be told, and what no audit of such patients can say. docs/audit.md explains the
// rules.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "audit_page.hpp"
#include "steelyard/cli/numbers.hpp"

namespace steelyard::cli {
namespace {

using engine::FitStatus;

/// Two-sided normal p value of an estimate against a value.
double p_value(double estimate, double error, double against) {
    return std::erfc(std::abs(estimate - against) / error / std::sqrt(2.0));
}

CauseVerdict verdict_of(const engine::CauseFigures& cause, double patients, double cut) {
    CauseVerdict verdict;
    verdict.told = cause.cases >= least_events && patients - cause.cases >= least_events;
    if (!verdict.told) {
        return verdict;
    }
    const engine::CauseCalibration& calibration = cause.calibration;
    if (calibration.in_the_large && calibration.in_the_large_error &&
        p_value(calibration.in_the_large->value, *calibration.in_the_large_error, 0.0) < cut) {
        (calibration.in_the_large->value > 0.0 ? verdict.commoner : verdict.rarer) = true;
    }
    if (calibration.cox && p_value(calibration.cox->slope, calibration.cox->slope_error, 1.0) < cut) {
        (calibration.cox->slope < 1.0 ? verdict.too_sure : verdict.too_cautious) = true;
    }
    return verdict;
}

/// The power to which all probabilities would have to be raised is known well enough: if it were at either
/// end of its interval, 90 % of two causes would still be between 81 and 96 %. Judgement; docs/audit.md.
bool sharp(const engine::TemperatureFit& temperature) {
    return temperature.status == FitStatus::found && temperature.exponent &&
           temperature.exponent->low >= 2.0 / 3.0 && temperature.exponent->high <= 3.0 / 2.0;
}

AuditVerdict overall(const engine::AuditFigures& figures, const std::vector<CauseVerdict>& causes,
                     double level) {
    const auto any = [&](const auto& holds) { return std::any_of(causes.begin(), causes.end(), holds); };
    if (!any([](const CauseVerdict& cause) { return cause.told; })) {
        return AuditVerdict::too_few;
    }
    if (figures.temperature.status == FitStatus::found && figures.temperature.exponent) {
        if (figures.temperature.exponent->high < 1.0) {
            return AuditVerdict::too_sure;
        }
        if (figures.temperature.exponent->low > 1.0) {
            return AuditVerdict::too_cautious;
        }
    } else if (figures.log_score_test && figures.log_score_test->p_two_sided < 1.0 - level) {
        return figures.log_score_test->z > 0.0 ? AuditVerdict::too_sure : AuditVerdict::too_cautious;
    }
    const bool shifted = any([](const CauseVerdict& cause) {
        return cause.commoner || cause.rarer || cause.too_sure || cause.too_cautious;
    });
    if (shifted) {
        return AuditVerdict::shifted;
    }
    return sharp(figures.temperature) ? AuditVerdict::fits : AuditVerdict::unclear;
}

std::string headline_of(const Audit& audit, AuditVerdict verdict) {
    const std::uint64_t n = audit.patients.diagnosed;
    if (verdict == AuditVerdict::nobody) {
        return "This cannot be told: no patient here has a final cause among those weighed.";
    }
    const engine::AuditFigures& figures = *audit.figures;
    const std::string leader =
        fmt::format("the leading cause was given {} on average, and was the final one in {} of {}",
                    percent(mean_leader(figures)), percent(figures.calls.top.front().value), patients_of(n));
    switch (verdict) {
        case AuditVerdict::too_few:
            return fmt::format(
                "This cannot be told from {}: no cause has {:.0f} patients who have it and {:.0f} who have "
                "another.",
                patients_of(n), least_events, least_events);
        case AuditVerdict::too_sure:
            return fmt::format(
                "Not as they stand: in this series they were too sure. {}. Read high ones as lower and low "
                "ones "
                "as higher than printed.",
                capital(leader));
        case AuditVerdict::too_cautious:
            return fmt::format(
                "Yes, and they could have said more: in this series they were too cautious. {}.",
                capital(leader));
        case AuditVerdict::shifted:
            return fmt::format(
                "As a whole yes, but not for every cause: {}; the causes named below were off.", leader);
        case AuditVerdict::unclear:
            return fmt::format("Nothing here speaks against them, but {} would show gross errors only: {}.",
                               patients_of(n), leader);
        default:
            return fmt::format("In this series yes, as far as {} can show: {}.", patients_of(n), leader);
    }
}

std::string names_of(const Audit& audit, const std::vector<CauseVerdict>& causes,
                     const std::function<bool(const CauseVerdict&)>& holds, bool shares) {
    std::string list;
    for (std::size_t k = 0; k < causes.size(); ++k) {
        if (!holds(causes[k])) {
            continue;
        }
        const engine::CauseCalibration& calibration = audit.figures->cause[k].calibration;
        list += (list.empty() ? "" : "; ") + short_name(audit.causes[k]);
        if (shares) {
            const auto [given, found] = percents_apart(calibration.mean_forecast, calibration.observed_share);
            list += fmt::format(" (given {} on average, found in {})", given, found);
        }
    }
    return list;
}

void add_cause_remarks(const Audit& audit, AuditWords& words) {
    const auto add = [&](const char* beginning, const std::function<bool(const CauseVerdict&)>& holds,
                         bool shares, const char* end) {
        if (const std::string names = names_of(audit, words.causes, holds, shares); !names.empty()) {
            words.remarks.push_back(fmt::format("{}: {}{}", beginning, names, end));
        }
    };
    add(
        "Commoner than its probabilities said", [](const CauseVerdict& c) { return c.commoner; }, true, ".");
    add(
        "Rarer than its probabilities said", [](const CauseVerdict& c) { return c.rarer; }, true, ".");
    add(
        "Too sure, for it or against it", [](const CauseVerdict& c) { return c.too_sure; }, false, ".");
    add(
        "Too cautious, for it or against it", [](const CauseVerdict& c) { return c.too_cautious; }, false,
        ".");

    std::string few;
    for (std::size_t k = 0; k < words.causes.size(); ++k) {
        if (!words.causes[k].told) {
            few += fmt::format("{}{} ({})", few.empty() ? "" : "; ", short_name(audit.causes[k]),
                               audit.causes[k].patients);
        }
    }
    if (!few.empty()) {
        words.remarks.push_back(fmt::format(
            "Too few to tell: {}. The rule: at least {:.0f} patients with the cause and {:.0f} with another "
            "(common practice). Even with that many only gross errors show; for a firm answer 100 and more "
            "with the cause are asked for.",
            few, least_events, least_events));
    }
}

void add_score_remarks(const Audit& audit, AuditWords& words) {
    const engine::AuditFigures& figures = *audit.figures;
    const engine::ProperScores& scores = figures.scores;
    if (std::isnan(scores.log_skill)) {
        words.remarks.push_back(
            "All patients have one final cause, so how well causes are told apart cannot be seen here.");
    } else if (scores.log_skill <= 0.0) {
        words.remarks.push_back(
            "No better than guessing by frequency: to give everybody the shares of the final causes in this "
            "series would have scored as well or better.");
    }
    if (figures.temperature.status == FitStatus::separated) {
        words.remarks.push_back(
            "The final cause always led, so how sure the probabilities should be cannot be worked out.");
    }
    const FlaggedPatients& inside = audit.fit.inside;
    if (inside.share && inside.share->low > 2.0 * unexplained_below) {
        words.remarks.push_back(
            fmt::format("In {} of the patients no cause explained the findings, where about {} or fewer "
                        "would be expected: the "
                        "tables may not describe these patients.",
                        percent(inside.share->value), percent_as_typed(unexplained_below)));
    }
}

void add_limits(const Audit& audit, AuditWords& words) {
    if (audit.lost.patients > 0) {
        words.limits.push_back(fmt::format(
            "{} were dropped before this audit, because fewer than {} shared their cell of the tally. Those "
            "left "
            "have the common patterns and are no fair sample; figures here are likely to be too good.",
            patients_of(audit.lost.patients), audit.head.least_cell));
    }
    if (audit.patients.undiagnosed > 0) {
        words.limits.push_back(
            fmt::format("{} have no final cause. They are not a random part: who is worked up to a diagnosis "
                        "depends on the "
                        "very findings weighed here (verification bias), so figures of the others do not "
                        "carry over to them.",
                        patients_of(audit.patients.undiagnosed)));
    } else {
        words.limits.push_back(
            "Every patient here has a final cause. Were those without one left out beforehand, the figures "
            "are those "
            "of the patients who could be diagnosed, and these are not a random part (verification bias).");
    }
    words.limits.push_back(
        "A published or selected series is not the clinic: it has other shares of the causes, clearer cases, "
        "and "
        "often final causes that were settled by these same findings. How the figures turn out depends on "
        "the "
        "priors as much as on the tables.");
    words.limits.push_back(
        "If tables or priors were made from these same patients, the figures flatter them.");
}

/// One figure compared: which side is better, or that it cannot be told.
int better_side(const engine::PairedDifference& difference) {
    if (!difference.interval || (difference.interval->low <= 0.0 && difference.interval->high >= 0.0)) {
        return 0;
    }
    return difference.difference < 0.0 ? 1 : -1;
}

std::string comparison_of(const Audit& audit) {
    if (!audit.against) {
        return {};
    }
    const Provenance& other = audit.against->other;
    const bool by_priors = other.priors_digest != audit.provenance.priors_digest ||
                           other.tables_digest == audit.provenance.tables_digest;
    const std::string first = by_priors ? audit.provenance.priors_title : audit.provenance.tables_title;
    const std::string second = by_priors ? other.priors_title : other.tables_title;
    const engine::PairedComparison& difference = audit.against->difference;
    const int by_log = better_side(difference.log_score);
    const int by_brier = better_side(difference.brier);
    if (by_log == 0 && by_brier == 0) {
        return fmt::format(
            R"(On these patients it cannot be told whether "{}" or "{}" gave the better probabilities.)",
            first, second);
    }
    if (by_log != 0 && by_brier != 0 && by_log != by_brier) {
        return fmt::format(
            R"("{}" and "{}" each do better by one of the two scores: one is rarely far off, the other better on the )"
            "whole. Neither is better outright.",
            first, second);
    }
    const bool first_wins = by_log + by_brier > 0;
    return fmt::format(
        R"("{}" gave these patients better probabilities than "{}"{}.)", first_wins ? first : second,
        first_wins ? second : first,
        by_log != 0 && by_brier != 0 ? "" : ", by one of the two scores; the other cannot tell");
}

}  // namespace

std::string_view to_string(AuditVerdict verdict) noexcept {
    switch (verdict) {
        case AuditVerdict::nobody:
            return "nobody";
        case AuditVerdict::too_few:
            return "too_few";
        case AuditVerdict::unclear:
            return "unclear";
        case AuditVerdict::fits:
            return "fits";
        case AuditVerdict::too_sure:
            return "too_sure";
        case AuditVerdict::too_cautious:
            return "too_cautious";
        case AuditVerdict::shifted:
            return "shifted";
    }
    return "";
}

AuditWords words_of(const Audit& audit) {
    AuditWords words;
    words.causes.resize(audit.causes.size());
    if (audit.figures) {
        const auto patients = static_cast<double>(audit.patients.diagnosed);
        const auto told = std::count_if(
            audit.figures->cause.begin(), audit.figures->cause.end(), [&](const engine::CauseFigures& cause) {
                return cause.cases >= least_events && patients - cause.cases >= least_events;
            });
        // Each cause is asked two questions; the chance of any false alarm stays at 1 - level.
        const double cut = (1.0 - audit.asked.level) / std::max(2.0 * static_cast<double>(told), 1.0);
        for (std::size_t k = 0; k < words.causes.size(); ++k) {
            words.causes[k] = verdict_of(audit.figures->cause[k], patients, cut);
        }
        words.verdict = overall(*audit.figures, words.causes, audit.asked.level);
        add_cause_remarks(audit, words);
        add_score_remarks(audit, words);
    }
    words.headline = headline_of(audit, words.verdict);
    add_limits(audit, words);
    words.comparison = comparison_of(audit);
    return words;
}

}  // namespace steelyard::cli
