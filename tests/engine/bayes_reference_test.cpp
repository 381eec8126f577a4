// SPDX-License-Identifier: Apache-2.0
// tests/reference/bayes.csv: every row is compared. Its inputs are in bayes_inputs.json, with where they come
// from.

#include <gtest/gtest.h>
#include <Eigen/LU>

#include <algorithm>
#include <cmath>
#include <nlohmann/json.hpp>
#include <stdexcept>
#include <string>
#include <vector>

#include "expect_domain_error.hpp"
#include "near.hpp"
#include "reference_inputs.hpp"
#include "reference_table.hpp"
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

/// A table's rows as P(category | cause), shape (categories, causes).
Eigen::ArrayXXd rows_of(const json& table) {
    const auto causes = static_cast<Eigen::Index>(table["p"].size());
    Eigen::ArrayXXd rows(static_cast<Eigen::Index>(table["cats"].size()), causes);
    for (Eigen::Index cause = 0; cause < causes; ++cause) {
        rows.col(cause) = numbers(table["p"][static_cast<std::size_t>(cause)]);
    }
    return rows;
}

Eigen::Index place_of(const json& names, const std::string& name) {
    for (std::size_t i = 0; i < names.size(); ++i) {
        if (names[i] == name) {
            return static_cast<Eigen::Index>(i);
        }
    }
    throw std::runtime_error("no category " + name);
}

class BayesReference : public testing::Test {
  protected:
    BayesReference() : table("bayes.csv"), inputs(reference_json("bayes_inputs.json")) {}

    void expect(const std::string& which, const std::string& quantity, double got) {
        EXPECT_TRUE(table.matches(which, quantity, got));
    }
    void expect_text(const std::string& which, const std::string& quantity, const std::string& got) {
        EXPECT_EQ(table.rows().at({which, quantity}).value, got);
        table.rows().at({which, quantity}).used = true;
    }
    /// Rows of cases with these names were all compared.
    void expect_all_used(const std::vector<std::string>& cases) {
        for (const std::string& row : table.unused()) {
            for (const std::string& name : cases) {
                EXPECT_NE(row.substr(0, row.find(' ')), name) << row << " was not compared";
            }
        }
    }

    ReferenceTable table;
    json inputs;
};

void names_of(const json& list, std::vector<std::string>& names) {
    for (const json& entry : list) {
        names.push_back(entry["id"]);
    }
}

TEST_F(BayesReference, TablesNameNoOtherCases) {
    std::vector<std::string> names;
    for (const char* list :
         {"two_hypotheses", "interval_tables", "k_causes", "one_vs_rest", "one_vs_rest_rounded"}) {
        names_of(inputs[list], names);
    }
    for (const auto& [key, row] : table.rows()) {
        EXPECT_NE(std::find(names.begin(), names.end(), key.first), names.end()) << key.first;
    }
}

TEST_F(BayesReference, TwoHypotheses) {
    std::vector<std::string> names;
    names_of(inputs["two_hypotheses"], names);
    for (const json& c : inputs["two_hypotheses"]) {
        const std::string id = c["id"];
        const LogOdds prior = LogOdds::of(Probability::of(number(c["pretest"])));
        expect(id, "prior_odds", prior.to_odds());
        LogOdds all = prior;
        for (const json& ratio : c["lrs"]) {
            const LogWeight weight = LogWeight::of_ratio(number(ratio));
            expect(id, "posttest[LR=" + ratio.get<std::string>() + "]",
                   (prior + weight).to_probability().value());
            all = all + weight;
        }
        if (table.has(id, "posttest_all_multiplied")) {
            expect(id, "posttest_all_multiplied", all.to_probability().value());
        }
    }
    expect_all_used(names);
}

TEST_F(BayesReference, IntervalTables) {
    std::vector<std::string> names;
    names_of(inputs["interval_tables"], names);
    for (const json& c : inputs["interval_tables"]) {
        const std::string id = c["id"];
        const Eigen::ArrayXd with = numbers(c["counts_with"]), without = numbers(c["counts_without"]);
        Eigen::ArrayXXd rows(with.size(), 2);
        rows << with / with.sum(), without / without.sum();
        if ((rows > 0.0).all()) {
            rows.col(0) = share_row(rows.col(0), with.sum()).probability;
            rows.col(1) = share_row(rows.col(1), without.sum()).probability;
            expect(id, "sum_over_cats_P(x|no)*LR",
                   (rows.col(1) * pair_ratio(rows, CauseIndex{0}, CauseIndex{1})).sum());
        } else {
            // A share of 0 is refused: nothing seen later could undo it. The table's rows for the empty
            // categories say what plain proportions would give; the program never forms them.
            EXPECT_THROW(share_row(rows.col(0), with.sum()), DomainError);
            EXPECT_THROW(static_cast<void>(pair_ratio(rows, CauseIndex{0}, CauseIndex{1})), DomainError);
        }
        for (Eigen::Index i = 0; i < with.size(); ++i) {
            const std::string name = c["categories"][static_cast<std::size_t>(i)];
            const double ratio = rows(i, 0) / rows(i, 1);
            expect(id, "LR[" + name + "]", ratio);
            if (rows(i, 1) == 0.0) {
                continue;
            }
            expect(id, "P(cat|with)[" + name + "]", rows(i, 0));
            expect(id, "P(cat|without)[" + name + "]", rows(i, 1));
            for (const json& pretest : c["pretests"]) {
                const LogOdds prior = LogOdds::of(Probability::of(number(pretest)));
                const LogOdds after =
                    rows(i, 0) == 0.0 ? LogOdds::of_odds(0.0) : prior + LogWeight::of_ratio(ratio);
                expect(id, "posttest[" + name + ";pretest=" + pretest.get<std::string>() + "]",
                       after.to_probability().value());
            }
        }
    }
    expect_all_used(names);
}

TEST_F(BayesReference, ManyCauses) {
    std::vector<std::string> names;
    names_of(inputs["k_causes"], names);
    for (const json& c : inputs["k_causes"]) {
        const std::string id = c["id"];
        const Eigen::ArrayXd log_prior = numbers(c["prior_odds"]).log();
        std::vector<Eigen::ArrayXd> observed;
        for (const auto& [finding, category] : c["observed"].items()) {
            if (!category.is_null()) {  // not done is not normal: it is left out
                const Eigen::ArrayXXd rows = rows_of(c["tables"][finding]);
                observed.emplace_back(rows.row(place_of(c["tables"][finding]["cats"], category)).log());
            }
        }
        Eigen::ArrayXXd loglik(static_cast<Eigen::Index>(observed.size()), log_prior.size());
        for (std::size_t i = 0; i < observed.size(); ++i) {
            loglik.row(static_cast<Eigen::Index>(i)) = observed[i];
        }
        const Eigen::ArrayXd weight = Eigen::ArrayXd::Ones(loglik.rows());
        const Eigen::ArrayXd prior =
            posterior(log_prior, Eigen::ArrayXXd(0, log_prior.size()), Eigen::ArrayXd(0));
        const Eigen::ArrayXd after = posterior(log_prior, loglik, weight);
        std::vector<std::size_t> ranking;
        for (std::size_t k = 0; k < c["causes"].size(); ++k) {
            const auto cause = static_cast<Eigen::Index>(k);
            const std::string name = c["causes"][k];
            expect(id, "prior[" + name + "]", prior(cause));
            const std::string quantity = "posterior[" + name + "]";
            if (id == "K3_underflow") {
                // The inputs ln(1e-200) and so on are themselves rounded, by up to 2^-44 each at this size:
                // four of them and p (1 - p) = 0.24 allow 5.5e-14, more than the table's 1e-14.
                EXPECT_TRUE(near_abs(table.value(id, quantity), after(cause), 5.5e-14));
                table.rows().at({id, quantity}).used = true;
            } else {
                expect(id, quantity, after(cause));
            }
            if (k > 0) {
                expect(id, "ln_posterior_odds[" + name + ":" + c["causes"][0].get<std::string>() + "]",
                       log_posterior_odds(log_prior, loglik, weight, CauseIndex{cause}, CauseIndex{0}));
            }
            ranking.push_back(k);
        }
        expect(id, "log_evidence_nats", log_evidence(log_prior, loglik, weight));
        std::stable_sort(ranking.begin(), ranking.end(), [&after](std::size_t a, std::size_t b) {
            return after(static_cast<Eigen::Index>(a)) > after(static_cast<Eigen::Index>(b));
        });
        std::string text;
        for (const std::size_t k : ranking) {
            text += (text.empty() ? "" : ">") + c["causes"][k].get<std::string>();
        }
        expect_text(id, "ranking", text);
    }
    expect_all_used(names);
}

TEST_F(BayesReference, OneAgainstRest) {
    std::vector<std::string> names;
    names_of(inputs["one_vs_rest"], names);
    for (const json& c : inputs["one_vs_rest"]) {
        const std::string id = c["id"];
        const Eigen::ArrayXd mix = numbers(c["study_mix"]);
        const Eigen::ArrayXd clinic = numbers(c["clinic_prior_odds"]) / numbers(c["clinic_prior_odds"]).sum();
        const Eigen::Index causes = mix.size();
        Eigen::ArrayXXd loglik(0, causes);
        std::vector<LogOdds> wrong;
        for (Eigen::Index k = 0; k < causes; ++k) {
            wrong.push_back(LogOdds::of(Probability::of(clinic(k))));
        }
        for (const auto& [finding, category] : c["observed"].items()) {
            const json& cats = c["tables"][finding]["cats"];
            const Eigen::ArrayXXd rows = rows_of(c["tables"][finding]);
            const Eigen::ArrayXXd ratio = ratio_to_rest(rows, mix);
            const Eigen::ArrayXXd shape = shape_from_rest(ratio, mix);
            const RestSolution solved = solve_ratio_to_rest(ratio, mix);
            EXPECT_TRUE(solved.scale_is_unique);
            for (Eigen::Index band = 0; band < rows.rows(); ++band) {
                const std::string at =
                    finding + "=" + cats[static_cast<std::size_t>(band)].get<std::string>();
                expect(id, "consistency_S[" + at + "]", solved.band_sum(band));
                expect(id, "study_marginal_m[" + at + "]", solved.study_share(band));
                for (Eigen::Index k = 0; k < causes; ++k) {
                    const std::string cause = c["causes"][static_cast<std::size_t>(k)];
                    expect(id, "ovr_LR[" + at + ";" + cause + "]", ratio(band, k));
                    expect(id, "shape_l_over_m[" + at + ";" + cause + "]", shape(band, k));
                    EXPECT_TRUE(near_rel(rows(band, k), solved.probability(band, k), 1e-12));
                }
            }
            const Eigen::Index seen = place_of(cats, category);
            loglik.conservativeResize(loglik.rows() + 1, Eigen::NoChange);
            loglik.bottomRows(1) = solved.probability.row(seen).log();
            for (Eigen::Index k = 0; k < causes; ++k) {
                LogOdds& odds = wrong[static_cast<std::size_t>(k)];
                odds = odds + LogWeight::of_ratio(ratio(seen, k));
            }
        }
        const Eigen::ArrayXd right = posterior(clinic.log(), loglik, Eigen::ArrayXd::Ones(loglik.rows()));
        // What the program must not do: multiply one-against-rest ratios. The table shows by how much that
        // goes wrong.
        Eigen::ArrayXd product(causes);
        for (Eigen::Index k = 0; k < causes; ++k) {
            product(k) = wrong[static_cast<std::size_t>(k)].to_probability().value();
        }
        for (Eigen::Index k = 0; k < causes; ++k) {
            const std::string cause = c["causes"][static_cast<std::size_t>(k)];
            expect(id, "posterior_correct[" + cause + "]", right(k));
            expect(id, "WRONG_multiplied_ovr_odds_prob[" + cause + "]", product(k));
            expect(id, "WRONG_renormalised[" + cause + "]", product(k) / product.sum());
        }
        expect(id, "WRONG_sum_of_probs", product.sum());
    }
    expect_all_used(names);
}

TEST_F(BayesReference, RoundedOneAgainstRest) {
    std::vector<std::string> names;
    names_of(inputs["one_vs_rest_rounded"], names);
    for (const json& c : inputs["one_vs_rest_rounded"]) {
        const std::string id = c["id"];
        const Eigen::ArrayXd mix = numbers(c["study_mix"]);
        const Eigen::ArrayXXd ratio = numbers(c["lrs"]).transpose();
        const double sum = band_sum(ratio, mix)(0);
        expect(id, "consistency_S", sum);
        expect(id, "inconsistency_S_minus_1", sum - 1.0);
        // The linear system (D - R w^T) p = 0 has a solution other than 0 only where its determinant is 0,
        // that is S = 1.
        const Eigen::ArrayXd r = ratio.row(0);
        const Eigen::MatrixXd system = Eigen::MatrixXd((1.0 - mix + mix * r).matrix().asDiagonal()) -
                                       r.matrix() * mix.matrix().transpose();
        expect(id, "determinant_of_system", system.determinant());
        const Eigen::ArrayXd shape = shape_from_rest(ratio, mix).row(0);
        // A posterior needs the shape only; scaled so that no likelihood is over 1.
        const Eigen::ArrayXXd loglik = (shape / shape.maxCoeff()).log().transpose();
        const Eigen::ArrayXd after =
            posterior(numbers(c["clinic_prior_odds"]).log(), loglik, Eigen::ArrayXd::Ones(1));
        for (Eigen::Index k = 0; k < mix.size(); ++k) {
            const std::string cause = c["causes"][static_cast<std::size_t>(k)];
            expect(id, "shape[" + cause + "]", shape(k));
            expect(id, "posterior_from_shape[" + cause + "]", after(k));
        }
    }
    expect_all_used(names);
}

}  // namespace
