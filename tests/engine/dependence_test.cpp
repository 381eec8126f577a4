// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/dependence.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <cmath>
#include <cstdint>
#include <limits>
#include <optional>
#include <random>
#include <string>
#include <vector>

#include "expect_domain_error.hpp"
#include "near.hpp"
#include "reference_inputs.hpp"
#include "reference_table.hpp"
#include "steelyard/engine/logistic.hpp"
#include "steelyard/engine/posterior.hpp"
#include "steelyard/engine/row_forms.hpp"
#include "steelyard/engine/tempering.hpp"

namespace {

using namespace steelyard::engine;
using steelyard::test::expect_domain_error;
using steelyard::test::near_abs;
using steelyard::test::near_rel;
using steelyard::test::ReferenceTable;

constexpr double infinity = std::numeric_limits<double>::infinity();

/// Patients with their cause in the first column and the bands of their findings after it. The two files are
/// made up: findings of one cause share a hidden severity, so they overlap.
struct DataSet {
    Eigen::ArrayXi cause;                          // shape (N)
    Eigen::ArrayXXi band;                          // shape (N, J)
    std::vector<std::vector<Eigen::ArrayXd>> row;  // [finding][cause]: P(band | cause)
    Eigen::ArrayXd log_prior;                      // shape (K): class frequencies

    DataSet(const std::string& file, int levels, double start) {
        const Eigen::ArrayXXi all = steelyard::test::whole_numbers(file);
        cause = all.col(0);
        band = all.rightCols(all.cols() - 1);
        const Eigen::Index causes = cause.maxCoeff() + 1;
        Eigen::ArrayXd frequency = Eigen::ArrayXd::Zero(causes);
        for (Eigen::Index i = 0; i < cause.size(); ++i) {
            frequency(cause(i)) += 1.0;
        }
        log_prior = (frequency / frequency.sum()).log();
        for (Eigen::Index j = 0; j < band.cols(); ++j) {
            row.emplace_back();
            for (Eigen::Index k = 0; k < causes; ++k) {
                Eigen::ArrayXd counts = Eigen::ArrayXd::Zero(levels);
                for (Eigen::Index i = 0; i < cause.size(); ++i) {
                    counts(band(i, j)) += cause(i) == k ? 1.0 : 0.0;
                }
                row.back().push_back(counts_row(counts, start).probability);
            }
        }
    }

    Eigen::Index patients() const { return cause.size(); }
    Eigen::Index causes() const { return log_prior.size(); }
    const Eigen::ArrayXd& probabilities(Eigen::Index j, Eigen::Index k) const {
        return row.at(static_cast<std::size_t>(j)).at(static_cast<std::size_t>(k));
    }
    Eigen::ArrayXd ones() const { return Eigen::ArrayXd::Ones(patients()); }

    /// One line per finding of one patient, for posterior().
    Eigen::ArrayXXd loglik(Eigen::Index i) const {
        Eigen::ArrayXXd lines(band.cols(), causes());
        for (Eigen::Index j = 0; j < band.cols(); ++j) {
            for (Eigen::Index k = 0; k < causes(); ++k) {
                lines(j, k) = std::log(probabilities(j, k)(band(i, j)));
            }
        }
        return lines;
    }

    LabelledEvidence evidence() const {
        LabelledEvidence labelled{log_prior, Eigen::ArrayXXd(patients(), causes()), cause, ones()};
        for (Eigen::Index i = 0; i < patients(); ++i) {
            labelled.loglik.row(i) = loglik(i).colwise().sum();
        }
        return labelled;
    }

    /// Naive weights of each finding, second cause against first.
    Eigen::ArrayXXd weights() const {
        Eigen::ArrayXXd weight(patients(), band.cols());
        for (Eigen::Index i = 0; i < patients(); ++i) {
            const Eigen::ArrayXXd lines = loglik(i);
            weight.row(i) = (lines.col(1) - lines.col(0)).transpose();
        }
        return weight;
    }

    Eigen::ArrayXd naive_log_odds() const {
        return weights().rowwise().sum() + (log_prior(1) - log_prior(0));
    }
};

std::string numbered(const std::string& name, Eigen::Index i) {
    return name + std::to_string(i);
}

void expect_tempering(const ReferenceTable& table, const std::string& name, const DataSet& data,
                      const std::vector<Eigen::Index>& rows) {
    const LabelledEvidence evidence = data.evidence();
    const TemperingFit fit = fit_tempering(evidence);
    EXPECT_TRUE(table.matches(name, "naive_loglik_nats", fit.loglik_naive));
    EXPECT_TRUE(table.matches(name, "tau_ml_fixed_priors", fit.tau));
    EXPECT_TRUE(table.matches(name, "tempered_loglik_nats", fit.loglik));
    EXPECT_TRUE(table.matches(name, "tau_se", fit.standard_error));
    for (const Eigen::Index i : rows) {
        const Eigen::ArrayXXd lines = data.loglik(i);
        const Eigen::ArrayXd full = Eigen::ArrayXd::Ones(lines.rows());
        const Eigen::ArrayXd naive = posterior(data.log_prior, lines, full);
        const Eigen::ArrayXd tempered = posterior(data.log_prior, lines, full * fit.tau);
        for (Eigen::Index k = 0; k < data.causes(); ++k) {
            const std::string tag = "[row " + std::to_string(i) + "; " + std::to_string(k) + "]";
            EXPECT_TRUE(table.matches(name, "naive_posterior" + tag, naive(k)));
            EXPECT_TRUE(table.matches(name, "tempered_posterior" + tag, tempered(k)));
        }
    }
}

void expect_reweighting(const ReferenceTable& table, const std::string& name, const DataSet& data) {
    const ReweightedFindings found = reweight_findings(data.weights(), data.cause, data.ones());
    EXPECT_TRUE(table.matches(name, "shrink_intercept", found.fit.coefficient(0)));
    EXPECT_TRUE(table.matches(name, "shrink_intercept_se", found.fit.standard_error(0)));
    for (Eigen::Index j = 1; j < found.fit.coefficient.size(); ++j) {
        EXPECT_TRUE(table.matches(name, numbered("shrink_b", j), found.fit.coefficient(j)));
        EXPECT_TRUE(table.matches(name, numbered("shrink_b", j) + "_se", found.fit.standard_error(j)));
    }
    EXPECT_TRUE(table.matches(name, "shrink_loglik_nats", found.fit.loglik));
    const CoxCalibration cox = cox_calibration(data.naive_log_odds(), data.cause, data.ones());
    EXPECT_TRUE(table.matches(name, "cox_intercept_naive", cox.intercept));
    EXPECT_TRUE(table.matches(name, "cox_slope_naive", cox.slope));
}

TEST(Dependence, AgreesWithTheReferenceTable) {
    const ReferenceTable table("dependence.csv");
    const auto inputs = steelyard::test::reference_json("dependence_inputs.json");
    for (const auto& one : inputs.at("duplicates")) {
        const double prior = steelyard::test::number(one.at("prior"));
        const double ratio = steelyard::test::number(one.at("lr"));
        const Eigen::ArrayXd log_prior =
            (Eigen::ArrayXd(2) << std::log(prior), std::log1p(-prior)).finished();
        for (const auto& copies : one.at("copies")) {
            const Eigen::Index n = copies.get<Eigen::Index>();
            // One finding with this ratio, entered n times.
            Eigen::ArrayXXd lines(n, 2);
            lines.col(0) = std::min(0.0, std::log(ratio));
            lines.col(1) = std::min(0.0, -std::log(ratio));
            const double got = posterior(log_prior, lines, Eigen::ArrayXd::Ones(n))(0);
            EXPECT_TRUE(
                table.matches(one.at("id"), "posterior_if_counted_" + std::to_string(n) + "_times", got));
            if (copies == one.at("copies").back()) {
                const double tempered =
                    posterior(log_prior, lines, Eigen::ArrayXd::Constant(n, 1.0 / static_cast<double>(n)))(0);
                EXPECT_TRUE(table.matches(one.at("id"), "posterior_power_1_over_n", tempered));
            }
        }
    }
    for (const auto& one : inputs.at("joint_tables")) {
        const std::string name = one.at("id");
        const double start = steelyard::test::number(one.at("alpha"));
        const Eigen::ArrayXd log_prior = steelyard::test::numbers(one.at("prior_odds")).log();
        std::vector<Eigen::ArrayXXd> joints;
        std::vector<Eigen::ArrayXd> first,
            second;  // single tables of the same patients, each with its own start
        for (const auto& counts : one.at("counts")) {
            const Eigen::ArrayXXd cells = steelyard::test::matrix(counts);
            joints.push_back(joint_probability(cells, start));
            first.push_back(counts_row(cells.rowwise().sum(), start).probability);
            second.push_back(counts_row(cells.colwise().sum().transpose(), start).probability);
        }
        const Eigen::Index causes = log_prior.size();
        for (Eigen::Index i = 0; i < joints[0].rows(); ++i) {
            for (Eigen::Index j = 0; j < joints[0].cols(); ++j) {
                Eigen::ArrayXXd apart(2, causes);
                for (Eigen::Index k = 0; k < causes; ++k) {
                    apart(0, k) = std::log(first[static_cast<std::size_t>(k)](i));
                    apart(1, k) = std::log(second[static_cast<std::size_t>(k)](j));
                }
                const Eigen::ArrayXXd together = joint_loglik(joints, i, j).transpose();
                const Eigen::ArrayXd joint = posterior(log_prior, together, Eigen::ArrayXd::Ones(1));
                const Eigen::ArrayXd naive = posterior(log_prior, apart, Eigen::ArrayXd::Ones(2));
                for (Eigen::Index k = 0; k < causes; ++k) {
                    const std::string tag = "[f=" + std::to_string(i) + " g=" + std::to_string(j) + "; " +
                                            std::to_string(k) + "]";
                    EXPECT_TRUE(table.matches(name, "joint_posterior" + tag, joint(k)));
                    EXPECT_TRUE(table.matches(name, "naive_posterior" + tag, naive(k)));
                }
            }
        }
        for (std::size_t k = 0; k < joints.size(); ++k) {
            EXPECT_TRUE(table.matches(name, "conditional_mutual_information_nats[" + std::to_string(k) + "]",
                                      mutual_information(joints[k])));
        }
    }
    for (const auto& one : inputs.at("datasets")) {
        const std::string name = one.at("id");
        const DataSet data(one.at("file"), one.at("levels"), steelyard::test::number(one.at("alpha")));
        for (Eigen::Index j = 0; j < data.band.cols(); ++j) {
            for (Eigen::Index k = 0; k < data.causes(); ++k) {
                for (Eigen::Index v = 0; v < data.probabilities(j, k).size(); ++v) {
                    const std::string quantity = "P(f" + std::to_string(j + 1) + "=" + std::to_string(v) +
                                                 "|" + std::to_string(k) + ")";
                    EXPECT_TRUE(table.matches(name, quantity, data.probabilities(j, k)(v)));
                }
            }
        }
        const std::vector<Eigen::Index> rows = one.at("rows").get<std::vector<Eigen::Index>>();
        expect_tempering(table, name, data, rows);
        if (data.causes() == 2) {
            expect_reweighting(table, name, data);
            const Eigen::ArrayXXd weight = data.weights();
            const LogisticFit fit = fit_logistic(weight, data.cause, data.ones());
            for (const Eigen::Index i : rows) {
                const double score = fit.coefficient(0) +
                                     (weight.row(i).transpose() * fit.coefficient.tail(weight.cols())).sum();
                EXPECT_TRUE(table.matches(name, "shrunk_posterior[row " + std::to_string(i) + "]",
                                          1.0 / (1.0 + std::exp(-score))));
            }
        }
    }
    EXPECT_EQ(table.unused(), std::vector<std::string>{});
}

TEST(Dependence, AgreesWithGeneralizedLinearModelsInR) {
    const ReferenceTable table("dependence_glm.csv");
    const DataSet data("dependent_binary.csv", 3, 1.0);
    expect_reweighting(table, "DS1_binary", data);
    EXPECT_TRUE(table.matches("DS1_binary", "tau_ml_fixed_priors", fit_tempering(data.evidence()).tau));
    EXPECT_EQ(table.unused(), std::vector<std::string>{});
}

TEST(ReweightFindings, ShowsAFindingThatChangedSides) {
    // The fourth finding of the binary data: -1.187 in statsmodels and in R (reference tables).
    const DataSet data("dependent_binary.csv", 3, 1.0);
    EXPECT_EQ(reweight_findings(data.weights(), data.cause, data.ones()).reversed,
              std::vector<Eigen::Index>{3});
}

TEST(JointProbability, OfIndependentMarginsIsTheirProduct) {
    EXPECT_TRUE(rc::check([] {
        const auto list = *rc::gen::container<std::vector<int>>(5, rc::gen::inRange(1, 100));
        const Eigen::ArrayXd all = Eigen::Map<const Eigen::ArrayXi>(list.data(), 5).cast<double>();
        const Eigen::ArrayXd rows = all.head(2) / all.head(2).sum();
        const Eigen::ArrayXd columns = all.tail(3) / all.tail(3).sum();
        const Eigen::ArrayXXd joint = (rows.matrix() * columns.matrix().transpose()).array();
        RC_ASSERT(mutual_information(joint) < 1e-15);
        RC_ASSERT((first_margin(joint) - rows).abs().maxCoeff() < 1e-15);
        RC_ASSERT((second_margin(joint) - columns).abs().maxCoeff() < 1e-15);
        const std::vector<Eigen::ArrayXXd> one{joint};
        for (Eigen::Index i = 0; i < 2; ++i) {
            for (Eigen::Index j = 0; j < 3; ++j) {
                const double apart =
                    joint_loglik(one, i, std::nullopt)(0) + joint_loglik(one, std::nullopt, j)(0);
                RC_ASSERT(near_abs(apart, joint_loglik(one, i, j)(0), 1e-13));
            }
        }
        RC_ASSERT(joint_loglik(one, std::nullopt, std::nullopt)(0) == 0.0);
    }));
}

TEST(MutualInformation, OfACopyIsItsEntropy) {
    Eigen::ArrayXXd copy = Eigen::ArrayXXd::Zero(2, 2);
    copy(0, 0) = 0.25;
    copy(1, 1) = 0.75;
    EXPECT_TRUE(near_rel(-0.25 * std::log(0.25) - 0.75 * std::log(0.75), mutual_information(copy), 1e-15));
}

/// Patients of a calibrated model with two causes and ratios 1/9, 1/3, 3, 9 at even priors, in exact
/// proportion.
LabelledEvidence calibrated(double copies) {
    const Eigen::ArrayXd ratio = (Eigen::ArrayXd(4) << 1.0 / 9.0, 1.0 / 3.0, 3.0, 9.0).finished();
    LabelledEvidence evidence{Eigen::ArrayXd::Zero(2), Eigen::ArrayXXd::Zero(8, 2), Eigen::ArrayXi(8),
                              Eigen::ArrayXd(8)};
    for (Eigen::Index i = 0; i < 8; ++i) {
        const double r = ratio(i % 4);
        evidence.loglik(i, 0) = copies * std::log(r);
        evidence.cause(i) = i < 4 ? 0 : 1;
        evidence.count(i) = 90.0 * (i < 4 ? r : 1.0) / (1.0 + r);
    }
    return evidence;
}

TEST(FitTempering, FindsOneOverTheNumberOfCopies) {
    for (const double m : {0.5, 1.0, 2.0, 5.0, 50.0}) {
        const TemperingFit fit = fit_tempering(calibrated(m));
        EXPECT_TRUE(near_rel(1.0 / m, fit.tau, 1e-12)) << m;
        EXPECT_GE(fit.loglik, fit.loglik_naive);
    }
}

TEST(FitTempering, TakesPatientsTogetherOrOneByOne) {
    LabelledEvidence together = calibrated(3.0);
    together.count.setConstant(2.0);
    LabelledEvidence apart = together;
    apart.loglik = Eigen::ArrayXXd(16, 2);
    apart.loglik << together.loglik, together.loglik;
    apart.cause = Eigen::ArrayXi(16);
    apart.cause << together.cause, together.cause;
    apart.count = Eigen::ArrayXd::Ones(16);
    const TemperingFit one = fit_tempering(together);
    const TemperingFit other = fit_tempering(apart);
    EXPECT_TRUE(near_abs(one.tau, other.tau, 1e-13));
    EXPECT_TRUE(near_rel(one.standard_error, other.standard_error, 1e-12));
}

TEST(FitTempering, IsZeroWhenTheEvidenceMisleads) {
    LabelledEvidence evidence = calibrated(1.0);
    evidence.cause = 1 - evidence.cause;
    const TemperingFit fit = fit_tempering(evidence);
    EXPECT_EQ(fit.tau, 0.0);
    EXPECT_EQ(fit.standard_error, infinity);
    EXPECT_TRUE(near_rel(-evidence.count.sum() * std::log(2.0), fit.loglik, 1e-14));
}

TEST(FitTempering, RefusesWhatHasNoBestExponent) {
    LabelledEvidence right = calibrated(1.0);
    right.loglik = Eigen::ArrayXXd::Constant(8, 2, -3.0);
    expect_domain_error([&] { (void)fit_tempering(right); }, "fit_tempering", "evidence", {}, 0,
                        "different for different causes");
    for (Eigen::Index i = 0; i < 8; ++i) {
        right.loglik(i, right.cause(i)) = -1.0;
    }
    expect_domain_error([&] { (void)fit_tempering(right); }, "fit_tempering", "evidence", {}, infinity,
                        "wrong for at least one patient: where it never is, no finite exponent is best");
    right.cause(3) = 2;
    expect_domain_error([&] { (void)fit_tempering(right); }, "fit_tempering", "evidence.cause",
                        {3, std::nullopt}, 2, "a column of loglik");
}

TEST(FitLogistic, OfOneTwoByTwoTableIsTheLogOddsRatio) {
    // 12 of 20 with the mark, 5 of 30 without: intercept ln(5/25), slope ln of the odds ratio, Woolf's error.
    const Eigen::ArrayXXd x = (Eigen::ArrayXXd(4, 1) << 1, 1, 0, 0).finished();
    const Eigen::ArrayXi y = (Eigen::ArrayXi(4) << 1, 0, 1, 0).finished();
    const Eigen::ArrayXd count = (Eigen::ArrayXd(4) << 12, 8, 5, 25).finished();
    const LogisticFit fit = fit_logistic(x, y, count);
    EXPECT_TRUE(near_rel(std::log(5.0 / 25.0), fit.coefficient(0), 1e-14));
    EXPECT_TRUE(near_rel(std::log(12.0 / 8.0 * 25.0 / 5.0), fit.coefficient(1), 1e-14));
    EXPECT_TRUE(near_rel(std::sqrt(1.0 / 12 + 1.0 / 8 + 1.0 / 5 + 1.0 / 25), fit.standard_error(1), 1e-12));
    EXPECT_TRUE(
        near_rel(12 * std::log(0.6) + 8 * std::log(0.4) + 5 * std::log(1.0 / 6) + 25 * std::log(5.0 / 6),
                 fit.loglik, 1e-14));
}

TEST(FitLogistic, SolvesItsScoreEquationsFromAnyData) {
    EXPECT_TRUE(rc::check([] {
        // A seed, so that small cases are not degenerate ones.
        std::mt19937 bits(*rc::gen::noShrink(rc::gen::resize(100, rc::gen::arbitrary<std::uint32_t>())));
        std::uniform_real_distribution<double> uniform(-1.0, 1.0);
        const Eigen::ArrayXXd x = Eigen::ArrayXXd::NullaryExpr(30, 2, [&](Eigen::Index, Eigen::Index j) {
            return uniform(bits) * (j == 0 ? 1.0 : 4000.0);  // scales far apart
        });
        const Eigen::ArrayXi y = Eigen::ArrayXi::NullaryExpr(30, [&] { return uniform(bits) > 0.4 ? 1 : 0; });
        std::optional<LogisticFit> fit;
        try {
            fit = fit_logistic(x, y, Eigen::ArrayXd::Ones(30));
        } catch (const DomainError& error) {
            RC_ASSERT(error.argument() == "y" || error.argument() == "separations of y by x");
            RC_DISCARD("one-sided or separated");
        }
        const Eigen::ArrayXd score =
            fit->coefficient(0) + (x.matrix() * fit->coefficient.tail(2).matrix()).array();
        const Eigen::ArrayXd residual = y.cast<double>() - 1.0 / (1.0 + (-score).exp());
        RC_ASSERT(std::abs(residual.sum()) < 1e-9);
        RC_ASSERT((x.colwise() * residual).colwise().sum().abs().maxCoeff() < 1e-5);
    }));
}

void expect_separated(const Eigen::ArrayXXd& x, const Eigen::ArrayXi& y) {
    try {
        (void)fit_logistic(x, y, Eigen::ArrayXd::Ones(y.size()));
        ADD_FAILURE() << "separated outcomes were fitted";
    } catch (const DomainError& error) {
        EXPECT_EQ(error.argument(), "separations of y by x") << error.what();
    }
}

TEST(FitLogistic, RefusesSeparatedOutcomes) {
    const Eigen::ArrayXi y = (Eigen::ArrayXi(6) << 0, 0, 0, 1, 1, 1).finished();
    const Eigen::ArrayXXd complete = (Eigen::ArrayXXd(6, 1) << 1, 2, 3, 4, 5, 6).finished();
    expect_separated(complete, y);
    // Quasi-complete: the outcomes meet in one value only.
    const Eigen::ArrayXXd quasi = (Eigen::ArrayXXd(6, 1) << 1, 2, 3, 3, 5, 6).finished();
    expect_separated(quasi, y);
    // An empty cell of a two-by-two table is quasi-complete as well.
    const Eigen::ArrayXXd cell = (Eigen::ArrayXXd(6, 1) << 0, 1, 0, 1, 1, 1).finished();
    expect_separated(cell, y);
    // Overlap by one pair is enough to have an answer.
    const Eigen::ArrayXXd overlap = (Eigen::ArrayXXd(6, 1) << 1, 2, 4, 3, 5, 6).finished();
    EXPECT_GT(fit_logistic(overlap, y, Eigen::ArrayXd::Ones(6)).coefficient(1), 0.0);
}

TEST(FitLogistic, RefusesWhatItCannotTellApart) {
    const Eigen::ArrayXi y = (Eigen::ArrayXi(4) << 0, 1, 0, 1).finished();
    const Eigen::ArrayXXd twice = (Eigen::ArrayXXd(4, 2) << 1, 2, 5, 10, 3, 6, 2, 4).finished();
    const Eigen::ArrayXd ones = Eigen::ArrayXd::Ones(4);
    expect_domain_error([&] { (void)fit_logistic(twice, y, ones); }, "fit_logistic", "x columns", {}, 1,
                        "independent of each other and of the intercept: 2");
    const Eigen::ArrayXXd one = twice.leftCols(1);
    expect_domain_error([&] { (void)fit_logistic(one, Eigen::ArrayXi::Ones(4), ones); }, "fit_logistic", "y",
                        {}, 1, "0 for some and 1 for others");
    expect_domain_error([&] { (void)fit_logistic(one, 2 * y, ones); }, "fit_logistic", "y", {1, std::nullopt},
                        2, "0 or 1");
    expect_domain_error([&] { (void)reweight_findings(one.leftCols(0), y, ones); }, "reweight_findings",
                        "weight columns size", {}, 0, "at least 1");
}

TEST(CoxCalibration, OfACalibratedForecastIsOneAndZero) {
    const LabelledEvidence evidence = calibrated(1.0);
    for (const double sureness : {0.5, 1.0, 4.0}) {
        const Eigen::ArrayXd log_odds = sureness * (evidence.loglik.col(0) - evidence.loglik.col(1));
        const CoxCalibration cox = cox_calibration(log_odds, 1 - evidence.cause, evidence.count);
        EXPECT_TRUE(near_abs(0.0, cox.intercept, 1e-13));
        EXPECT_TRUE(near_rel(1.0 / sureness, cox.slope, 1e-12));
    }
}

TEST(JointLoglik, RefusesTablesThatDoNotMatch) {
    const Eigen::ArrayXXd small = Eigen::ArrayXXd::Constant(2, 2, 0.25);
    const Eigen::ArrayXXd large = Eigen::ArrayXXd::Constant(2, 3, 1.0 / 6.0);
    expect_domain_error(
        [&] {
            (void)joint_loglik({small, large}, 0, 0);
        },
        "joint_loglik", "joints columns size", {}, 3, "2");
    expect_domain_error([&] { (void)joint_loglik({small}, 2, 0); }, "joint_loglik", "first", {}, 2,
                        "between 0 and 1");
    expect_domain_error([&] { (void)mutual_information(small * 2.0); }, "first_margin", "joint sum", {}, 2.0,
                        "1 within 1e-9");
    expect_domain_error([&] { (void)joint_probability(small, 0.0); }, "joint_probability", "start", {}, 0,
                        "finite and > 0");
}

}  // namespace
