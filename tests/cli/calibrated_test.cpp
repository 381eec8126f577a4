// SPDX-License-Identifier: Apache-2.0
// A million cases drawn from tables and priors, so that the probabilities of an audit under the same tables
// and priors are right by construction. Five of the shipped findings are few enough that every pattern can be
// listed, and with it what each score must be on average and how far a million cases may be from it.
#include <gtest/gtest.h>

#include <Eigen/Core>
#include <algorithm>
#include <array>
#include <cmath>
#include <filesystem>
#include <nlohmann/json.hpp>
#include <numeric>

#include "run_program.hpp"
#include "steelyard/cli/audit.hpp"
#include "steelyard/cli/tally_file.hpp"
#include "steelyard/engine/counter_random.hpp"
#include "steelyard/likelihoods/read_table_set.hpp"
#include "steelyard/priors/prior_set.hpp"

namespace steelyard::test {
namespace {

const std::string five = STEELYARD_FIVE_TABLES;
const std::string clinic = "renal-clinic";
constexpr std::uint64_t patients = 1'000'000;
/// Chance that a finding is not known, whatever the cause.
constexpr double missing = 0.1;

/// Every pattern of the findings of some tables: how likely each is together with each cause.
class Patterns {
  public:
    Patterns(const likelihoods::TableSet& tables, const priors::PriorSet& priors) {
        const auto causes = static_cast<Eigen::Index>(priors.causes.size());
        std::vector<Eigen::ArrayXXd> states;  // not known first, then the bands
        Eigen::Index count = 1;
        for (const likelihoods::EvidenceTable& table : tables.tables) {
            const Eigen::ArrayXXd shares = likelihoods::band_probabilities(tables, table, priors.ids());
            Eigen::ArrayXXd of(shares.rows() + 1, causes);
            of.row(0) = missing;
            of.bottomRows(shares.rows()) = (1.0 - missing) * shares;
            count *= of.rows();
            states.push_back(of);
        }
        joint.resize(count, causes);
        for (Eigen::Index pattern = 0; pattern < count; ++pattern) {
            Eigen::Index left = pattern;
            likelihoods::PatternCode code;
            for (Eigen::Index k = 0; k < causes; ++k) {
                joint(pattern, k) = priors.causes[static_cast<std::size_t>(k)].probability;
            }
            for (const Eigen::ArrayXXd& of : states) {
                const Eigen::Index state = left % of.rows();
                left /= of.rows();
                joint.row(pattern) *= of.row(state);
                code += static_cast<char>(state == 0 ? likelihoods::missing_state
                                                     : likelihoods::first_band_state + state - 1);
            }
            codes.push_back(code);
        }
    }
    Eigen::ArrayXXd posterior() const {
        Eigen::ArrayXXd of = joint;
        of.colwise() /= joint.rowwise().sum().eval();
        return of;
    }

    std::vector<likelihoods::PatternCode> codes;
    Eigen::ArrayXXd joint;  ///< (patterns, causes), summing to 1
};

/// Mean and standard deviation of one patient's score.
struct Law {
    double mean = 0.0, sd = 0.0;
};
Law law_of(const Eigen::ArrayXXd& joint, const Eigen::ArrayXXd& score) {
    const double mean = (joint * score).sum();
    return {mean, std::sqrt((joint * (score - mean).square()).sum())};
}

/// Scores of forecasts when patterns and causes come as in `joint`: exact, over all of them.
struct Expected {
    Law log_score, brier;
    Eigen::ArrayXd mean_given;  ///< by cause

    Expected(const Eigen::ArrayXXd& joint, const Eigen::ArrayXXd& forecast)
        : log_score(law_of(joint, -forecast.log())) {
        Eigen::ArrayXXd score = -2.0 * forecast;
        score.colwise() += forecast.square().rowwise().sum().eval() + 1.0;
        brier = law_of(joint, score);
        mean_given = (forecast.colwise() * joint.rowwise().sum()).colwise().sum();
    }
};

/// The million patients, counted: each draws one cell of pattern and cause from the exact shares.
cli::Tally draw(const likelihoods::TableSet& tables, const priors::PriorSet& priors, const Patterns& patterns,
                std::uint64_t seed) {
    std::vector<double> up_to(static_cast<std::size_t>(patterns.joint.size()));
    std::partial_sum(patterns.joint.data(), patterns.joint.data() + patterns.joint.size(), up_to.begin());
    std::vector<double> uniform(patients);
    engine::fill_uniform(seed, 0, 0, uniform);
    std::vector<std::uint64_t> count(up_to.size());
    for (const double u : uniform) {
        const auto cell = std::upper_bound(up_to.begin(), up_to.end() - 1, u * up_to.back());
        ++count[static_cast<std::size_t>(cell - up_to.begin())];
    }
    cli::Tally tally(cli::tally_head(tables, {}, false));
    for (std::size_t cell = 0; cell < count.size(); ++cell) {
        if (count[cell] > 0) {
            tally.add(patterns.codes[cell % patterns.codes.size()], likelihoods::GateStatus::in_scope,
                      priors.causes[cell / patterns.codes.size()].id, {}, {}, count[cell]);
        }
    }
    return tally;
}

/// The same tables with every share raised to a power and the row normalised, as a folder beside the first.
std::string with_power(const likelihoods::TableSet& tables, double power, const WorkDir& dir) {
    std::filesystem::create_directories(dir.file("powered"));
    std::filesystem::copy_file(five + "/set.yaml", dir.file("powered/set.yaml"));
    const auto list = [](const auto& numbers) {
        std::ostringstream text;
        text.precision(17);
        for (std::size_t i = 0; i < static_cast<std::size_t>(numbers.size()); ++i) {
            text << (i == 0 ? "[" : ", ") << *(numbers.data() + i);
        }
        return text.str() + "]";
    };
    for (const likelihoods::EvidenceTable& table : tables.tables) {
        std::string text = "format: steelyard.evidence-table/1\nfinding: " + table.finding + "\nunit: \"" +
                           table.unit + "\"\nedges: " + list(table.edges) + "\nleast: 1e-12\nrows:\n";
        for (const likelihoods::EvidenceRow& row : table.rows) {
            Eigen::ArrayXd shares =
                likelihoods::band_probabilities(tables, table, {row.cause}).col(0).pow(power);
            shares /= shares.sum();
            text += "  " + row.cause + ": {share: " + list(shares) + ", worth: 100, basis: memory}\n";
        }
        dir.write("powered/" + table.finding + ".yaml", text);
    }
    return dir.file("powered");
}

class CalibratedByConstruction : public ::testing::Test {
  protected:
    void SetUp() override {
        EXPECT_NEAR(patterns.joint.sum(), 1.0, 1e-12);
        EXPECT_EQ(tally.flow().diagnosed, patients);
    }

    /// What the program says of the million under tables and priors.
    nlohmann::json audited(const std::string& with_tables, const std::string& with_priors) {
        const std::string file = dir.file("million.tally");
        cli::save_tally(tally, file);
        const Outcome outcome = run({"audit", file, "--tables", with_tables, "--priors", with_priors, "--as",
                                     "json", "--replicates", "20", "--threads", "2"});
        EXPECT_EQ(outcome.code, 0) << outcome.err;
        return nlohmann::json::parse(outcome.out);
    }
    /// Scores within 4 standard errors of the exact expectation: by chance outside once in 16,000 times each.
    static void expect_scores(const nlohmann::json& audit, const Expected& expected) {
        const auto& scores = audit["figures"]["scores"];
        for (const auto& [name, law] :
             {std::pair("log_score", expected.log_score), {"brier", expected.brier}}) {
            EXPECT_NEAR(scores[name]["value"].get<double>(), law.mean,
                        4.0 * law.sd / std::sqrt(static_cast<double>(patients)))
                << name;
        }
    }

    WorkDir dir;
    likelihoods::TableSet tables = likelihoods::load_table_set(five);
    priors::PriorSet priors = priors::open_prior_set(clinic);
    Patterns patterns{tables, priors};
    cli::Tally tally = draw(tables, priors, patterns, 20261201);
};

TEST_F(CalibratedByConstruction, AMillionCasesHaveEverySlopeAndInterceptInsideItsInterval) {
    // For each cause an intercept, a slope and an intercept at slope 1, and one power for all. Each interval
    // leaves out the truth with a chance of 0.001 divided by their number, so that by Bonferroni's inequality
    // the chance that any does is at most 0.001, dependent as they are.
    const auto causes = priors.causes.size();
    cli::AuditAsked asked;
    asked.level = 1.0 - 0.001 / static_cast<double>(3 * causes + 1);
    asked.replicates = 20;
    const cli::Audit audit = cli::audit_of(tally, tables, priors, asked);
    ASSERT_TRUE(audit.figures);
    const auto holds = [](const std::optional<engine::IntervalEstimate>& interval, double truth) {
        return interval && interval->low <= truth && truth <= interval->high;
    };
    for (std::size_t k = 0; k < causes; ++k) {
        const engine::CauseCalibration& of = audit.figures->cause[k].calibration;
        EXPECT_TRUE(holds(of.intercept, 0.0)) << priors.causes[k].id << " " << of.intercept->value;
        EXPECT_TRUE(holds(of.slope, 1.0)) << priors.causes[k].id << " " << of.slope->value;
        EXPECT_TRUE(holds(of.in_the_large, 0.0)) << priors.causes[k].id;
        // Narrow enough to mean something: 2 % and less would show.
        EXPECT_LT(of.slope->high - of.slope->low, 0.08) << priors.causes[k].id;
    }
    EXPECT_TRUE(holds(audit.figures->temperature.exponent, 1.0));
}

TEST_F(CalibratedByConstruction, AMillionCasesScoreWhatListingEveryPatternExpects) {
    const Expected expected(patterns.joint, patterns.posterior());
    const nlohmann::json audit = audited(five, clinic);
    expect_scores(audit, expected);
    EXPECT_EQ(audit["verdict"]["word"], "fits");
    EXPECT_EQ(audit["flow"]["scored"], patients);
    for (const auto& cause : audit["verdict"]["causes"]) {
        EXPECT_EQ(cause["level"], "as_given") << cause;
        EXPECT_EQ(cause["strength"], "fits") << cause;
    }
}

TEST_F(CalibratedByConstruction, UnderAnotherPriorSetTheAuditSaysWhichCausesAreCommonerAndRarer) {
    const priors::PriorSet even = priors::open_prior_set("even");
    ASSERT_EQ(even.ids(), priors.ids());
    const Patterns as_if(tables, even);
    const Expected expected(patterns.joint, as_if.posterior());
    const nlohmann::json audit = audited(five, "even");
    expect_scores(audit, expected);
    EXPECT_NE(audit["verdict"]["word"], "fits");
    int told = 0;
    for (std::size_t k = 0; k < priors.causes.size(); ++k) {
        const double share = priors.causes[k].probability;
        const double given = expected.mean_given(static_cast<Eigen::Index>(k));
        if (std::abs(share - given) > 0.01) {
            EXPECT_EQ(audit["verdict"]["causes"][k]["level"], share > given ? "commoner" : "rarer")
                << priors.causes[k].id << ": " << share << ", given " << given;
            ++told;
        }
    }
    EXPECT_GE(told, 3);
}

TEST_F(CalibratedByConstruction, UnderTablesThatAreTooSharpTheAuditSaysTooSure) {
    const std::string sharp = with_power(tables, 1.3, dir);
    const Expected expected(patterns.joint, Patterns(likelihoods::load_table_set(sharp), priors).posterior());
    const nlohmann::json audit = audited(sharp, clinic);
    expect_scores(audit, expected);
    EXPECT_EQ(audit["verdict"]["word"], "too_sure");
    for (const auto& cause : audit["figures"]["causes"]) {
        EXPECT_LT(cause["slope"]["high"], 1.0) << cause["id"];
    }
}

TEST_F(CalibratedByConstruction, UnderTablesThatAreTooBluntTheAuditSaysTooCautious) {
    const std::string blunt = with_power(tables, 0.7, dir);
    const Expected expected(patterns.joint, Patterns(likelihoods::load_table_set(blunt), priors).posterior());
    const nlohmann::json audit = audited(blunt, clinic);
    expect_scores(audit, expected);
    EXPECT_EQ(audit["verdict"]["word"], "too_cautious");
    for (const auto& cause : audit["figures"]["causes"]) {
        EXPECT_GT(cause["slope"]["low"], 1.0) << cause["id"];
    }
}

}  // namespace
}  // namespace steelyard::test
