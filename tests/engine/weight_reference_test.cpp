// SPDX-License-Identifier: Apache-2.0
// tests/reference/weight_of_evidence.csv: every row is compared. Its inputs and their origin are in
// weight_of_evidence_inputs.json; and worked examples in print, each with its source.

#include <gtest/gtest.h>

#include <cmath>
#include <map>
#include <nlohmann/json.hpp>
#include <string>
#include <vector>

#include "near.hpp"
#include "reference_inputs.hpp"
#include "reference_table.hpp"
#include "steelyard/engine/ledger.hpp"
#include "steelyard/engine/log_weight.hpp"
#include "steelyard/engine/one_against_rest.hpp"
#include "steelyard/engine/posterior.hpp"
#include "steelyard/engine/probability.hpp"
#include "steelyard/engine/row_forms.hpp"

namespace {

using namespace steelyard::engine;  // the functions under test
using nlohmann::json;
using steelyard::test::near_abs;
using steelyard::test::near_rel;
using steelyard::test::number;
using steelyard::test::numbers;
using steelyard::test::reference_json;
using steelyard::test::ReferenceTable;

double decibans(double nats) {
    return LogWeight::nats(nats).to_decibans();
}

void conversions(const json& inputs, const ReferenceTable& table) {
    for (const json& text : inputs["conversions"]) {
        const LogWeight weight = LogWeight::of_ratio(number(text));
        const std::string of = "[LR=" + text.get<std::string>() + "]";
        EXPECT_TRUE(table.matches("conv", "nats" + of, weight.to_nats()));
        EXPECT_TRUE(table.matches("conv", "bits" + of, weight.to_bits()));
        EXPECT_TRUE(table.matches("conv", "bans" + of, weight.to_bans()));
        EXPECT_TRUE(table.matches("conv", "decibans" + of, weight.to_decibans()));
    }
    EXPECT_TRUE(table.matches("const", "nats_per_deciban", LogWeight::decibans(1).to_nats()));
    EXPECT_TRUE(table.matches("const", "decibans_per_bit", LogWeight::bits(1).to_decibans()));
    for (const json& text : inputs["from_decibans"]) {
        const LogOdds odds = LogOdds::nats(0.0) + LogWeight::decibans(number(text));
        const std::string of = "[" + text.get<std::string>() + " db]";
        EXPECT_TRUE(table.matches("from_db", "odds" + of, odds.to_odds()));
        EXPECT_TRUE(table.matches("from_db", "probability" + of, odds.to_probability().value()));
    }
    for (const json& text : inputs["to_decibans_from_probability"]) {
        const std::string of = "[p=" + text.get<std::string>() + "]";
        const LogWeight odds = LogOdds::of(Probability::of(number(text))) - LogOdds::nats(0.0);
        EXPECT_TRUE(table.matches("to_db", "db_of_odds" + of, odds.to_decibans()));
        EXPECT_TRUE(
            table.matches("to_db", "ten_log10_p" + of, LogWeight::of_ratio(number(text)).to_decibans()));
    }
}

/// A run of throws, weighed as that many findings of two causes.
void coin_or_die(const json& c, const ReferenceTable& table) {
    const std::string id = c["id"];
    const double p1 = number(c["p_h1"]), p0 = number(c["p_h0"]);
    const double success = LogWeight::of_ratio(p1 / p0).to_decibans();
    const double failure = LogWeight::of_ratio((1 - p1) / (1 - p0)).to_decibans();
    EXPECT_TRUE(table.matches(id, "db_success", success));
    EXPECT_TRUE(table.matches(id, "db_failure", failure));
    EXPECT_TRUE(table.matches(id, "expected_db_per_trial_if_h1", p1 * success + (1 - p1) * failure));
    const auto successes = c["successes"].get<Eigen::Index>(), failures = c["failures"].get<Eigen::Index>();
    Eigen::ArrayXXd loglik(successes + failures, 2);
    loglik.topRows(successes).col(0) = std::log(p1);
    loglik.topRows(successes).col(1) = std::log(p0);
    loglik.bottomRows(failures).col(0) = std::log1p(-p1);
    loglik.bottomRows(failures).col(1) = std::log1p(-p0);
    const Eigen::ArrayXd weight = Eigen::ArrayXd::Ones(loglik.rows());
    Eigen::ArrayXd log_prior(2);
    log_prior << std::log(number(c["prior"])), std::log1p(-number(c["prior"]));
    EXPECT_TRUE(table.matches(
        id, "db_total",
        decibans(log_posterior_odds(Eigen::ArrayXd::Zero(2), loglik, weight, CauseIndex{0}, CauseIndex{1}))));
    EXPECT_TRUE(table.matches(id, "posterior", posterior(log_prior, loglik, weight)(0)));
}

void one_ledger(const json& c, const ReferenceTable& table) {
    const std::string id = c["id"];
    const Eigen::ArrayXd log_prior = numbers(c["prior_odds"]).log();
    const Eigen::Index causes = log_prior.size();
    const auto name = [&c](Eigen::Index k) {
        return c["causes"][static_cast<std::size_t>(k)].get<std::string>();
    };
    bool first = true;
    for (const json& order : c["orders"]) {
        std::string tag = "order=";
        Eigen::ArrayXXd loglik(static_cast<Eigen::Index>(order.size()), causes);
        for (std::size_t f = 0; f < order.size(); ++f) {
            tag += order[f].get<std::string>();
            loglik.row(static_cast<Eigen::Index>(f)) =
                numbers(c["likelihoods"][order[f].get<std::string>()]).log().transpose();
        }
        const Eigen::ArrayXd weight = Eigen::ArrayXd::Ones(loglik.rows());
        Eigen::ArrayXd running = log_prior.exp() / log_prior.exp().sum();
        for (Eigen::Index f = 0; f < loglik.rows(); ++f) {
            const std::string finding = order[static_cast<std::size_t>(f)];
            // Against the rest at the running mix: what depends on the order of entry, and the ledger does
            // not offer.
            const Eigen::ArrayXXd rest = ratio_to_rest(loglik.row(f).exp(), running / running.sum());
            running = posterior(log_prior, loglik.topRows(f + 1), weight.head(f + 1));
            for (Eigen::Index k = 0; k < causes; ++k) {
                EXPECT_TRUE(table.matches(id, tag + " vs_rest_db[" + finding + "; " + name(k) + "]",
                                          decibans(std::log(rest(0, k)))));
                EXPECT_TRUE(table.matches(
                    id, tag + " running_posterior[after " + finding + "; " + name(k) + "]", running(k)));
            }
        }
        if (!first) {
            continue;
        }
        first = false;
        const Ledger whole = ledger(log_prior, loglik, weight);
        for (Eigen::Index k = 1; k < causes; ++k) {
            const Ledger::Pair pair = whole.pair(k, 0);
            const std::string against = name(k) + " vs " + name(0) + "]";
            double rounded = 0.0;
            std::vector<double> lines{decibans(pair.prior)};
            for (Eigen::Index f = 0; f < loglik.rows(); ++f) {
                const std::string finding = order[static_cast<std::size_t>(f)];
                EXPECT_TRUE(
                    table.matches(id, "line_db[" + finding + "; " + against, decibans(pair.lines(f))));
                rounded += std::nearbyint(decibans(pair.lines(f)));
                lines.push_back(decibans(pair.lines(f)));
            }
            EXPECT_TRUE(table.matches(id, "prior_db[" + against, decibans(pair.prior)));
            EXPECT_TRUE(table.matches(id, "total_evidence_db[" + against, decibans(pair.lines.sum())));
            EXPECT_TRUE(table.matches(id, "posterior_db[" + against, decibans(pair.total)));
            EXPECT_TRUE(table.matches(id, "sum_of_lines_rounded_to_whole_db[" + against, rounded));
            // Rounded one by one they need not add up; rounded together they do.
            double sum = 0.0;
            for (const double line : rounded_to_add_up(lines, 0)) {
                sum += line;
            }
            EXPECT_EQ(sum, std::nearbyint(decibans(pair.total)));
        }
    }
}

TEST(WeightReference, AgreesRowByRow) {
    const ReferenceTable table("weight_of_evidence.csv");
    const json inputs = reference_json("weight_of_evidence_inputs.json");
    conversions(inputs, table);
    for (const json& c : inputs["coin_or_die"]) {
        coin_or_die(c, table);
    }
    for (const json& c : inputs["ledgers"]) {
        one_ledger(c, table);
    }
    EXPECT_TRUE(table.unused().empty()) << table.unused().front();
}

// ---- worked examples as printed ----

double after(double pretest, double ratio) {
    return (LogOdds::of(Probability::of(pretest)) + LogWeight::of_ratio(ratio)).to_probability().value();
}

TEST(WorkedExamples, FerritinInTheElderly) {
    // Guyatt GH et al., Am J Med 1990;88:205-209 (abstract seen): ratios 41.47, 3.12, 0.46, 0.13 for ferritin
    // <= 18, > 18 to 45, > 45 to 100, > 100 ug/L; 36 % without marrow iron. Ratios of two causes: the product
    // rule holds, and posttest odds are 0.36 / 0.64 times each, worked by hand to four digits here.
    EXPECT_TRUE(near_abs(0.9589, after(0.36, 41.47), 5e-5));
    EXPECT_TRUE(near_abs(0.6370, after(0.36, 3.12), 5e-5));
    EXPECT_TRUE(near_abs(0.2056, after(0.36, 0.46), 5e-5));
    EXPECT_TRUE(near_abs(0.0681, after(0.36, 0.13), 5e-5));
}

TEST(WorkedExamples, RareConditionWithAGoodTest) {
    // Prob140 textbook, section 2.5 (seen): prevalence 0.4 %, sensitivity 99 %, specificity 99.5 % gives 44.3
    // %.
    Eigen::ArrayXd log_prior(2);
    log_prior << std::log(0.004), std::log(0.996);
    Eigen::ArrayXXd loglik(1, 2);
    loglik << std::log(0.99), std::log(0.005);
    EXPECT_TRUE(near_abs(0.443, posterior(log_prior, loglik, Eigen::ArrayXd::Ones(1))(0), 5e-4));
}

TEST(WorkedExamples, LungScan) {
    // Counts by scan result, from memory of Jaeschke R et al., JAMA 1994;271:703-707, which prints the ratios
    // 18.3, 1.2, 0.36, 0.10 (from memory).
    Eigen::ArrayXd with(4), without(4);
    with << 102, 105, 39, 5;
    without << 14, 217, 273, 126;
    Eigen::ArrayXXd rows(4, 2);
    rows << share_row(with / with.sum(), 251).probability,
        share_row(without / without.sum(), 630).probability;
    const Eigen::ArrayXd ratio = pair_ratio(rows, CauseIndex{0}, CauseIndex{1});
    EXPECT_TRUE(near_abs(18.3, ratio(0), 0.05));
    EXPECT_TRUE(near_abs(1.2, ratio(1), 0.05));
    EXPECT_TRUE(near_abs(0.36, ratio(2), 0.005));
    EXPECT_TRUE(near_abs(0.10, ratio(3), 0.005));
}

TEST(WorkedExamples, DecibansOfTheTunnyReport) {
    // General Report on Tunny, 1945, p. 103 (seen in transcription): "13 db up, 20 to 1 on"; "4 db, 5 to 2
    // on"; p = 8/13 is 2 db up.
    EXPECT_TRUE(near_abs(20.0, LogWeight::decibans(13).to_ratio(), 0.5));
    EXPECT_TRUE(near_abs(2.5, LogWeight::decibans(4).to_ratio(), 0.05));
    EXPECT_TRUE(
        near_abs(2.0, (LogOdds::of(Probability::of(8.0 / 13.0)) - LogOdds::nats(0)).to_decibans(), 0.05));
}

TEST(WorkedExamples, LoadedDie) {
    // Good's illustration (from memory): a die with chance 1/3 of a six gains 3 db at a six, loses 1 db at
    // any other throw.
    EXPECT_TRUE(near_abs(3.0, LogWeight::of_ratio((1.0 / 3) / (1.0 / 6)).to_decibans(), 0.05));
    EXPECT_TRUE(near_abs(-1.0, LogWeight::of_ratio((2.0 / 3) / (5.0 / 6)).to_decibans(), 0.05));
}

TEST(WorkedExamples, TwoByTwoOfTheEpiRManual) {
    // epiR manual, epi.tests (seen): 670, 202, 74, 640; it prints LR+ 3.75.
    Eigen::ArrayXXd rows(2, 2);
    rows << 670.0 / 744.0, 202.0 / 842.0, 74.0 / 744.0, 640.0 / 842.0;
    EXPECT_TRUE(near_abs(3.75, pair_ratio(rows, CauseIndex{0}, CauseIndex{1})(0), 5e-3));
}

TEST(WorkedExamples, FurosemideAndFludrocortisone) {
    // Dhayat et al. 2017: sensitivity 0.77, specificity 0.85; published predictive values 0.30 and 0.98 where
    // 8 % have distal renal tubular acidosis (seen in the abstract). Recomputed: LR 5.13 and 0.27, 0.309 and
    // 0.977.
    const double positive = 0.77 / (1 - 0.85), negative = (1 - 0.77) / 0.85;
    EXPECT_TRUE(near_abs(5.13, positive, 5e-3));
    EXPECT_TRUE(near_abs(0.27, negative, 5e-3));
    EXPECT_TRUE(near_abs(0.30, after(0.08, positive), 0.01));
    EXPECT_TRUE(near_abs(0.309, after(0.08, positive), 5e-4));
    EXPECT_TRUE(near_abs(0.98, 1 - after(0.08, negative), 5e-3));
}

}  // namespace
