// SPDX-License-Identifier: Apache-2.0
// Every figure of an audit against other libraries and against published values. The tables of
// tests/reference name the origin of each line; every line is used.
#include <gtest/gtest.h>

#include <cmath>
#include <map>
#include <string>

#include "audit_samples.hpp"
#include "near.hpp"
#include "reference_table.hpp"
#include "steelyard/engine/audit.hpp"
#include "steelyard/engine/paired_comparison.hpp"

namespace steelyard::test {
namespace {

using engine::AuditSample;
using engine::FitStatus;
using engine::IntervalEstimate;

std::string of(const std::string& quantity, Eigen::Index k) {
    return quantity + "[" + std::to_string(k) + "]";
}

/// A proportion with its Wilson limits.
void expect_share(const ReferenceTable& table, const std::string& set, const std::string& quantity,
                  const std::string& index, const IntervalEstimate& got) {
    EXPECT_TRUE(table.matches(set, quantity + index, got.value));
    EXPECT_TRUE(table.matches(set, quantity + "_wilson_lower" + index, got.low));
    EXPECT_TRUE(table.matches(set, quantity + "_wilson_upper" + index, got.high));
}

/// A value beside a reference that was simulated. @param share  of the reference's own error that ours is
void expect_simulated(const ReferenceTable& table, const std::string& set, const std::string& quantity,
                      double got, double share) {
    table.rows().at({set, quantity}).used = true;
    table.rows().at({set, quantity + "_mcse"}).used = true;
    const double error = table.value(set, quantity + "_mcse");
    EXPECT_NEAR(got, table.value(set, quantity), 5.0 * error * std::hypot(1.0, share))
        << set << " " << quantity;
}

struct ForecastSet {
    std::string id, file;
    Eigen::Index top;
    Eigen::ArrayXd prior, other_prior;
    std::vector<std::string> thresholds;
};

std::vector<ForecastSet> forecast_sets() {
    Eigen::ArrayXd prior_4(4), prior_3(3), other_3(3);
    prior_4 << 45, 30, 15, 10;
    prior_3 << 50, 30, 20;
    other_3 << 60, 25, 15;
    return {{"AUD4",
             "audit_four.csv",
             3,
             prior_4,
             Eigen::ArrayXd::Constant(4, 25.0),
             {"0.05", "0.1", "0.2", "0.35", "0.5"}},
            {"AUD3", "audit_three.csv", 2, prior_3, other_3, {"0.1", "0.25", "0.5"}}};
}

/// The same patients under the other priors: p' proportional to p prior' / prior.
engine::PairedSample paired(const AuditSample& sample, const ForecastSet& set) {
    Eigen::ArrayXXd other = sample.log_forecast;
    other.rowwise() += (set.other_prior / set.prior).log().transpose();
    return {sample.log_forecast, normalised(other), sample.count};
}

class AuditReference : public ::testing::Test {
  protected:
    ReferenceTable table{"audit.csv"};
    ReferenceTable table_r{"audit_r.csv"};

    void scores(const std::string& id, const AuditSample& sample) {
        const engine::ProperScores got = engine::proper_scores(sample);
        EXPECT_TRUE(table.matches(id, "log_score_nats", got.log_score));
        EXPECT_TRUE(table.matches(id, "brier_sum_over_classes", got.brier));
        EXPECT_TRUE(table.matches(id, "brier_of_base_rates", got.brier_of_base_rates));
        EXPECT_TRUE(table.matches(id, "brier_skill_vs_base_rates", got.brier_skill));
        EXPECT_TRUE(table.matches(id, "log_score_of_base_rates", got.log_score_of_base_rates));
        EXPECT_TRUE(near_rel(1.0 - got.log_score / got.log_score_of_base_rates, got.log_skill, 1e-15));
    }

    void calls(const std::string& id, const AuditSample& sample, Eigen::Index top) {
        const engine::TopCall got = engine::top_call(sample);
        for (Eigen::Index t = 1; t <= top; ++t) {
            const IntervalEstimate& share = got.top[static_cast<std::size_t>(t - 1)];
            const std::string name = "top" + std::to_string(t);
            EXPECT_TRUE(table.matches(id, name + "_count", std::round(share.value * sample.patients())));
            EXPECT_TRUE(table.matches(id, name + "_accuracy", share.value));
            EXPECT_TRUE(table.matches(id, name + "_wilson_lower", share.low));
            EXPECT_TRUE(table.matches(id, name + "_wilson_upper", share.high));
        }
        for (Eigen::Index i = 0; i < sample.causes(); ++i) {
            for (Eigen::Index j = 0; j < sample.causes(); ++j) {
                EXPECT_TRUE(table.matches(
                    id, "confusion[truth=" + std::to_string(i) + " called=" + std::to_string(j) + "]",
                    got.confusion(i, j)));
            }
            const engine::CallAccuracy& cause = got.cause[static_cast<std::size_t>(i)];
            expect_share(table, id, "sensitivity", of("", i), cause.sensitivity.value());
            expect_share(table, id, "specificity", of("", i), cause.specificity.value());
            expect_share(table, id, "ppv", of("", i), cause.positive_predictive_value.value());
            expect_share(table, id, "npv", of("", i), cause.negative_predictive_value.value());
        }
    }

    void discrimination(const std::string& id, const AuditSample& sample) {
        const engine::PairwiseAreas pairs = engine::pairwise_areas(sample);
        const Eigen::ArrayXd cases = sample.cause_counts();
        double macro = 0.0;
        double weighted = 0.0;
        for (Eigen::Index i = 0; i < sample.causes(); ++i) {
            for (Eigen::Index j = 0; j < sample.causes(); ++j) {
                if (i != j) {
                    EXPECT_TRUE(table.matches(id, "A(" + std::to_string(i) + "|" + std::to_string(j) + ")",
                                              pairs.area(i, j)));
                }
            }
            const engine::AreaUnderCurve area = engine::area_under_curve(sample, i).value();
            EXPECT_TRUE(table_r.matches(id, of("auc_ovr", i), area.value));
            EXPECT_TRUE(table_r.matches(id, of("valprob_CROC", i), area.value));
            EXPECT_TRUE(table_r.matches(id, of("valprob_Dxy", i), 2.0 * area.value - 1.0));
            EXPECT_TRUE(table_r.matches(id, of("auc_delong_var", i), area.variance.value()));
            EXPECT_TRUE(table_r.matches(id, of("auc_delong_lower", i), area.interval.value().low));
            EXPECT_TRUE(table_r.matches(id, of("auc_delong_upper", i), area.interval.value().high));
            macro += area.value / static_cast<double>(sample.causes());
            weighted += area.value * cases(i) / sample.patients();
        }
        EXPECT_TRUE(table.matches(id, "auc_ovr_macro", macro));
        EXPECT_TRUE(table.matches(id, "auc_ovr_weighted", weighted));
        EXPECT_TRUE(table.matches(id, "hand_till_M", pairs.hand_till.value()));
        EXPECT_TRUE(table_r.matches(id, "hand_till_M", pairs.hand_till.value()));
        EXPECT_EQ(pairs.pairs, sample.causes() * (sample.causes() - 1) / 2);
    }

    void decomposition(const std::string& id, const AuditSample& sample, Eigen::Index k) {
        const engine::BrierDecomposition exact = engine::brier_by_forecast(sample, k);
        const engine::BrierDecomposition binned = engine::brier_by_bin(sample, k);
        EXPECT_TRUE(table.matches(id, of("brier_class", k), exact.brier));
        EXPECT_TRUE(table_r.matches(id, of("valprob_Brier", k), binned.brier));
        EXPECT_TRUE(table.matches(id, of("murphy_distinct_reliability", k), exact.reliability));
        EXPECT_TRUE(table.matches(id, of("murphy_distinct_resolution", k), exact.resolution));
        EXPECT_TRUE(table.matches(id, of("murphy_uncertainty", k), exact.uncertainty));
        EXPECT_EQ(binned.uncertainty, exact.uncertainty);
        EXPECT_TRUE(table.matches(id, of("murphy_binned_reliability", k), binned.reliability));
        EXPECT_TRUE(table.matches(id, of("murphy_binned_resolution", k), binned.resolution));
        EXPECT_TRUE(
            table.matches(id, of("murphy_binned_within_bin_variance", k), binned.within_bin_variance));
        EXPECT_TRUE(
            table.matches(id, of("murphy_binned_within_bin_covariance", k), binned.within_bin_covariance));
    }

    void curve(const std::string& id, const AuditSample& sample, Eigen::Index k) {
        const engine::Reliability got = engine::reliability(sample, k);
        for (const engine::ReliabilityBin& bin : got.bins) {
            const std::string index = "[" + std::to_string(k) + ";" + std::to_string(bin.index) + "]";
            EXPECT_TRUE(table.matches(id, "bin_count" + index, bin.count));
            EXPECT_TRUE(table.matches(id, "bin_mean_forecast" + index, bin.mean_forecast));
            expect_share(table, id, "bin_observed", index, bin.observed);
        }
        EXPECT_TRUE(table.matches(id, of("ece_class", k), got.error.value));
    }

    void calibration(const std::string& id, const AuditSample& sample, Eigen::Index k) {
        const engine::CauseCalibration got = engine::cause_calibration(sample, k);
        EXPECT_EQ(got.status, FitStatus::found);
        EXPECT_TRUE(table.matches(id, of("cox_intercept", k), got.cox->intercept));
        EXPECT_TRUE(table.matches(id, of("cox_slope", k), got.cox->slope));
        EXPECT_TRUE(table.matches(id, of("cox_intercept_se", k), got.cox->intercept_error));
        EXPECT_TRUE(table.matches(id, of("cox_slope_se", k), got.cox->slope_error));
        EXPECT_TRUE(table.matches(id, of("calibration_in_the_large", k), got.in_the_large->value));
        EXPECT_TRUE(table.matches(id, of("mean_forecast_minus_base_rate", k),
                                  got.mean_forecast - got.observed_share));
        EXPECT_TRUE(table_r.matches(id, of("cox_intercept", k), got.intercept->value));
        EXPECT_TRUE(table_r.matches(id, of("cox_slope", k), got.slope->value));
        EXPECT_TRUE(table_r.matches(id, of("calibration_in_the_large", k), got.in_the_large->value));
        EXPECT_TRUE(table_r.matches(id, of("calibration_in_the_large_se", k), *got.in_the_large_error));
        EXPECT_TRUE(
            near_rel(got.slope->value + 1.959963984540054 * got.cox->slope_error, got.slope->high, 1e-14));
        const engine::CalibrationTest z = engine::spiegelhalter_test(sample, k).value();
        EXPECT_TRUE(table.matches(id, of("spiegelhalter_z", k), z.z));
        EXPECT_TRUE(table.matches(id, of("spiegelhalter_p_two_sided", k), z.p_two_sided));
        EXPECT_TRUE(table_r.matches(id, of("valprob_S:z", k), z.z));
        EXPECT_TRUE(table_r.matches(id, of("valprob_S:p", k), z.p_two_sided));
    }

    void leader(const std::string& id, const AuditSample& sample) {
        double mean = 0.0;
        for (Eigen::Index k = 0; k < sample.causes(); ++k) {
            mean += engine::reliability(sample, k).error.value / static_cast<double>(sample.causes());
        }
        EXPECT_TRUE(table.matches(id, "ece_classwise_mean", mean));
        const engine::Reliability got = engine::leader_reliability(sample);
        EXPECT_TRUE(table.matches(id, "ece_top_label_equal_width", got.error.value));
        EXPECT_TRUE(table.matches(id, "mce_top_label_equal_width", got.largest_gap));
        expect_simulated(table, id, "ece_expected_if_perfectly_calibrated", got.error.expected_if_calibrated,
                         0.0);
        expect_simulated(table, id, "ece_95th_percentile_if_perfectly_calibrated",
                         got.error.percentile_95_if_calibrated, 0.5);
        EXPECT_TRUE(
            table.matches(id, "spiegelhalter_z_multiclass", engine::spiegelhalter_test_all(sample)->z));
    }

    void recalibration(const std::string& id, const AuditSample& sample) {
        const engine::Recalibration got = engine::recalibrate(sample);
        ASSERT_EQ(got.status, FitStatus::found);
        ASSERT_EQ(got.intercepts_status, FitStatus::found);
        for (Eigen::Index k = 0; k < sample.causes() - 1; ++k) {
            const std::string equation = "eq " + std::to_string(k + 1) + " vs 0";
            EXPECT_TRUE(table.matches(id, "multinomial_intercept_only[" + equation + "]", got.intercept(k)));
            for (Eigen::Index term = 0; term < sample.causes(); ++term) {
                const std::string name = "multinomial_full[" + equation + "; " +
                                         (term == 0 ? "intercept" : "lp" + std::to_string(term)) + "]";
                EXPECT_TRUE(table.matches(id, name, got.coefficient(k, term)));
                // The other library stops early: its smallest coefficients have fewer digits.
                table_r.rows().at({id, name}).used = true;
                EXPECT_NEAR(table_r.value(id, name), got.coefficient(k, term), 1e-6);
            }
        }
        EXPECT_TRUE(table.matches(id, "multinomial_full_loglik", got.loglik));
        EXPECT_TRUE(table_r.matches(id, "multinomial_full_loglik", got.loglik));
        EXPECT_TRUE(table.matches(id, "multinomial_loglik[none]", got.forecast_loglik));
        EXPECT_TRUE(table.matches(id, "multinomial_loglik[intercepts]", got.intercepts_loglik));
        const std::map<std::string, engine::LikelihoodRatioTest> tests = {
            {"[intercepts_vs_none]", got.intercepts_against_none.value()},
            {"[full_vs_none]", got.full_against_none.value()},
            {"[full_vs_intercepts]", got.full_against_intercepts.value()}};
        for (const auto& [name, test] : tests) {
            EXPECT_TRUE(table.matches(id, "lr_test_chi2" + name, test.chi2));
            EXPECT_TRUE(table.matches(id, "lr_test_p" + name, test.p));
        }
        EXPECT_TRUE(
            table.matches(id, "temperature_exponent_ml", engine::temperature(sample).exponent->value));
    }

    void difference(const std::string& id, const std::string& score, const engine::PairedDifference& got,
                    double replicates) {
        EXPECT_TRUE(table.matches(id, "alt_prior_" + score, got.second));
        EXPECT_TRUE(table.matches(id, "diff_used_minus_alt_" + score, got.difference));
        EXPECT_TRUE(table.matches(id, "diff_" + score + "_se_sample", got.standard_error.value()));
        EXPECT_TRUE(table.matches(id, "diff_" + score + "_paired_t", got.t.value()));
        EXPECT_TRUE(table.matches(id, "diff_" + score + "_paired_p", got.p_two_sided.value()));
        const double share = std::sqrt(200000.0 / replicates);  // the reference drew 200,000
        expect_simulated(table, id, "diff_" + score + "_bootstrap_q0.025", got.interval->low, share);
        expect_simulated(table, id, "diff_" + score + "_bootstrap_q0.975", got.interval->high, share);
        // The standard deviation of a bootstrapped mean is known; that of R draws varies by 1 / sqrt(2 R).
        const std::string exact = "diff_" + score + "_bootstrap_se_exact";
        table.rows().at({id, exact}).used = true;
        EXPECT_TRUE(near_rel(table.value(id, exact), got.interval->standard_error,
                             5.0 / std::sqrt(2.0 * replicates)));
    }

    void comparison(const ForecastSet& set, const AuditSample& sample) {
        engine::ResamplingOptions options;
        options.replicates = 20000;
        options.threads = 2;
        const engine::PairedComparison got = engine::compare_paired(paired(sample, set), options);
        difference(set.id, "log_score", got.log_score, 20000);
        difference(set.id, "brier", got.brier, 20000);
        const std::string which = "[class 0; used vs alternative priors]";
        EXPECT_TRUE(table_r.matches(set.id, "delong_test_z" + which, got.area[0]->z.value()));
        EXPECT_TRUE(table_r.matches(set.id, "delong_test_p" + which, got.area[0]->p_two_sided.value()));
    }
};

/// Both markers of aSAH, as forecasts in their order: the area asks for nothing else.
engine::PairedSample asah() {
    const WordTable words("audit_asah.csv");
    const auto patients = static_cast<Eigen::Index>(words.rows.size());
    engine::PairedSample sample{Eigen::ArrayXXd(patients, 2), Eigen::ArrayXXd(patients, 2),
                                Eigen::ArrayXXd::Zero(patients, 2)};
    for (Eigen::Index i = 0; i < patients; ++i) {
        const std::vector<std::string>& row = words.rows[static_cast<std::size_t>(i)];
        sample.count(i, row[0] == "Poor" ? 1 : 0) = 1.0;
        sample.log_forecast.row(i) << 0.0, std::stod(row[1]);
        sample.other_log_forecast.row(i) << 0.0, std::stod(row[2]);
    }
    sample.log_forecast = normalised(sample.log_forecast);
    sample.other_log_forecast = normalised(sample.other_log_forecast);
    return sample;
}

TEST_F(AuditReference, AgreesOnTwoSetsOfForecasts) {
    for (const ForecastSet& set : forecast_sets()) {
        const AuditSample sample = read_forecasts(set.file);
        scores(set.id, sample);
        calls(set.id, sample, set.top);
        discrimination(set.id, sample);
        for (Eigen::Index k = 0; k < sample.causes(); ++k) {
            decomposition(set.id, sample, k);
            curve(set.id, sample, k);
            calibration(set.id, sample, k);
            for (const std::string& threshold : set.thresholds) {
                const engine::NetBenefit got = engine::net_benefit(sample, k, std::stod(threshold));
                const std::string index = "[" + std::to_string(k) + "; pt=" + threshold + "]";
                EXPECT_TRUE(table.matches(set.id, "net_benefit" + index, got.value));
                EXPECT_TRUE(table.matches(set.id, "net_benefit_treat_all" + index, got.treat_all));
            }
        }
        leader(set.id, sample);
        recalibration(set.id, sample);
        comparison(set, sample);
    }

    const engine::PairedSample markers = asah();
    const engine::AreaUnderCurve s100b =
        engine::area_under_curve({markers.log_forecast, markers.count}, 1).value();
    EXPECT_TRUE(table_r.matches("aSAH", "auc_s100b", s100b.value));
    EXPECT_TRUE(table_r.matches("aSAH", "auc_s100b_delong_lower", s100b.interval->low));
    EXPECT_TRUE(table_r.matches("aSAH", "auc_s100b_delong_upper", s100b.interval->high));
    EXPECT_NEAR(s100b.value, 0.7314, 5e-5);  // as printed in the documentation of pROC
    EXPECT_NEAR(s100b.interval->low, 0.6301, 5e-5);
    EXPECT_NEAR(s100b.interval->high, 0.8326, 5e-5);
    engine::ResamplingOptions few;
    few.replicates = 20;
    const engine::AreaDifference test = engine::compare_paired(markers, few).area[1].value();
    EXPECT_TRUE(table_r.matches("aSAH", "auc_wfns", test.second));
    EXPECT_TRUE(table_r.matches("aSAH", "delong_test_s100b_vs_wfns_z", test.z.value()));
    EXPECT_TRUE(table_r.matches("aSAH", "delong_test_s100b_vs_wfns_p", test.p_two_sided.value()));

    EXPECT_EQ(table.unused(), std::vector<std::string>());
    EXPECT_EQ(table_r.unused(), std::vector<std::string>());
}

TEST(AuditPublished, GivesTheAreasOfGlassAndBirthWeight) {
    const ReferenceTable table("audit_published.csv");
    std::vector<std::string> names;
    const engine::PairwiseAreas glass = engine::pairwise_areas(read_forecasts("audit_glass.csv", &names));
    EXPECT_TRUE(table.matches("fgl", "hand_till_M", glass.hand_till.value()));
    for (std::size_t i = 0; i < names.size(); ++i) {
        for (std::size_t j = i + 1; j < names.size(); ++j) {
            const auto row = static_cast<Eigen::Index>(i);
            const auto column = static_cast<Eigen::Index>(j);
            EXPECT_TRUE(table.matches("fgl", "A(" + names[i] + ";" + names[j] + ")",
                                      0.5 * (glass.area(row, column) + glass.area(column, row))));
        }
    }

    const WordTable words("audit_birth_weight.csv");
    const auto patients = static_cast<Eigen::Index>(words.rows.size());
    AuditSample sample{Eigen::ArrayXXd(patients, 2), Eigen::ArrayXXd::Zero(patients, 2)};
    for (Eigen::Index i = 0; i < patients; ++i) {
        const std::vector<std::string>& row = words.rows[static_cast<std::size_t>(i)];
        const double p = std::stod(row[1]);
        sample.log_forecast.row(i) << std::log1p(-p), std::log(p);
        sample.count(i, std::stoi(row[0])) = 1.0;
    }
    const engine::AreaUnderCurve area = engine::area_under_curve(sample, 1).value();
    EXPECT_TRUE(table.matches("birthwt", "auc", area.value));
    EXPECT_TRUE(table.matches("birthwt", "auc_delong_lower", area.interval->low));
    EXPECT_TRUE(table.matches("birthwt", "auc_delong_upper", area.interval->high));
    EXPECT_TRUE(table.matches("birthwt", "brier", 0.5 * engine::proper_scores(sample).brier));
    EXPECT_TRUE(table.matches("birthwt", "log_score_nats", engine::proper_scores(sample).log_score));
    EXPECT_EQ(table.unused(), std::vector<std::string>());
}

TEST(AuditEndToEnd, AgreesOnForecastsOfPublicDataSets) {
    const ReferenceTable table("audit_end_to_end.csv");
    const std::map<std::string, std::string> files = {{"URINE_LOO", "audit_urine_loo.csv"},
                                                      {"PIMA_EXTERNAL", "audit_pima_external.csv"},
                                                      {"WINE_SPLIT", "audit_wine_split.csv"},
                                                      {"CUSHINGS_LOO", "audit_cushings_loo.csv"},
                                                      {"SOYBEAN_STRESS", "audit_soybean_stress.csv"}};
    for (const auto& [id, file] : files) {
        std::vector<std::string> names;
        AuditSample sample = read_forecasts(file, &names);
        // Cushings has six patients whose final cause is not known: they are no part of an audit.
        const engine::AuditFigures got = engine::audit(sample, {.replicates = 0});
        EXPECT_TRUE(table.matches(id, "audit_n", got.patients));
        EXPECT_TRUE(table.matches(id, "log_score_nats", got.scores.log_score));
        EXPECT_TRUE(table.matches(id, "brier_sum_over_classes", got.scores.brier));
        EXPECT_TRUE(table.matches(id, "top1_count", std::round(got.calls.top[0].value * got.patients)));
        EXPECT_TRUE(table.matches(id, "top1_wilson_lower", got.calls.top[0].low));
        EXPECT_TRUE(table.matches(id, "top1_wilson_upper", got.calls.top[0].high));
        EXPECT_TRUE(table.matches(id, "ece_top_label_10_bins", got.leader.error.value));
        for (std::size_t i = 0; i < names.size(); ++i) {
            for (std::size_t j = 0; j < names.size(); ++j) {
                const std::string cell = "confusion[truth=" + names[i] + " called=" + names[j] + "]";
                const double count =
                    got.calls.confusion(static_cast<Eigen::Index>(i), static_cast<Eigen::Index>(j));
                if (table.has(id, cell)) {
                    EXPECT_TRUE(table.matches(id, cell, count));
                } else {
                    EXPECT_EQ(count, 0.0) << id << " " << cell;
                }
            }
        }
        if (names.size() == 2) {
            const engine::CauseFigures& cause = got.cause[1];
            EXPECT_TRUE(table.matches(id, "auc", cause.area->value));
            EXPECT_TRUE(table.matches(id, "cox_intercept", cause.calibration.cox->intercept));
            EXPECT_TRUE(table.matches(id, "cox_slope", cause.calibration.cox->slope));
            EXPECT_TRUE(table.matches(id, "spiegelhalter_z", cause.spiegelhalter->z));
        } else {
            EXPECT_TRUE(table.matches(id, "hand_till_M", got.pairs.hand_till.value()));
            EXPECT_TRUE(table.matches(id, "spiegelhalter_z_multiclass", got.spiegelhalter->z));
        }
    }
    EXPECT_EQ(table.unused(), std::vector<std::string>());
}

}  // namespace
}  // namespace steelyard::test
