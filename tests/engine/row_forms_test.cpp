// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/row_forms.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <cmath>
#include <fstream>
#include <limits>
#include <sstream>
#include <string>
#include <variant>
#include <vector>

#include "expect_domain_error.hpp"
#include "near.hpp"
#include "reference_table.hpp"
#include "steelyard/engine/distributions.hpp"
#include "steelyard/engine/one_against_rest.hpp"

namespace {

using namespace steelyard::engine;  // the functions under test
using steelyard::test::expect_domain_error;
using steelyard::test::near_abs;
using steelyard::test::near_rel;
using steelyard::test::near_ulps;
using steelyard::test::ReferenceTable;

constexpr double nan = std::numeric_limits<double>::quiet_NaN();
constexpr double infinity = std::numeric_limits<double>::infinity();

Eigen::ArrayXd array(const std::vector<double>& values) {
    return Eigen::Map<const Eigen::ArrayXd>(values.data(), static_cast<Eigen::Index>(values.size()));
}

void expect_row(const Eigen::ArrayXd& row) {
    EXPECT_TRUE((row > 0.0).all() && (row <= 1.0).all()) << row.transpose();
    EXPECT_LE(std::abs(row.sum() - 1.0), static_cast<double>(row.size()) * 0x1p-52) << row.transpose();
}

/// A row of 2 to 8 shares made of RapidCheck's words, none very small.
Eigen::ArrayXd some_row(const std::vector<std::uint16_t>& words, Eigen::Index bands) {
    Eigen::ArrayXd row(bands);
    for (Eigen::Index i = 0; i < bands; ++i) {
        row(i) = 1.0 + (words.empty() ? 0.0 : words[static_cast<std::size_t>(i) % words.size()]);
    }
    return row / row.sum();
}

// ---- counts and shares ----

TEST(CountsRow, IsTheJeffreysPosteriorMean) {
    // (x + 1/2) / (n + B/2) by hand: 3, 0, 6 of 9 patients.
    const CompiledRow row = counts_row(array({3, 0, 6}));
    EXPECT_TRUE(near_ulps(3.5 / 10.5, row.probability(0), 1));
    EXPECT_TRUE(near_ulps(0.5 / 10.5, row.probability(1), 1));
    EXPECT_TRUE(near_ulps(6.5 / 10.5, row.probability(2), 1));
    EXPECT_TRUE((std::get<DirichletLaw>(row.law).alpha == array({3.5, 0.5, 6.5})).all());
    EXPECT_TRUE((counts_row(array({0, 0, 0, 0})).probability == 0.25).all());
    EXPECT_TRUE(near_ulps(0.8, counts_row(array({7, 1}), 1.0).probability(0), 1));
}

TEST(CountsRow, HoldsAtItsEnds) {
    expect_row(counts_row(array({1e12, 0}), 1e-6).probability);
    expect_row(counts_row(array({0, 0}), 1e12).probability);
}

TEST(ShareRow, HasMeanShareAndTotalWorth) {
    EXPECT_TRUE(
        rc::check([](const std::vector<std::uint16_t>& words, std::uint8_t size, std::uint16_t worth) {
            const Eigen::ArrayXd share = some_row(words, 2 + size % 7);
            const CompiledRow row = share_row(share, worth + 1.0);
            expect_row(row.probability);
            const Eigen::ArrayXd& alpha = std::get<DirichletLaw>(row.law).alpha;
            RC_ASSERT(near_rel(worth + 1.0, alpha.sum(), 1e-14));
            for (Eigen::Index i = 0; i < share.size(); ++i) {
                RC_ASSERT(near_rel(share(i), row.probability(i), 1e-14));
            }
        }));
}

TEST(ShareRow, NormalisesWhatRoundingLeft) {
    const CompiledRow row = share_row(array({0.333, 0.333, 0.333}), 30);
    EXPECT_TRUE(near_rel(1.0 / 3.0, row.probability(1), 1e-15));
    EXPECT_TRUE(near_rel(10.0, std::get<DirichletLaw>(row.law).alpha(1), 1e-15));
}

TEST(ShareRow, UpdatesAsBetaCounts) {
    // Beta posterior mean (p0 n0 + x) / (n0 + n): p0 0.9 worth 6 patients, then 7 of 7 -> 12.4 / 13 = 0.954.
    const CompiledRow before = share_row(array({0.9, 0.1}), 6);
    const Eigen::ArrayXd after = std::get<DirichletLaw>(before.law).alpha + array({7, 0});
    EXPECT_TRUE(near_rel(12.4 / 13.0, after(0) / after.sum(), 1e-15));
    EXPECT_TRUE(near_abs(0.954, after(0) / after.sum(), 5e-4));
}

// ---- summaries ----

struct SummaryInput {
    double mean = 0.0, sd = 0.0, n = 0.0;
    Scale scale = Scale::linear;
    std::vector<double> edges;
};

std::vector<std::pair<std::string, SummaryInput>> summary_inputs() {
    std::ifstream in(std::string(STEELYARD_TEST_DIR) + "/reference/student_rows_inputs.csv");
    std::vector<std::pair<std::string, SummaryInput>> inputs;
    bool header = true;
    for (std::string line; std::getline(in, line);) {
        if (line.front() == '#') {
            continue;
        }
        if (header) {
            header = false;
            continue;
        }
        std::stringstream cells(line);
        std::string name, mean, sd, n, scale, edges;
        std::getline(cells, name, ',');
        std::getline(cells, mean, ',');
        std::getline(cells, sd, ',');
        std::getline(cells, n, ',');
        std::getline(cells, scale, ',');
        std::getline(cells, edges);
        SummaryInput input{
            std::stod(mean), std::stod(sd), std::stod(n), scale == "log" ? Scale::log : Scale::linear, {}};
        std::stringstream split(edges);
        for (std::string edge; split >> edge;) {
            input.edges.push_back(std::stod(edge));
        }
        inputs.emplace_back(name, input);
    }
    return inputs;
}

TEST(SummaryRow, AgreesWithMpmathToTwelveDigitsThirtyScalesOut) {
    const ReferenceTable table("student_rows.csv");
    double least = 1.0;
    for (const auto& [name, in] : summary_inputs()) {
        const CompiledRow row = summary_row(in.mean, in.sd, in.n, in.scale, array(in.edges));
        for (Eigen::Index band = 0; band < row.probability.size(); ++band) {
            const std::string quantity = "band[" + std::to_string(band) + "]";
            EXPECT_TRUE(table.matches(name, quantity, row.probability(band)));
            // The table's own rule has an absolute part; the claim is relative, down to 1e-92.
            EXPECT_TRUE(near_rel(table.value(name, quantity), row.probability(band), 1e-12))
                << name << " " << quantity;
            least = std::min(least, table.value(name, quantity));
        }
        expect_row(row.probability);
    }
    EXPECT_TRUE(table.unused().empty());
    EXPECT_LT(least, 1e-90);
}

TEST(SummaryRow, HasThePredictiveScale) {
    // sd = sem sqrt(n) = 5.7 sqrt(8) = 16.12; scale sd sqrt(1 + 1/8) = 17.10: one scale above the mean leaves
    // P(T7 > 1).
    const double sd = 5.7 * std::sqrt(8.0);
    EXPECT_TRUE(near_abs(16.12, sd, 5e-3));
    const double scale = sd * std::sqrt(1.125);
    EXPECT_TRUE(near_abs(17.10, scale, 5e-3));
    const CompiledRow row = summary_row(0.0, sd, 8, Scale::linear, array({scale}));
    EXPECT_TRUE(near_rel(student_t_upper(1.0, 7.0), row.probability(1), 1e-14));
}

TEST(SummaryRow, IsMirroredWithItsEdges) {
    for (const double n : {2.0, 9.0, 150.0}) {
        const CompiledRow right = summary_row(1.5, 0.7, n, Scale::linear, array({-3, 1, 1.5, 4, 22}));
        const CompiledRow left = summary_row(-1.5, 0.7, n, Scale::linear, array({-22, -4, -1.5, -1, 3}));
        EXPECT_TRUE((right.probability == left.probability.reverse()).all());
    }
}

TEST(SummaryRow, DoesNotDependOnTheUnit) {
    const Eigen::ArrayXd edges = array({0.25, 1, 2, 64});
    const Eigen::ArrayXd one = summary_row(1.5, 0.75, 12, Scale::linear, edges).probability;
    const Eigen::ArrayXd other =
        summary_row(1.5 * 1024, 0.75 * 1024, 12, Scale::linear, edges * 1024.0).probability;
    EXPECT_TRUE((one == other).all());
}

TEST(SummaryRow, TendsToTheNormalLawForManyPatients) {
    const Eigen::ArrayXd row = summary_row(0.0, 1.0, 1e12, Scale::linear, array({-1.96, 1.96})).probability;
    EXPECT_TRUE(near_rel(normal_lower(-1.96), row(0), 1e-10));
    EXPECT_TRUE(near_rel(normal_upper(1.96), row(2), 1e-10));
}

TEST(SummaryRow, OnTheLogScaleIsTheLinearRowOfLogarithms) {
    const CompiledRow log_row = summary_row(0.5, 0.3, 14, Scale::log, array({0.25, 2, 16}));
    const CompiledRow linear = summary_row(0.5, 0.3, 14, Scale::linear, array({0.25, 2, 16}).log());
    for (Eigen::Index band = 0; band < 4; ++band) {
        EXPECT_TRUE(near_rel(linear.probability(band), log_row.probability(band), 1e-13));
    }
    const SummaryLaw& law = std::get<SummaryLaw>(log_row.law);
    EXPECT_EQ(law.scale, Scale::log);
    EXPECT_TRUE((law.edges == array({0.25, 2, 16})).all());
}

// ---- ratios ----

TEST(RatioRow, MultipliesTheReferenceAndReportsTheMiss) {
    const RatioRow got = ratio_row(array({2, 0.5}), array({0.1, 0}), array({0.4, 0.6}), 0.2);
    EXPECT_TRUE(near_rel(0.1, got.miss, 1e-14));
    EXPECT_TRUE(near_rel(0.8 / 1.1, got.row.probability(0), 1e-15));
    EXPECT_TRUE(near_rel(0.3 / 1.1, got.row.probability(1), 1e-15));
    const RatioLaw& law = std::get<RatioLaw>(got.row.law);
    EXPECT_TRUE((law.log_ratio == array({2, 0.5}).log()).all());
    EXPECT_TRUE((law.log_sd == array({0.1, 0})).all());
}

TEST(RatioRow, UndoesPairRatio) {
    EXPECT_TRUE(rc::check([](const std::vector<std::uint16_t>& one, const std::vector<std::uint16_t>& other,
                             std::uint8_t size) {
        Eigen::ArrayXXd rows(2 + size % 7, 2);
        rows.col(0) = some_row(one, rows.rows());
        rows.col(1) = some_row(other, rows.rows());
        const Eigen::ArrayXd ratio = pair_ratio(rows, CauseIndex{0}, CauseIndex{1});
        const RatioRow back = ratio_row(ratio, Eigen::ArrayXd::Zero(rows.rows()), rows.col(1), 1e-12);
        for (Eigen::Index band = 0; band < rows.rows(); ++band) {
            RC_ASSERT(near_rel(rows(band, 0), back.row.probability(band), 1e-14));
        }
    }));
}

/// P(band | cause) of three causes over B bands, and a study mix.
Eigen::ArrayXXd three_causes(Eigen::Index bands) {
    Eigen::ArrayXXd rows(bands, 3);
    for (Eigen::Index band = 0; band < bands; ++band) {
        const double x = static_cast<double>(band) + 1.0;
        rows(band, 0) = 1.0 / x;
        rows(band, 1) = x * x;
        rows(band, 2) = 1.0 + (band % 2 == 0 ? 2.0 : 0.0);
    }
    return rows.rowwise() / rows.colwise().sum();
}

TEST(SolveRatioToRest, UndoesRatioToRest) {
    const Eigen::ArrayXd mix = array({0.5, 0.3, 0.2});
    for (const Eigen::Index bands : {2, 3}) {
        const Eigen::ArrayXXd rows = three_causes(bands);
        const RestSolution got = solve_ratio_to_rest(ratio_to_rest(rows, mix), mix);
        EXPECT_TRUE(got.scale_is_unique);
        EXPECT_LE((got.probability - rows).abs().maxCoeff(), 1e-13);
        EXPECT_LE(got.incoherence.maxCoeff(), 1e-14);
        EXPECT_LE(got.column_miss.abs().maxCoeff(), 1e-13);
        EXPECT_LE((got.study_share - (rows.matrix() * mix.matrix()).array()).abs().maxCoeff(), 1e-13);
        for (Eigen::Index cause = 0; cause < 3; ++cause) {
            expect_row(got.probability.col(cause));
        }
    }
}

TEST(SolveRatioToRest, KeepsEveryRatioBetweenCausesWhenTheScaleIsOpen) {
    const Eigen::ArrayXd mix = array({0.5, 0.3, 0.2});
    const Eigen::ArrayXXd rows = three_causes(6);  // six bands, three causes: three bands' scales are open
    const RestSolution got = solve_ratio_to_rest(ratio_to_rest(rows, mix), mix);
    EXPECT_FALSE(got.scale_is_unique);
    EXPECT_LE(got.column_miss.abs().maxCoeff(), 1e-13);
    for (Eigen::Index other : {1, 2}) {
        const Eigen::ArrayXd want = pair_ratio(rows, CauseIndex{0}, CauseIndex{other});
        const Eigen::ArrayXd found = pair_ratio(got.probability, CauseIndex{0}, CauseIndex{other});
        EXPECT_LE((found / want - 1.0).abs().maxCoeff(), 1e-12);
    }
}

TEST(SolveRatioToRest, ReportsWhatRoundingTookAway) {
    const Eigen::ArrayXd mix = array({0.5, 0.3, 0.2});
    const Eigen::ArrayXXd rounded = (ratio_to_rest(three_causes(3), mix) * 100.0).round() / 100.0;
    const RestSolution got = solve_ratio_to_rest(rounded, mix);
    EXPECT_GT(got.incoherence.maxCoeff(), 1e-4);
    EXPECT_LT(got.incoherence.maxCoeff(), 0.02);
    EXPECT_LE((got.probability - three_causes(3)).abs().maxCoeff(), 0.02);
    EXPECT_TRUE(((got.band_sum - 1.0).abs() == got.incoherence).all());
    EXPECT_LE((got.band_sum - band_sum(rounded, mix)).abs().maxCoeff(), 1e-15);
}

TEST(KeepAtLeast, RaisesAndNormalisesOnlyWhatIsBelow) {
    const BoundedRow untouched = keep_at_least(array({0.01, 0.99}), 0.005);
    EXPECT_FALSE(untouched.acted);
    EXPECT_TRUE((untouched.probability == array({0.01, 0.99})).all());
    EXPECT_FALSE(keep_at_least(array({0.005, 0.995}), 0.005).acted);
    const BoundedRow raised = keep_at_least(array({0.0, 0.001, 0.999}), 0.005);
    EXPECT_TRUE(raised.acted);
    EXPECT_TRUE(near_rel(0.005 / 1.009, raised.probability(0), 1e-15));
    EXPECT_TRUE(near_rel(0.005 / 1.009, raised.probability(1), 1e-15));
    EXPECT_TRUE(near_rel(0.999 / 1.009, raised.probability(2), 1e-15));
    EXPECT_FALSE(keep_at_least(array({0.0, 1.0}), 0.0).acted);
}

// ---- errors: type, fields and message for every argument ----

TEST(CountsRow, RefusesBadArguments) {
    expect_domain_error([] { counts_row(array({4})); }, "counts_row", "counts size", {}, 1, "at least 2");
    for (const double bad : {-1.0, nan, infinity, 1e13}) {
        expect_domain_error(
            [&] {
                counts_row(array({1, bad}));
            },
            "counts_row", "counts", {1, {}}, bad, "between 0 and 1e+12");
    }
    for (const double bad : {0.0, -0.5, nan, infinity}) {
        expect_domain_error(
            [&] {
                counts_row(array({1, 2}), bad);
            },
            "counts_row", "start", {}, bad, "between 1e-06 and 1e+12");
    }
}

TEST(ShareRow, RefusesBadArguments) {
    expect_domain_error([] { share_row(array({1}), 20); }, "share_row", "share size", {}, 1, "at least 2");
    for (const double bad : {0.0, 1e-7, -0.1, 1.0, 0.9999999, nan, infinity}) {
        expect_domain_error(
            [&] {
                share_row(array({bad, 0.5}), 20);
            },
            "share_row", "share", {0, {}}, bad, "between 1e-06 and 0.999999");
    }
    expect_domain_error(
        [] {
            share_row(array({0.5, 0.43}), 20);
        },
        "share_row", "share sum", {}, 0.93, "1 within 0.005");
    for (const double bad : {0.0, -1.0, nan, infinity}) {
        expect_domain_error(
            [&] {
                share_row(array({0.5, 0.5}), bad);
            },
            "share_row", "worth", {}, bad, "between 1e-06 and 1e+12");
    }
}

TEST(SummaryRow, RefusesBadArguments) {
    const Eigen::ArrayXd edges = array({1, 2});
    for (const double bad : {nan, infinity, -infinity}) {
        expect_domain_error([&] { summary_row(bad, 1, 5, Scale::linear, edges); }, "summary_row", "mean", {},
                            bad, "finite");
    }
    for (const double bad : {0.0, -1.0, nan, infinity}) {
        expect_domain_error([&] { summary_row(0, bad, 5, Scale::linear, edges); }, "summary_row", "sd", {},
                            bad, "finite and > 0");
    }
    for (const double bad : {1.0, 1.99, nan, infinity}) {
        expect_domain_error([&] { summary_row(0, 1, bad, Scale::linear, edges); }, "summary_row", "n", {},
                            bad, "between 2 and 1e+12");
    }
    expect_domain_error([] { summary_row(0, 1, 5, Scale::linear, Eigen::ArrayXd()); }, "summary_row",
                        "edges size", {}, 0, "at least 1");
    for (const double bad : {nan, infinity, -infinity}) {
        expect_domain_error(
            [&] {
                summary_row(0, 1, 5, Scale::linear, array({0, bad}));
            },
            "summary_row", "edges", {1, {}}, bad, "finite");
    }
    for (const double bad : {0.0, -1.0, nan, infinity}) {
        expect_domain_error(
            [&] {
                summary_row(0, 1, 5, Scale::log, array({bad, 2}));
            },
            "summary_row", "edges", {0, {}}, bad, "finite and > 0 on the log scale");
    }
    for (const double bad : {1.0, 0.5}) {
        expect_domain_error(
            [&] {
                summary_row(0, 1, 5, Scale::linear, array({1, bad}));
            },
            "summary_row", "edges", {1, {}}, bad, "greater than the edge before it");
    }
    expect_domain_error(
        [] {
            summary_row(0, 1, 1e6, Scale::linear, array({1, 60}));
        },
        "summary_row", "band probability", {2, {}}, 0, ">= 1e-300");
}

TEST(RatioRow, RefusesBadArguments) {
    const Eigen::ArrayXd ratio = array({2, 0.5}), sd = array({0, 0}), reference = array({1.0 / 3, 2.0 / 3});
    expect_domain_error([&] { ratio_row(array({1}), sd, reference, 0.1); }, "ratio_row", "ratio size", {}, 1,
                        "at least 2");
    expect_domain_error([&] { ratio_row(ratio, array({0}), reference, 0.1); }, "ratio_row", "log_sd size", {},
                        1, "2");
    expect_domain_error([&] { ratio_row(ratio, sd, array({1}), 0.1); }, "ratio_row", "reference size", {}, 1,
                        "2");
    for (const double bad : {0.0, -1.0, nan, infinity}) {
        expect_domain_error(
            [&] {
                ratio_row(array({2, bad}), sd, reference, 0.1);
            },
            "ratio_row", "ratio", {1, {}}, bad, "finite and > 0");
    }
    for (const double bad : {-0.1, nan, infinity}) {
        expect_domain_error(
            [&] {
                ratio_row(ratio, array({0, bad}), reference, 0.1);
            },
            "ratio_row", "log_sd", {1, {}}, bad, "finite and >= 0");
    }
    for (const double bad : {0.0, -0.1, 1.1, nan}) {
        expect_domain_error(
            [&] {
                ratio_row(ratio, sd, array({0.5, bad}), 0.1);
            },
            "ratio_row", "reference", {1, {}}, bad, "> 0 and <= 1");
    }
    expect_domain_error(
        [&] {
            ratio_row(ratio, sd, array({0.5, 0.25}), 0.5);
        },
        "ratio_row", "reference sum", {}, 0.75, "1 within 1e-06");
    for (const double bad : {-0.1, 1.1, nan}) {
        expect_domain_error([&] { ratio_row(ratio, sd, reference, bad); }, "ratio_row", "tolerance", {}, bad,
                            "between 0 and 1");
    }
    expect_domain_error(
        [&] {
            ratio_row(array({3, 0.5}), sd, array({0.5, 0.5}), 0.1);
        },
        "ratio_row", "sum of ratio * reference", {}, 1.75, "1 within the tolerance");
    expect_domain_error(
        [&] {
            ratio_row(array({1e-305, 2}), sd, array({0.5, 0.5}), 0.1);
        },
        "ratio_row", "band probability", {0, {}}, 5e-306, ">= 1e-300");
}

TEST(SolveRatioToRest, RefusesBadArguments) {
    const Eigen::ArrayXd mix = array({0.5, 0.5});
    const Eigen::ArrayXXd ratio = Eigen::ArrayXXd::Ones(3, 2);
    expect_domain_error([&] { solve_ratio_to_rest(Eigen::ArrayXXd::Ones(1, 2), mix); }, "solve_ratio_to_rest",
                        "ratio rows size", {}, 1, "at least 2");
    expect_domain_error([&] { solve_ratio_to_rest(Eigen::ArrayXXd::Ones(3, 1), mix); }, "solve_ratio_to_rest",
                        "ratio columns size", {}, 1, "at least 2");
    expect_domain_error(
        [&] {
            solve_ratio_to_rest(ratio, array({0.2, 0.3, 0.5}));
        },
        "solve_ratio_to_rest", "study_mix size", {}, 3, "2");
    for (const double bad : {0.0, 1.0, -0.1, nan}) {
        expect_domain_error(
            [&] {
                solve_ratio_to_rest(ratio, array({0.5, bad}));
            },
            "solve_ratio_to_rest", "study_mix", {1, {}}, bad, "> 0 and < 1");
    }
    expect_domain_error(
        [&] {
            solve_ratio_to_rest(ratio, array({0.5, 0.25}));
        },
        "solve_ratio_to_rest", "study_mix sum", {}, 0.75, "1 within 1e-06");
    for (const double bad : {0.0, -1.0, nan, infinity}) {
        Eigen::ArrayXXd wrong = ratio;
        wrong(2, 1) = bad;
        expect_domain_error([&] { solve_ratio_to_rest(wrong, mix); }, "solve_ratio_to_rest", "ratio", {2, 1},
                            bad, "finite and > 0");
    }
}

TEST(SolveRatioToRest, RefusesRatiosThatNoStudyCanHaveGiven) {
    // Both bands more likely with cause 1 than without it, and the reverse for cause 2, by unequal factors.
    Eigen::ArrayXXd ratio(2, 2);
    ratio << 4.0, 0.25, 1.1, 0.9;
    try {
        solve_ratio_to_rest(ratio, array({0.5, 0.5}));
        FAIL() << "solved";
    } catch (const DomainError& error) {
        EXPECT_EQ(error.function(), "solve_ratio_to_rest");
        EXPECT_EQ(error.argument(), "share of the study in band");
        EXPECT_EQ(error.row(), 0);
        EXPECT_LE(error.value(), 0.0);
        EXPECT_EQ(error.requirement(), "> 0: no study can have given these ratios");
    }
}

TEST(KeepAtLeast, RefusesBadArguments) {
    expect_domain_error([] { keep_at_least(array({1}), 0.005); }, "keep_at_least", "probability size", {}, 1,
                        "at least 2");
    for (const double bad : {-0.1, nan, infinity}) {
        expect_domain_error(
            [&] {
                keep_at_least(array({0.5, bad}), 0.005);
            },
            "keep_at_least", "probability", {1, {}}, bad, "finite and >= 0");
    }
    expect_domain_error(
        [] {
            keep_at_least(array({0.5, 0.25}), 0.005);
        },
        "keep_at_least", "probability sum", {}, 0.75, "1 within 1e-06");
    for (const double bad : {-0.1, 0.3, nan}) {
        expect_domain_error(
            [&] {
                keep_at_least(array({0.5, 0.5}), bad);
            },
            "keep_at_least", "least", {}, bad, "between 0 and 0.2");
    }
}

}  // namespace
