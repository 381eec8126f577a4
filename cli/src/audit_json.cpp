// SPDX-License-Identifier: Apache-2.0
// An audit as JSON `steelyard.audit/1`. docs/audit.schema.json gives every key.
#include <cmath>

#include "audit_page.hpp"

namespace steelyard::cli {
namespace {

using Json = nlohmann::ordered_json;
using Boot = std::optional<engine::BootstrapInterval>;

Json number(double value) {
    return std::isfinite(value) ? Json(value) : Json(nullptr);
}

Json estimate(const std::optional<engine::IntervalEstimate>& of) {
    if (!of) {
        return nullptr;
    }
    return {{"value", number(of->value)}, {"low", number(of->low)}, {"high", number(of->high)}};
}

/// A figure with its interval by resampling; limits are null where there is none.
Json resampled(double value, const Boot& interval) {
    return {{"value", number(value)},
            {"low", interval ? number(interval->low) : Json(nullptr)},
            {"high", interval ? number(interval->high) : Json(nullptr)}};
}

Json test_json(const std::optional<engine::CalibrationTest>& test) {
    return test ? Json{{"z", number(test->z)}, {"p", number(test->p_two_sided)}} : Json(nullptr);
}

Json test_json(const std::optional<engine::LikelihoodRatioTest>& test) {
    return test ? Json{{"chi2", number(test->chi2)}, {"degrees", test->degrees}, {"p", number(test->p)}}
                : Json(nullptr);
}

std::string_view status_word(engine::FitStatus status) {
    switch (status) {
        case engine::FitStatus::found:
            return "found";
        case engine::FitStatus::no_case:
            return "no_case";
        case engine::FitStatus::only_cases:
            return "only_cases";
        case engine::FitStatus::constant_forecast:
            return "constant_forecast";
        case engine::FitStatus::separated:
            return "separated";
        case engine::FitStatus::too_many_causes:
            return "too_many_causes";
        case engine::FitStatus::no_maximum_reached:
            return "no_maximum_reached";
    }
    return "";
}

template <class Array>
Json matrix(const Array& values) {
    Json rows = Json::array();
    for (Eigen::Index row = 0; row < values.rows(); ++row) {
        Json list = Json::array();
        for (Eigen::Index column = 0; column < values.cols(); ++column) {
            list.push_back(number(values(row, column)));
        }
        rows.push_back(std::move(list));
    }
    return rows;
}

Json list(const Eigen::ArrayXd& values) {
    Json numbers = Json::array();
    for (const double value : values) {
        numbers.push_back(number(value));
    }
    return numbers;
}

Json brier_json(const engine::BrierDecomposition& parts) {
    return {{"brier", number(parts.brier)},
            {"reliability", number(parts.reliability)},
            {"resolution", number(parts.resolution)},
            {"uncertainty", number(parts.uncertainty)},
            {"within_bin_variance", number(parts.within_bin_variance)},
            {"within_bin_covariance", number(parts.within_bin_covariance)}};
}

Json reliability_json(const engine::Reliability& reliability, const Boot& error) {
    Json bins = Json::array();
    for (const engine::ReliabilityBin& bin : reliability.bins) {
        bins.push_back({{"from", bin.low},
                        {"to", bin.high},
                        {"patients", number(bin.count)},
                        {"mean_given", number(bin.mean_forecast)},
                        {"came_true", estimate(bin.observed)}});
    }
    return {{"bins", bins},
            {"calibration_error", resampled(reliability.error.value, error)},
            {"expected_if_calibrated", number(reliability.error.expected_if_calibrated)},
            {"percentile_95_if_calibrated", number(reliability.error.percentile_95_if_calibrated)},
            {"largest_gap", number(reliability.largest_gap)}};
}

/// The interval of one cause; none without resampling.
Boot interval_of(const std::optional<engine::AuditIntervals>& intervals,
                 const std::vector<Boot> engine::AuditIntervals::*of, std::size_t k) {
    return intervals ? ((*intervals).*of)[k] : Boot();
}
Boot interval_of(const std::optional<engine::AuditIntervals>& intervals,
                 const Boot engine::AuditIntervals::*of) {
    return intervals ? (*intervals).*of : Boot();
}

Json cause_json(const engine::AuditFigures& figures, std::size_t k, const AuditedCause& audited) {
    using Intervals = engine::AuditIntervals;
    const engine::CauseFigures& cause = figures.cause[k];
    const engine::CallAccuracy& calls = figures.calls.cause[k];
    const auto cox = [&](double value, const std::optional<engine::IntervalEstimate>& wald,
                         const std::vector<Boot> Intervals::*of) -> Json {
        if (!wald) {
            return nullptr;
        }
        Json json = estimate(wald);
        const Boot boot = interval_of(figures.intervals, of, k);
        json["value"] = number(value);
        json["resampled_low"] = boot ? number(boot->low) : Json(nullptr);
        json["resampled_high"] = boot ? number(boot->high) : Json(nullptr);
        return json;
    };
    const engine::CauseCalibration& calibration = cause.calibration;
    Json json = {{"id", audited.id},
                 {"patients", number(cause.cases)},
                 {"mean_given", number(calibration.mean_forecast)},
                 {"observed_share", number(calibration.observed_share)},
                 {"sensitivity", estimate(calls.sensitivity)},
                 {"specificity", estimate(calls.specificity)},
                 {"positive_predictive_value", estimate(calls.positive_predictive_value)},
                 {"negative_predictive_value", estimate(calls.negative_predictive_value)}};
    json["area"] = nullptr;
    if (cause.area) {
        const Boot boot = interval_of(figures.intervals, &Intervals::area, k);
        json["area"] = {{"value", number(cause.area->value)},
                        {"low", cause.area->interval ? number(cause.area->interval->low) : Json(nullptr)},
                        {"high", cause.area->interval ? number(cause.area->interval->high) : Json(nullptr)},
                        {"resampled_low", boot ? number(boot->low) : Json(nullptr)},
                        {"resampled_high", boot ? number(boot->high) : Json(nullptr)}};
    }
    json["in_the_large"] = estimate(calibration.in_the_large);
    json["calibration_status"] = status_word(calibration.status);
    json["intercept"] =
        cox(calibration.cox ? calibration.cox->intercept : 0.0, calibration.intercept, &Intervals::intercept);
    json["slope"] = cox(calibration.cox ? calibration.cox->slope : 1.0, calibration.slope, &Intervals::slope);
    json["spiegelhalter"] = test_json(cause.spiegelhalter);
    json["brier_by_forecast"] = brier_json(cause.by_forecast);
    json["brier_by_bin"] = brier_json(cause.by_bin);
    json["reliability"] =
        reliability_json(cause.reliability, interval_of(figures.intervals, &Intervals::calibration_error, k));
    return json;
}

Json recalibration_json(const engine::Recalibration& fit, const std::vector<AuditedCause>& causes) {
    return {{"reference", causes[static_cast<std::size_t>(fit.reference)].id},
            {"status", status_word(fit.status)},
            {"coefficients", matrix(fit.coefficient)},
            {"standard_errors", matrix(fit.standard_error)},
            {"intercepts_status", status_word(fit.intercepts_status)},
            {"intercepts", list(fit.intercept)},
            {"intercept_errors", list(fit.intercept_error)},
            {"intercepts_against_none", test_json(fit.intercepts_against_none)},
            {"full_against_none", test_json(fit.full_against_none)},
            {"full_against_intercepts", test_json(fit.full_against_intercepts)}};
}

Json figures_json(const std::optional<engine::AuditFigures>& of, const Audit& audit) {
    using Intervals = engine::AuditIntervals;
    if (!of) {
        return nullptr;
    }
    const engine::AuditFigures& figures = *of;
    const engine::ProperScores& scores = figures.scores;
    const auto interval = [&](const Boot Intervals::*member) {
        return interval_of(figures.intervals, member);
    };
    Json json = {{"patients", number(figures.patients)}};
    json["scores"] = {{"log_score", resampled(scores.log_score, interval(&Intervals::log_score))},
                      {"brier", resampled(scores.brier, interval(&Intervals::brier))},
                      {"log_skill", resampled(scores.log_skill, interval(&Intervals::log_skill))},
                      {"brier_skill", resampled(scores.brier_skill, interval(&Intervals::brier_skill))},
                      {"log_score_of_base_rates", number(scores.log_score_of_base_rates)},
                      {"brier_of_base_rates", number(scores.brier_of_base_rates)},
                      {"expected_log_score", number(scores.expected_log_score)},
                      {"expected_brier", number(scores.expected_brier)},
                      {"spiegelhalter", test_json(figures.spiegelhalter)},
                      {"log_score_test", test_json(figures.log_score_test)}};
    json["top"] = Json::array();
    for (const engine::IntervalEstimate& top : figures.calls.top) {
        json["top"].push_back(estimate(top));
    }
    json["confusion"] = matrix(figures.calls.confusion);
    json["hand_till"] = nullptr;
    if (figures.pairs.hand_till) {
        json["hand_till"] = resampled(*figures.pairs.hand_till, interval(&Intervals::hand_till));
    }
    json["pairs"] = figures.pairs.pairs;
    json["pairwise_areas"] = matrix(figures.pairs.area);
    json["leader"] = reliability_json(figures.leader, interval(&Intervals::leader_calibration_error));
    json["temperature"] = {{"status", status_word(figures.temperature.status)},
                           {"exponent", estimate(figures.temperature.exponent)}};
    json["recalibration"] = recalibration_json(figures.recalibration, audit.causes);
    json["net_benefit"] = Json::array();
    for (std::size_t i = 0; i < figures.net_benefit.size(); ++i) {
        const engine::NetBenefit& net = figures.net_benefit[i];
        json["net_benefit"].push_back(
            {{"cause", audit.asked.cause},
             {"threshold", net.threshold},
             {"net_benefit",
              resampled(net.value, interval_of(figures.intervals, &Intervals::net_benefit, i))},
             {"treat_all", number(net.treat_all)},
             {"treated", number(net.treated)}});
    }
    json["causes"] = Json::array();
    for (std::size_t k = 0; k < figures.cause.size(); ++k) {
        json["causes"].push_back(cause_json(figures, k, audit.causes[k]));
    }
    return json;
}

Json patients_json(const AuditedPatients& patients) {
    return {{"scored", patients.diagnosed},
            {"outside", patients.outside},
            {"undiagnosed", patients.undiagnosed},
            {"caution", patients.caution},
            {"patterns", patients.patterns}};
}

Json flow_json(const Audit& audit) {
    Json json = {{"read", audit.flow.read},
                 {"set_aside", audit.flow.set_aside},
                 {"out_of_scope", audit.flow.out_of_scope},
                 {"weighed", audit.flow.weighed},
                 {"scored", audit.patients.diagnosed},
                 {"outside", audit.patients.outside},
                 {"undiagnosed", audit.patients.undiagnosed},
                 {"dropped", audit.lost.patients},
                 {"dropped_cells", audit.lost.cells},
                 {"least_cell", audit.head.least_cell},
                 {"caution", audit.patients.caution},
                 {"patterns", audit.patients.patterns}};
    json["out_of_scope_by_final_cause"] = Json::array();
    for (const auto& [cause, patients] : audit.out_of_scope) {
        json["out_of_scope_by_final_cause"].push_back({{"final_cause", cause}, {"patients", patients}});
    }
    return json;
}

Json verdict_json(const Audit& audit, const AuditWords& words) {
    Json causes = Json::array();
    for (std::size_t k = 0; k < words.causes.size(); ++k) {
        const CauseVerdict& verdict = words.causes[k];
        const char* level = verdict.commoner ? "commoner" : verdict.rarer ? "rarer" : "as_given";
        const char* strength = verdict.too_sure ? "too_sure" : verdict.too_cautious ? "too_cautious" : "fits";
        causes.push_back({{"id", audit.causes[k].id},
                          {"told", verdict.told},
                          {"level", verdict.told ? Json(level) : Json(nullptr)},
                          {"strength", verdict.told ? Json(strength) : Json(nullptr)}});
    }
    return {{"word", to_string(words.verdict)}, {"headline", words.headline},   {"remarks", words.remarks},
            {"limits", words.limits},           {"least_events", least_events}, {"causes", causes}};
}

Json months_json(const AuditedMonths& months) {
    Json periods = Json::array();
    const auto optional = [](const std::optional<double>& value) {
        return value ? number(*value) : Json(nullptr);
    };
    for (std::size_t i = 0; i < months.months.size(); ++i) {
        const engine::ScorePeriod& period = months.chart.periods[i];
        periods.push_back({{"month", months.months[i]},
                           {"patients", number(period.patients)},
                           {"log_score", optional(period.log_score)},
                           {"expected", optional(period.expected)},
                           {"low", optional(period.low)},
                           {"high", optional(period.high)},
                           {"outside", period.outside},
                           {"z_against_expected", optional(period.z_against_expected)}});
    }
    return {{"mean", number(months.chart.mean)},
            {"sd", number(months.chart.sd)},
            {"expected", number(months.chart.expected)},
            {"without_month", months.without_month},
            {"months", periods}};
}

Json flagged_json(const FlaggedPatients& of) {
    return {{"patients", of.patients},
            {"judged", of.judged},
            {"flagged", of.flagged},
            {"share", estimate(of.share)},
            {"mean_leader", of.patients > 0 ? number(of.mean_leader) : Json(nullptr)}};
}

Json fit_json(const AuditedFit& fit) {
    Json json = {{"unexplained_below", unexplained_below},
                 {"exact", fit.exact},
                 {"inside", flagged_json(fit.inside)},
                 {"outside", flagged_json(fit.outside)}};
    json["area"] = nullptr;
    if (fit.area) {
        json["area"] = {{"value", number(fit.area->value)},
                        {"low", fit.area->interval ? number(fit.area->interval->low) : Json(nullptr)},
                        {"high", fit.area->interval ? number(fit.area->interval->high) : Json(nullptr)}};
    }
    json["causes"] = Json::array();
    for (const FlaggedPatients& cause : fit.causes) {
        Json entry = {{"final_cause", cause.cause}};
        entry.update(flagged_json(cause));
        json["causes"].push_back(std::move(entry));
    }
    return json;
}

Json source_json(const Provenance& from) {
    return {{"version", from.version},
            {"tables",
             {{"title", from.tables_title}, {"name", from.tables_name}, {"digest", from.tables_digest}}},
            {"priors",
             {{"title", from.priors_title}, {"name", from.priors_name}, {"digest", from.priors_digest}}}};
}

Json against_json(const Audit& audit, const AuditWords& words) {
    const engine::PairedComparison& pair = audit.against->difference;
    const auto optional = [](const std::optional<double>& value) {
        return value ? number(*value) : Json(nullptr);
    };
    const auto difference = [&](const engine::PairedDifference& of) {
        Json json = {{"first", number(of.first)}, {"second", number(of.second)}};
        json["difference"] = resampled(of.difference, of.interval);
        json["standard_error"] = optional(of.standard_error);
        json["p"] = optional(of.p_two_sided);
        return json;
    };
    Json json = {{"second", source_json(audit.against->other)}, {"words", words.comparison}};
    json["second"].erase("version");
    json["log_score"] = difference(pair.log_score);
    json["brier"] = difference(pair.brier);
    json["top_1"] = difference(pair.top_1);
    json["hand_till"] = nullptr;
    if (pair.hand_till) {
        json["hand_till"] = {{"first", number(pair.hand_till->first)},
                             {"second", number(pair.hand_till->second)},
                             {"difference", resampled(pair.hand_till->difference, pair.hand_till->interval)}};
    }
    json["areas"] = Json::array();
    for (std::size_t k = 0; k < pair.area.size(); ++k) {
        if (const auto& area = pair.area[k]) {
            json["areas"].push_back({{"cause", audit.causes[k].id},
                                     {"first", number(area->first)},
                                     {"second", number(area->second)},
                                     {"difference", resampled(area->difference, area->interval)},
                                     {"standard_error", optional(area->standard_error)},
                                     {"p", optional(area->p_two_sided)}});
        }
    }
    return json;
}

Json groups_json(const Audit& audit) {
    Json groups = Json::array();
    for (const GroupEstimate& group : audit.groups) {
        Json entry = {{"name", group.name},
                      {"findings", group.findings},
                      {"patients", group.patients},
                      {"rho_now", group.rho_now}};
        entry["rho"] = nullptr;
        if (group.fitted) {
            entry["rho"] = {
                {"value", group.fitted->rho}, {"low", group.fitted->low}, {"high", group.fitted->high}};
        }
        groups.push_back(std::move(entry));
    }
    return groups;
}

}  // namespace

nlohmann::ordered_json audit_json(const Audit& audit) {
    const AuditWords words = words_of(audit);
    Json json = {{"format", "steelyard.audit/1"}};
    json["flow"] = flow_json(audit);
    json["causes"] = Json::array();
    for (const AuditedCause& cause : audit.causes) {
        json["causes"].push_back(
            {{"id", cause.id}, {"title", cause.title}, {"prior", cause.prior}, {"patients", cause.patients}});
    }
    json["verdict"] = verdict_json(audit, words);
    json["figures"] = figures_json(audit.figures, audit);
    json["by"] = audit.head.by;
    json["strata"] = Json::array();
    for (const AuditedStratum& stratum : audit.strata) {
        json["strata"].push_back({{"stratum", stratum.stratum},
                                  {"flow", patients_json(stratum.patients)},
                                  {"figures", figures_json(stratum.figures, audit)}});
    }
    json["over_time"] = audit.months ? months_json(*audit.months) : Json(nullptr);
    json["fit"] = fit_json(audit.fit);
    json["against"] = audit.against ? against_json(audit, words) : Json(nullptr);
    json["dependence"] = audit.asked.dependence ? groups_json(audit) : Json(nullptr);
    json["settings"] = {{"level", audit.asked.level},
                        {"replicates", audit.asked.replicates},
                        {"seed", audit.asked.seed},
                        {"bins", audit.asked.bins},
                        {"resampled", audit.figures.has_value() && !audit.too_many_to_resample}};
    json["provenance"] = source_json(audit.provenance);
    json["provenance"]["tally"] = {
        {"versions", audit.head.versions},
        {"tables", {{"title", audit.head.tables_title}, {"digest", audit.head.tables_digest}}},
        {"reading", audit.head.reading_digest}};
    json["caution"] = audit.tables_caution.empty() ? std::string(caution_text)
                                                   : std::string(caution_text) + " " + audit.tables_caution;
    return json;
}

}  // namespace steelyard::cli
