// SPDX-License-Identifier: Apache-2.0
// tests/reference/prior_range.csv: every row is compared. Its inputs are in prior_range_inputs.json.
#include "steelyard/engine/prior_range.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <nlohmann/json.hpp>
#include <numeric>
#include <optional>
#include <random>
#include <string>
#include <vector>

#include "expect_domain_error.hpp"
#include "near.hpp"
#include "reference_inputs.hpp"
#include "reference_table.hpp"
#include "steelyard/engine/log_math.hpp"
#include "steelyard/engine/posterior.hpp"

namespace {

using namespace steelyard::engine;
using nlohmann::json;
using steelyard::test::expect_domain_error;
using steelyard::test::near_abs;
using steelyard::test::near_rel;
using steelyard::test::number;
using steelyard::test::numbers;
using steelyard::test::reference_json;
using steelyard::test::ReferenceTable;

constexpr double nan = std::numeric_limits<double>::quiet_NaN();
constexpr double infinity = std::numeric_limits<double>::infinity();

Eigen::ArrayXd array(const std::vector<double>& values) {
    return Eigen::Map<const Eigen::ArrayXd>(values.data(), static_cast<Eigen::Index>(values.size()));
}

/// Posterior of weights that may be 0, by the definition.
Eigen::ArrayXd after(const Eigen::ArrayXd& prior, const Eigen::ArrayXd& log_likelihood) {
    const Eigen::ArrayXd weight = prior * (log_likelihood - log_likelihood.maxCoeff()).exp();
    return weight / weight.sum();
}

void expect_range(const ReferenceTable& table, const std::string& id, const std::string& tag,
                  const PosteriorRange& range) {
    for (Eigen::Index k = 0; k < range.low.size(); ++k) {
        const std::string place = "[" + tag + std::to_string(k) + "]";
        EXPECT_TRUE(table.matches(id, "lower" + place, range.low(k)));
        EXPECT_TRUE(table.matches(id, "upper" + place, range.high(k)));
    }
}

TEST(PriorRange, AgreesWithTheReferenceTable) {
    const ReferenceTable table("prior_range.csv");
    const json inputs = reference_json("prior_range_inputs.json");
    for (const json& c : inputs["interval_priors_probability"]) {
        expect_range(
            table, c["id"], "",
            range_of_probabilities(numbers(c["lo"]), numbers(c["hi"]), numbers(c["likelihood"]).log()));
    }
    for (const json& c : inputs["interval_priors_weights"]) {
        expect_range(table, c["id"], "",
                     range_of_weights(numbers(c["lo"]), numbers(c["hi"]), numbers(c["likelihood"]).log()));
    }
    for (const json& c : inputs["epsilon_contamination"]) {
        for (const json& epsilon : c["epsilon"]) {
            expect_range(table, c["id"], "eps=" + epsilon.get<std::string>() + "; ",
                         range_of_contamination(numbers(c["prior"]).log(), number(epsilon),
                                                numbers(c["likelihood"]).log()));
        }
    }
    EXPECT_EQ(table.unused(), std::vector<std::string>{});
}

/// Limits about a random prior that lies within them, so that they can be met; some are points, some whole.
struct Problem {
    Eigen::ArrayXd low, high, log_likelihood;
};

Problem random_problem(std::mt19937& random) {
    std::uniform_real_distribution<double> uniform(0.0, 1.0);
    const auto causes = static_cast<Eigen::Index>(2 + random() % 5);
    const auto draw = [&](double from, double to) -> Eigen::ArrayXd {
        return Eigen::ArrayXd::NullaryExpr(causes, [&] { return from + (to - from) * uniform(random); });
    };
    Eigen::ArrayXd prior = draw(0.01, 1.0);
    prior /= prior.sum();
    Problem p{prior * draw(0.0, 1.0), prior + (1.0 - prior) * draw(0.0, 0.6), draw(-8.0, 0.0)};
    for (Eigen::Index k = 0; k < causes; ++k) {
        const auto kind = random() % 8;
        if (kind == 0) {
            p.low(k) = p.high(k) = prior(k);
        } else if (kind == 1) {
            p.low(k) = 0.0;
        } else if (kind == 2) {
            p.high(k) = 1.0;
        }
    }
    return p;
}

/// A prior within the limits: causes in random order, each anywhere the rest leaves it, or at an end of that.
Eigen::ArrayXd random_prior(const Problem& p, std::mt19937& random) {
    std::uniform_real_distribution<double> uniform(0.0, 1.0);
    std::vector<Eigen::Index> order(static_cast<std::size_t>(p.low.size()));
    std::iota(order.begin(), order.end(), Eigen::Index{0});
    std::shuffle(order.begin(), order.end(), random);
    double left = 1.0;
    double low_left = p.low.sum();
    double high_left = p.high.sum();
    Eigen::ArrayXd prior(p.low.size());
    for (const Eigen::Index k : order) {
        low_left -= p.low(k);
        high_left -= p.high(k);
        const double from = std::max(p.low(k), left - high_left);
        const double to = std::max(from, std::min(p.high(k), left - low_left));
        const auto kind = random() % 6;
        prior(k) = kind == 0 ? from : kind == 1 ? to : from + (to - from) * uniform(random);
        left -= prior(k);
    }
    return prior;
}

TEST(RangeOfProbabilities, HoldsEveryPriorWithinTheLimits) {
    std::mt19937 random(20260101);
    const int problems = 200;
    const int priors = 500;  // 100,000 in all
    for (int i = 0; i < problems; ++i) {
        const Problem p = random_problem(random);
        const PosteriorRange range = range_of_probabilities(p.low, p.high, p.log_likelihood);
        for (int j = 0; j < priors; ++j) {
            const Eigen::ArrayXd prior = random_prior(p, random);
            ASSERT_TRUE(near_abs(1.0, prior.sum(), 1e-12));
            const Eigen::ArrayXd posterior = after(prior, p.log_likelihood);
            ASSERT_LE((range.low - posterior).maxCoeff(), 1e-12) << "problem " << i << " prior " << j;
            ASSERT_LE((posterior - range.high).maxCoeff(), 1e-12) << "problem " << i << " prior " << j;
        }
    }
}

/// The corners lie within the limits, sum to 1, and give the ends when they are put back.
void expect_attained(const Problem& p, const PosteriorRange& range) {
    for (Eigen::Index k = 0; k < p.low.size(); ++k) {
        for (const bool lower : {true, false}) {
            const Eigen::ArrayXd corner = lower ? range.low_at.col(k) : range.high_at.col(k);
            const double end = lower ? range.low(k) : range.high(k);
            EXPECT_TRUE(near_abs(1.0, corner.sum(), 1e-12));
            EXPECT_LE((p.low - corner).maxCoeff(), 1e-15);
            EXPECT_LE((corner - p.high).maxCoeff(), 1e-15);
            EXPECT_TRUE(near_rel(after(corner, p.log_likelihood)(k), end, 1e-12));
            if (corner.minCoeff() > 0.0) {
                const Eigen::ArrayXd put_back =
                    posterior(corner.log(), p.log_likelihood.transpose(), Eigen::ArrayXd::Ones(1));
                EXPECT_TRUE(near_rel(put_back(k), end, 1e-12));
            }
        }
    }
}

TEST(RangeOfProbabilities, IsAttainedAtItsCorners) {
    std::mt19937 random(20260102);
    for (int i = 0; i < 1000; ++i) {
        const Problem p = random_problem(random);
        expect_attained(p, range_of_probabilities(p.low, p.high, p.log_likelihood));
    }
}

TEST(RangeOfProbabilities, OfPointsIsThePosterior) {
    // 0.1 + 0.2 + 0.7 is a little under 1 in binary: a prior typed in decimals is one all the same.
    const Eigen::ArrayXd prior = array({0.1, 0.2, 0.7});
    const Eigen::ArrayXd log_likelihood = array({-1.0, -2.0, -3.0});
    const PosteriorRange range = range_of_probabilities(prior, prior, log_likelihood);
    for (Eigen::Index k = 0; k < 3; ++k) {
        EXPECT_TRUE(near_rel(after(prior, log_likelihood)(k), range.low(k), 1e-14));
        EXPECT_TRUE(near_rel(after(prior, log_likelihood)(k), range.high(k), 1e-14));
    }
}

TEST(RangeOfProbabilities, IsZeroToOneWhenNothingIsKnown) {
    const PosteriorRange range = range_of_probabilities(Eigen::ArrayXd::Zero(3), Eigen::ArrayXd::Ones(3),
                                                        array({-1.0, -700.0, -3000.0}));
    EXPECT_TRUE((range.low == 0.0).all());
    EXPECT_TRUE((range.high == 1.0).all());
}

TEST(RangeOfProbabilities, GivesNoRemainderOfRoundingToACauseOfLimitZero) {
    // 1 - 0.7 - 0.2 - 0.1 is 3e-17 in binary. Given to the third cause, e^60 times as likely, it would lead.
    const Eigen::ArrayXd low = array({0.7, 0.2, 0.0, 0.1});
    const Eigen::ArrayXd high = array({0.7, 0.2, 0.5, 0.1});
    const Eigen::ArrayXd log_likelihood = array({-60.0, -60.0, 0.0, -60.0});
    const PosteriorRange range = range_of_probabilities(low, high, log_likelihood);
    EXPECT_EQ(range.low_at(2, 0), 0.0);
    EXPECT_EQ(range.high(2), 0.0);
    EXPECT_TRUE(near_rel(0.7, range.low(0), 1e-14));
    EXPECT_TRUE(near_rel(0.7, range.high(0), 1e-14));
}

TEST(RangeOfProbabilities, DoesNotUnderflow) {
    const Eigen::ArrayXd low = array({0.3, 0.2, 0.1});
    const Eigen::ArrayXd high = array({0.6, 0.5, 0.3});
    const Eigen::ArrayXd near = array({0.02, 0.18, 0.21}).log();
    const PosteriorRange here = range_of_probabilities(low, high, near);
    const PosteriorRange there = range_of_probabilities(low, high, near - 20000.0);
    for (Eigen::Index k = 0; k < 3; ++k) {
        EXPECT_TRUE(near_rel(here.low(k), there.low(k), 1e-11));
        EXPECT_TRUE(near_rel(here.high(k), there.high(k), 1e-11));
    }
}

TEST(Tightened, LeavesOnlyWhatCanBeReached) {
    const ProbabilityLimits limits = tightened(array({0.0, 0.3, 0.2}), array({1.0, 0.4, 0.3}));
    // By hand: the first is at least 1 - 0.4 - 0.3 and at most 1 - 0.3 - 0.2; the others reach their limits.
    EXPECT_TRUE(near_rel(0.3, limits.low(0), 1e-15));
    EXPECT_TRUE(near_rel(0.5, limits.high(0), 1e-15));
    EXPECT_EQ(limits.low(1), 0.3);
    EXPECT_EQ(limits.high(1), 0.4);
    EXPECT_EQ(limits.low(2), 0.2);
    EXPECT_EQ(limits.high(2), 0.3);
}

TEST(Tightened, AgreesWithTheCornersOfTheRange) {
    std::mt19937 random(20260103);
    for (int i = 0; i < 1000; ++i) {
        const Problem p = random_problem(random);
        const ProbabilityLimits limits = tightened(p.low, p.high);
        const PosteriorRange range = range_of_probabilities(p.low, p.high, p.log_likelihood);
        EXPECT_TRUE((limits.low == range.low_at.matrix().diagonal().array()).all());
        EXPECT_TRUE((limits.high == range.high_at.matrix().diagonal().array()).all());
        const Eigen::ArrayXd prior = random_prior(p, random);
        EXPECT_LE((limits.low - prior).maxCoeff(), 1e-15 * 8);
        EXPECT_LE((prior - limits.high).maxCoeff(), 1e-15 * 8);
        const ProbabilityLimits again = tightened(limits.low, limits.high);
        EXPECT_LE((again.low - limits.low).abs().maxCoeff(), 1e-14);
        EXPECT_LE((again.high - limits.high).abs().maxCoeff(), 1e-14);
    }
}

TEST(RangeOfWeights, HoldsEveryWeightAndIsAttained) {
    std::mt19937 random(20260104);
    std::uniform_real_distribution<double> uniform(0.0, 1.0);
    for (int i = 0; i < 1000; ++i) {
        const Problem p = random_problem(random);
        const double scale = std::exp(20.0 * uniform(random) - 10.0);
        const PosteriorRange range = range_of_weights(p.low * scale, p.high * scale, p.log_likelihood);
        for (int j = 0; j < 100; ++j) {
            const Eigen::ArrayXd weight =
                scale * (p.low + (p.high - p.low) * Eigen::ArrayXd::NullaryExpr(
                                                        p.low.size(), [&] { return uniform(random); }));
            const Eigen::ArrayXd posterior = after(weight, p.log_likelihood);
            ASSERT_LE((range.low - posterior).maxCoeff(), 1e-12);
            ASSERT_LE((posterior - range.high).maxCoeff(), 1e-12);
        }
        for (Eigen::Index k = 0; k < p.low.size(); ++k) {
            EXPECT_TRUE(near_rel(after(range.low_at.col(k), p.log_likelihood)(k), range.low(k), 1e-12));
            EXPECT_TRUE(near_rel(after(range.high_at.col(k), p.log_likelihood)(k), range.high(k), 1e-12));
        }
    }
}

TEST(RangeOfContamination, HoldsEveryContaminationAndIsAttained) {
    std::mt19937 random(20260105);
    std::uniform_real_distribution<double> uniform(0.0, 1.0);
    for (int i = 0; i < 1000; ++i) {
        const Problem p = random_problem(random);
        const Eigen::ArrayXd prior = random_prior(p, random).max(1e-6);
        const double epsilon = uniform(random);
        const PosteriorRange range = range_of_contamination(prior.log(), epsilon, p.log_likelihood);
        for (int j = 0; j < 100; ++j) {
            Eigen::ArrayXd q =
                Eigen::ArrayXd::NullaryExpr(prior.size(), [&] { return std::pow(uniform(random), 8.0); });
            q /= q.sum();
            const Eigen::ArrayXd posterior =
                after((1.0 - epsilon) * prior / prior.sum() + epsilon * q, p.log_likelihood);
            ASSERT_LE((range.low - posterior).maxCoeff(), 1e-12);
            ASSERT_LE((posterior - range.high).maxCoeff(), 1e-12);
        }
        for (Eigen::Index k = 0; k < prior.size(); ++k) {
            EXPECT_TRUE(near_abs(1.0, range.low_at.col(k).sum(), 1e-14));
            EXPECT_TRUE(near_rel(after(range.low_at.col(k), p.log_likelihood)(k), range.low(k), 1e-12));
            EXPECT_TRUE(near_rel(after(range.high_at.col(k), p.log_likelihood)(k), range.high(k), 1e-12));
        }
    }
}

TEST(PriorRange, RefusesWhatCannotBe) {
    const std::optional<Eigen::Index> none;
    const Eigen::ArrayXd even = array({0.0, 0.0});
    expect_domain_error(
        [&] {
            (void)range_of_probabilities(array({0.6, 0.5}), array({0.7, 0.7}), even);
        },
        "range_of_probabilities", "sum of low", {}, 1.1, "at most 1");
    expect_domain_error(
        [&] {
            (void)range_of_probabilities(array({0.1, 0.1}), array({0.4, 0.5}), even);
        },
        "range_of_probabilities", "sum of high", {}, 0.9, "at least 1");
    expect_domain_error(
        [&] {
            (void)tightened(array({0.6, 0.5}), array({0.7, 0.7}));
        },
        "tightened", "sum of low", {}, 1.1, "at most 1");
    expect_domain_error(
        [&] {
            (void)tightened(array({0.4, 0.1}), array({0.3, 0.9}));
        },
        "tightened", "high", {0, none}, 0.3, "at least low");
    expect_domain_error(
        [&] {
            (void)tightened(array({0.4, 0.1}), array({1.1, 0.9}));
        },
        "tightened", "high", {0, none}, 1.1, "between 0 and 1");
    expect_domain_error(
        [&] {
            (void)tightened(array({-0.1, 0.1}), array({0.5, 0.9}));
        },
        "tightened", "low", {0, none}, -0.1, "between 0 and 1");
    expect_domain_error([&] { (void)tightened(array({0.5}), array({1.0})); }, "tightened", "low size", {}, 1,
                        "at least 2");
    expect_domain_error([&] { (void)tightened(even, array({1.0})); }, "tightened", "high size", {}, 1, "2");
    expect_domain_error(
        [&] {
            (void)range_of_probabilities(even, array({1.0, 1.0}), array({0.0, nan}));
        },
        "range_of_probabilities", "log_likelihood", {1, none}, nan, "finite");
    expect_domain_error(
        [&] {
            (void)range_of_weights(even, array({1.0, 0.0}), even);
        },
        "range_of_weights", "high", {1, none}, 0, "finite and > 0");
    expect_domain_error(
        [&] {
            (void)range_of_weights(even, array({1.0, infinity}), even);
        },
        "range_of_weights", "high", {1, none}, infinity, "finite and >= 0");
    expect_domain_error(
        [&] {
            (void)range_of_weights(even, array({1.0, 1.0}), array({0.0}));
        },
        "range_of_weights", "log_likelihood size", {}, 1, "2");
    expect_domain_error([&] { (void)range_of_contamination(even, 1.5, even); }, "range_of_contamination",
                        "epsilon", {}, 1.5, "between 0 and 1");
    expect_domain_error(
        [&] {
            (void)range_of_contamination(array({0.0, nan}), 0.5, even);
        },
        "range_of_contamination", "log_prior", {1, none}, nan, "finite");
}

}  // namespace
