// SPDX-License-Identifier: Apache-2.0
// Every table of an audit as one long CSV table, a figure a row: docs/formats.md, "Audits".
#include <fmt/format.h>

#include <cmath>

#include "audit_page.hpp"
#include "steelyard/cli/csv_text.hpp"

namespace steelyard::cli {
namespace {

using Boot = std::optional<engine::BootstrapInterval>;
using Estimate = std::optional<engine::IntervalEstimate>;

/// Where a figure stands: its table, and what it is of.
struct Place {
    std::string table, stratum, cause, item;
};

class Rows {
  public:
    Rows() : text_("table,stratum,cause,item,quantity,value,low,high,patients\n") {}

    void add(const Place& at, std::string_view quantity, double value, double low = NAN, double high = NAN,
             double patients = NAN) {
        text_ += fmt::format("{},{},{},{},{},{},{},{},{}\n", csv_field(at.table), csv_field(at.stratum),
                             csv_field(at.cause), csv_field(at.item), quantity, shown(value), shown(low),
                             shown(high), shown(patients));
    }
    void add(const Place& at, std::string_view quantity, const Estimate& estimate, double patients = NAN) {
        if (estimate) {
            add(at, quantity, estimate->value, estimate->low, estimate->high, patients);
        }
    }
    void add(const Place& at, std::string_view quantity, double value, const Boot& interval,
             double patients = NAN) {
        add(at, quantity, value, interval ? interval->low : NAN, interval ? interval->high : NAN, patients);
    }
    void count(const Place& at, std::string_view quantity, std::uint64_t patients) {
        text_ += fmt::format("{},{},{},{},{},{},,,\n", csv_field(at.table), csv_field(at.stratum),
                             csv_field(at.cause), csv_field(at.item), quantity, patients);
    }
    std::string take() { return std::move(text_); }

  private:
    /// The shortest decimal that reads back; empty where there is none.
    static std::string shown(double value) {
        return std::isfinite(value) ? fmt::format("{}", value) : std::string();
    }
    std::string text_;
};

void add_reliability(Rows& rows, const Place& at, const engine::Reliability& reliability, const Boot& error) {
    for (const engine::ReliabilityBin& bin : reliability.bins) {
        Place of_bin = at;
        of_bin.item = fmt::format("{} to {}", bin.low, bin.high);
        rows.add(of_bin, "mean_given", bin.mean_forecast, NAN, NAN, bin.count);
        rows.add(of_bin, "came_true", Estimate(bin.observed), bin.count);
    }
    rows.add(at, "calibration_error", reliability.error.value, error);
    rows.add(at, "expected_if_calibrated", reliability.error.expected_if_calibrated);
    rows.add(at, "percentile_95_if_calibrated", reliability.error.percentile_95_if_calibrated);
}

void add_brier(Rows& rows, Place at, const std::string& grouping, const engine::BrierDecomposition& parts) {
    at.item = grouping;
    rows.add(at, "brier", parts.brier);
    rows.add(at, "reliability", parts.reliability);
    rows.add(at, "resolution", parts.resolution);
    rows.add(at, "uncertainty", parts.uncertainty);
    rows.add(at, "within_bin_variance", parts.within_bin_variance);
    rows.add(at, "within_bin_covariance", parts.within_bin_covariance);
}

class FigureRows {
  public:
    FigureRows(Rows& rows, const Audit& audit, const engine::AuditFigures& figures, std::string stratum)
        : rows_(rows), audit_(audit), figures_(figures), stratum_(std::move(stratum)) {}

    void add() {
        scores();
        for (std::size_t k = 0; k < figures_.cause.size(); ++k) {
            cause(k);
        }
        confusion();
        add_reliability(rows_, {"reliability_leader", stratum_, "", ""}, figures_.leader,
                        of(&engine::AuditIntervals::leader_calibration_error));
        recalibration();
        for (std::size_t i = 0; i < figures_.net_benefit.size(); ++i) {
            const engine::NetBenefit& net = figures_.net_benefit[i];
            const Place at{"net_benefit", stratum_, audit_.asked.cause, fmt::format("{}", net.threshold)};
            rows_.add(at, "net_benefit", net.value, of(&engine::AuditIntervals::net_benefit, i));
            rows_.add(at, "treat_all", net.treat_all);
            rows_.add(at, "treated", net.treated);
        }
    }

  private:
    Boot of(const Boot engine::AuditIntervals::*member) const {
        return figures_.intervals ? (*figures_.intervals).*member : Boot();
    }
    Boot of(const std::vector<Boot> engine::AuditIntervals::*member, std::size_t k) const {
        return figures_.intervals ? ((*figures_.intervals).*member)[k] : Boot();
    }

    void scores() {
        const engine::ProperScores& scores = figures_.scores;
        const Place at{"scores", stratum_, "", ""};
        const double n = figures_.patients;
        rows_.add(at, "log_score", scores.log_score, of(&engine::AuditIntervals::log_score), n);
        rows_.add(at, "brier", scores.brier, of(&engine::AuditIntervals::brier), n);
        rows_.add(at, "log_skill", scores.log_skill, of(&engine::AuditIntervals::log_skill), n);
        rows_.add(at, "brier_skill", scores.brier_skill, of(&engine::AuditIntervals::brier_skill), n);
        rows_.add(at, "log_score_of_base_rates", scores.log_score_of_base_rates);
        rows_.add(at, "brier_of_base_rates", scores.brier_of_base_rates);
        rows_.add(at, "expected_log_score", scores.expected_log_score);
        rows_.add(at, "expected_brier", scores.expected_brier);
        for (std::size_t t = 0; t < figures_.calls.top.size(); ++t) {
            rows_.add({"top", stratum_, "", std::to_string(t + 1)}, "share", Estimate(figures_.calls.top[t]),
                      n);
        }
        if (figures_.pairs.hand_till) {
            rows_.add(at, "hand_till", *figures_.pairs.hand_till, of(&engine::AuditIntervals::hand_till), n);
        }
        if (figures_.spiegelhalter) {
            rows_.add(at, "spiegelhalter_z", figures_.spiegelhalter->z);
            rows_.add(at, "spiegelhalter_p", figures_.spiegelhalter->p_two_sided);
        }
        rows_.add(at, "temperature_exponent", figures_.temperature.exponent, n);
    }

    void cause(std::size_t k) {
        const engine::CauseFigures& cause = figures_.cause[k];
        const engine::CallAccuracy& calls = figures_.calls.cause[k];
        const std::string& id = audit_.causes[k].id;
        const double n = cause.cases, others = figures_.patients - cause.cases;
        const double called = figures_.calls.confusion.col(static_cast<Eigen::Index>(k)).sum();
        const Place at{"causes", stratum_, id, ""};
        rows_.add(at, "patients", n);
        rows_.add(at, "mean_given", cause.calibration.mean_forecast);
        rows_.add(at, "observed_share", cause.calibration.observed_share);
        rows_.add(at, "sensitivity", calls.sensitivity, n);
        rows_.add(at, "specificity", calls.specificity, others);
        rows_.add(at, "positive_predictive_value", calls.positive_predictive_value, called);
        rows_.add(at, "negative_predictive_value", calls.negative_predictive_value,
                  figures_.patients - called);
        if (cause.area) {
            rows_.add(at, "area", cause.area->value, cause.area->interval ? cause.area->interval->low : NAN,
                      cause.area->interval ? cause.area->interval->high : NAN, n);
        }
        rows_.add(at, "in_the_large", cause.calibration.in_the_large, n);
        rows_.add(at, "intercept", cause.calibration.intercept, n);
        rows_.add(at, "slope", cause.calibration.slope, n);
        if (cause.spiegelhalter) {
            rows_.add(at, "spiegelhalter_z", cause.spiegelhalter->z);
            rows_.add(at, "spiegelhalter_p", cause.spiegelhalter->p_two_sided);
        }
        add_brier(rows_, {"brier_parts", stratum_, id, ""}, "by_forecast", cause.by_forecast);
        add_brier(rows_, {"brier_parts", stratum_, id, ""}, "by_bin", cause.by_bin);
        add_reliability(rows_, {"reliability", stratum_, id, ""}, cause.reliability,
                        of(&engine::AuditIntervals::calibration_error, k));
    }

    void confusion() {
        for (std::size_t row = 0; row < audit_.causes.size(); ++row) {
            for (std::size_t column = 0; column < audit_.causes.size(); ++column) {
                rows_.add({"confusion", stratum_, audit_.causes[row].id, audit_.causes[column].id},
                          "patients",
                          figures_.calls.confusion(static_cast<Eigen::Index>(row),
                                                   static_cast<Eigen::Index>(column)));
            }
        }
        for (std::size_t row = 0; row < audit_.causes.size(); ++row) {
            for (std::size_t column = 0; column < audit_.causes.size(); ++column) {
                const double area =
                    figures_.pairs.area(static_cast<Eigen::Index>(row), static_cast<Eigen::Index>(column));
                if (!std::isnan(area)) {
                    rows_.add({"pairwise_areas", stratum_, audit_.causes[row].id, audit_.causes[column].id},
                              "area", area);
                }
            }
        }
    }

    /// Coefficients by cause (row) and what they multiply: `intercept`, or ln(p_j / p_reference).
    void recalibration() {
        const engine::Recalibration& fit = figures_.recalibration;
        std::vector<std::string> ids;
        for (std::size_t k = 0; k < audit_.causes.size(); ++k) {
            if (static_cast<Eigen::Index>(k) != fit.reference) {
                ids.push_back(audit_.causes[k].id);
            }
        }
        constexpr double z_95 = 1.959963984540054;
        for (Eigen::Index row = 0; row < fit.coefficient.rows(); ++row) {
            for (Eigen::Index column = 0; column < fit.coefficient.cols(); ++column) {
                const double value = fit.coefficient(row, column);
                const double error = fit.standard_error(row, column);
                rows_.add({"recalibration", stratum_, ids[static_cast<std::size_t>(row)],
                           column == 0 ? "intercept" : ids[static_cast<std::size_t>(column - 1)]},
                          "coefficient_95", value, value - z_95 * error, value + z_95 * error);
            }
        }
    }

    Rows& rows_;
    const Audit& audit_;
    const engine::AuditFigures& figures_;
    std::string stratum_;
};

void add_flow(Rows& rows, const Audit& audit) {
    const Place at{"flow", "", "", ""};
    rows.count(at, "read", audit.flow.read);
    rows.count(at, "set_aside", audit.flow.set_aside);
    rows.count(at, "out_of_scope", audit.flow.out_of_scope);
    rows.count(at, "weighed", audit.flow.weighed);
    rows.count(at, "scored", audit.patients.diagnosed);
    rows.count(at, "outside", audit.patients.outside);
    rows.count(at, "undiagnosed", audit.patients.undiagnosed);
    rows.count(at, "dropped", audit.lost.patients);
    for (const auto& [cause, patients] : audit.out_of_scope) {
        rows.count({"out_of_scope", "", cause, ""}, "patients", patients);
    }
}

void add_fit(Rows& rows, const AuditedFit& fit) {
    const auto add = [&](const std::string& item, const FlaggedPatients& of) {
        const Place at{"fit", "", of.cause, item};
        rows.count(at, "patients", of.patients);
        rows.count(at, "flagged", of.flagged);
        rows.add(at, "flagged_share", of.share, static_cast<double>(of.judged));
    };
    add("inside", fit.inside);
    add("outside", fit.outside);
    for (const FlaggedPatients& cause : fit.causes) {
        add("final_cause", cause);
    }
}

void add_months(Rows& rows, const AuditedMonths& months) {
    for (std::size_t i = 0; i < months.months.size(); ++i) {
        const engine::ScorePeriod& period = months.chart.periods[i];
        const Place at{"over_time", "", "", months.months[i]};
        // Here low and high are the control limits.
        rows.add(at, "log_score", period.log_score.value_or(NAN), period.low.value_or(NAN),
                 period.high.value_or(NAN), period.patients);
        rows.add(at, "expected_log_score", period.expected.value_or(NAN));
    }
}

void add_against(Rows& rows, const Audit& audit) {
    const engine::PairedComparison& pair = audit.against->difference;
    const auto add = [&](std::string_view quantity, const std::string& cause, const auto& of) {
        rows.add({"against", "", cause, "first"}, quantity, of.first);
        rows.add({"against", "", cause, "second"}, quantity, of.second);
        rows.add({"against", "", cause, "difference"}, quantity, of.difference, of.interval);
    };
    add("log_score", "", pair.log_score);
    add("brier", "", pair.brier);
    add("top_1", "", pair.top_1);
    if (pair.hand_till) {
        add("hand_till", "", *pair.hand_till);
    }
    for (std::size_t k = 0; k < pair.area.size(); ++k) {
        if (pair.area[k]) {
            add("area", audit.causes[k].id, *pair.area[k]);
        }
    }
}

}  // namespace

std::string audit_csv(const Audit& audit) {
    Rows rows;
    add_flow(rows, audit);
    if (audit.figures) {
        FigureRows(rows, audit, *audit.figures, "").add();
    }
    for (const AuditedStratum& stratum : audit.strata) {
        const std::string name = stratum.stratum.empty() ? "(not known)" : stratum.stratum;
        rows.count({"strata", name, "", ""}, "scored", stratum.patients.diagnosed);
        rows.count({"strata", name, "", ""}, "outside", stratum.patients.outside);
        rows.count({"strata", name, "", ""}, "undiagnosed", stratum.patients.undiagnosed);
        if (stratum.figures) {
            FigureRows(rows, audit, *stratum.figures, name).add();
        }
    }
    if (audit.months) {
        add_months(rows, *audit.months);
    }
    add_fit(rows, audit.fit);
    if (audit.against) {
        add_against(rows, audit);
    }
    for (const GroupEstimate& group : audit.groups) {
        const Place at{"dependence", "", "", group.name};
        rows.add(at, "rho_now", group.rho_now);
        if (group.fitted) {
            rows.add(at, "rho", group.fitted->rho, group.fitted->low, group.fitted->high,
                     static_cast<double>(group.patients));
        }
    }
    return rows.take();
}

}  // namespace steelyard::cli
