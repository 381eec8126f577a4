// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/posterior.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <numeric>
#include <random>
#include <vector>

#include "../reference/make_posterior.hpp"
#include "expect_domain_error.hpp"
#include "near.hpp"
#include "steelyard/engine/ledger.hpp"

namespace {

using steelyard::engine::CauseIndex;
using steelyard::engine::ledger;
using steelyard::engine::Ledger;
using steelyard::engine::log_evidence;
using steelyard::engine::log_posterior_odds;
using steelyard::engine::log_scores;
using steelyard::engine::posterior;
using steelyard::test::ExactPosterior;
using steelyard::test::expect_domain_error;
using steelyard::test::near_abs;
using steelyard::test::near_rel;
using steelyard::test::near_ulps;
using steelyard::test::posterior_problem;
using steelyard::test::PosteriorProblem;

constexpr double nan = std::numeric_limits<double>::quiet_NaN();
constexpr double infinity = std::numeric_limits<double>::infinity();
constexpr double smallest_normal = std::numeric_limits<double>::min();
constexpr std::uint64_t problems = 1000;

/// Runs a claim on the first `count` problems of the series, naming the one that fails.
template <class Claim>
void on_problems(std::uint64_t count, Claim claim) {
    for (std::uint64_t index = 0; index < count && !testing::Test::HasFailure(); ++index) {
        SCOPED_TRACE("posterior problem " + std::to_string(index));
        claim(posterior_problem(index));
    }
}

Eigen::ArrayXd reordered(const Eigen::ArrayXd& values, const std::vector<Eigen::Index>& order) {
    Eigen::ArrayXd result(values.size());
    for (Eigen::Index i = 0; i < values.size(); ++i) {
        result(i) = values(order[static_cast<std::size_t>(i)]);
    }
    return result;
}

std::vector<Eigen::Index> shuffled(Eigen::Index size, std::uint64_t seed) {
    std::vector<Eigen::Index> order(static_cast<std::size_t>(size));
    std::iota(order.begin(), order.end(), Eigen::Index{0});
    std::shuffle(order.begin(), order.end(), std::mt19937_64(seed));
    return order;
}

// ---- reference: 50-digit arithmetic, tests/reference/make_posterior.cpp ----

TEST(Posterior, HasEveryOddsRightToTwelveDigits) {
    double worst = 0.0;
    int compared = 0, underflowed = 0;
    on_problems(problems, [&](const PosteriorProblem& p) {
        const ExactPosterior exact(p);
        const Eigen::ArrayXd got = posterior(p.log_prior, p.loglik, p.weight);
        for (Eigen::Index a = 0; a < got.size(); ++a) {
            for (Eigen::Index b = 0; b < a; ++b) {
                if (got(a) >= smallest_normal && got(b) >= smallest_normal) {
                    worst = std::max(worst, std::abs(exact.odds_error(a, b, got(a), got(b))));
                    ++compared;
                } else {
                    ++underflowed;  // compared through log odds in the next test
                }
            }
            if (got(a) < smallest_normal) {
                EXPECT_LT(exact.posterior(a), 1.01 * smallest_normal);
            }
        }
    });
    EXPECT_LE(worst, 1e-12);
    EXPECT_GT(compared, 5000);
    EXPECT_GT(underflowed, 5000);
}

TEST(LogPosteriorOdds, AreRightToTwoUnitsInTheLastPlaceForEveryPair) {
    on_problems(problems, [](const PosteriorProblem& p) {
        const ExactPosterior exact(p);
        const Eigen::ArrayXd scores = log_scores(p.log_prior, p.loglik, p.weight);
        Eigen::Index leader = 0;
        EXPECT_EQ(scores.maxCoeff(&leader), 0.0);
        for (Eigen::Index a = 0; a < scores.size(); ++a) {
            EXPECT_TRUE(near_ulps(exact.log_odds(a, leader), scores(a), 2));
            for (Eigen::Index b = 0; b < scores.size(); ++b) {
                EXPECT_TRUE(near_ulps(
                    exact.log_odds(a, b),
                    log_posterior_odds(p.log_prior, p.loglik, p.weight, CauseIndex{a}, CauseIndex{b}), 2));
            }
        }
    });
}

TEST(LogEvidence, AgreesWithFiftyDigits) {
    on_problems(problems, [](const PosteriorProblem& p) {
        const ExactPosterior exact(p);
        // Near 0 the result is a difference of terms of the size of the prior's logarithms, here below 200.
        const double got = log_evidence(p.log_prior, p.loglik, p.weight);
        EXPECT_TRUE(near_abs(exact.log_evidence(), got, 1e-15 * std::abs(exact.log_evidence()) + 1e-13));
    });
}

TEST(Ledger, NormalisesPriorAndPosteriorToFiftyDigitValues) {
    on_problems(problems, [](const PosteriorProblem& p) {
        const ExactPosterior exact(p);
        const Ledger got = ledger(p.log_prior, p.loglik, p.weight);
        for (Eigen::Index cause = 0; cause < p.log_prior.size(); ++cause) {
            EXPECT_TRUE(near_abs(exact.log_posterior(cause), got.log_posterior(cause),
                                 1e-15 * std::abs(exact.log_posterior(cause)) + 1e-15));
        }
        EXPECT_TRUE(near_rel(1.0, got.log_prior.exp().sum(), 1e-13));
        EXPECT_TRUE(near_rel(1.0, got.log_posterior.exp().sum(), 1e-14));
    });
}

// ---- properties ----

TEST(Posterior, SumsToOneWithinOneEpsilonACause) {
    on_problems(problems, [](const PosteriorProblem& p) {
        const Eigen::ArrayXd got = posterior(p.log_prior, p.loglik, p.weight);
        EXPECT_LE(std::abs(got.sum() - 1.0), static_cast<double>(got.size()) * 0x1p-52);
        EXPECT_TRUE((got >= 0.0).all() && (got <= 1.0).all());
    });
}

TEST(Posterior, IsThePriorWhenNothingIsObserved) {
    EXPECT_TRUE(rc::check([](const std::vector<std::uint32_t>& words) {
        if (words.size() < 2) {
            return;
        }
        Eigen::ArrayXd prior(static_cast<Eigen::Index>(words.size()));
        for (Eigen::Index i = 0; i < prior.size(); ++i) {
            prior(i) = static_cast<double>(words[static_cast<std::size_t>(i)]) + 1.0;
        }
        const Eigen::ArrayXd got =
            posterior(prior.log(), Eigen::ArrayXXd(0, prior.size()), Eigen::ArrayXd(0));
        for (Eigen::Index i = 0; i < prior.size(); ++i) {
            RC_ASSERT(near_rel(prior(i) / prior.sum(), got(i), 1e-13));
        }
        RC_ASSERT(log_evidence(prior.log(), Eigen::ArrayXXd(0, prior.size()), Eigen::ArrayXd(0)) == 0.0);
    }));
}

TEST(Posterior, DoesNotDependOnTheOrderOfFindings) {
    on_problems(problems, [](const PosteriorProblem& p) {
        const std::vector<Eigen::Index> order = shuffled(p.weight.size(), 7);
        Eigen::ArrayXXd loglik(p.loglik.rows(), p.loglik.cols());
        for (Eigen::Index k = 0; k < loglik.cols(); ++k) {
            loglik.col(k) = reordered(p.loglik.col(k), order);
        }
        const Eigen::ArrayXd one = log_scores(p.log_prior, p.loglik, p.weight);
        const Eigen::ArrayXd other = log_scores(p.log_prior, loglik, reordered(p.weight, order));
        for (Eigen::Index k = 0; k < one.size(); ++k) {
            EXPECT_TRUE(near_ulps(one(k), other(k), 1));
        }
    });
}

TEST(Posterior, IsRelabelledWhenCausesAre) {
    on_problems(problems, [](const PosteriorProblem& p) {
        const std::vector<Eigen::Index> order = shuffled(p.log_prior.size(), 11);
        Eigen::ArrayXXd loglik(p.loglik.rows(), p.loglik.cols());
        for (Eigen::Index k = 0; k < loglik.cols(); ++k) {
            loglik.col(k) = p.loglik.col(order[static_cast<std::size_t>(k)]);
        }
        const Eigen::ArrayXd one = reordered(posterior(p.log_prior, p.loglik, p.weight), order);
        const Eigen::ArrayXd other = posterior(reordered(p.log_prior, order), loglik, p.weight);
        for (Eigen::Index k = 0; k < one.size(); ++k) {
            EXPECT_TRUE(near_ulps(one(k), other(k), 2));
        }
    });
}

TEST(Posterior, IsNotMovedByAFlatFinding) {
    on_problems(problems, [](const PosteriorProblem& p) {
        Eigen::ArrayXXd loglik(p.loglik.rows() + 1, p.loglik.cols());
        loglik.topRows(p.loglik.rows()) = p.loglik;
        loglik.row(p.loglik.rows()) = -3.7;
        Eigen::ArrayXd weight(p.weight.size() + 1);
        weight.head(p.weight.size()) = p.weight;
        weight(p.weight.size()) = 0.7;
        const Eigen::ArrayXd one = log_scores(p.log_prior, p.loglik, p.weight);
        const Eigen::ArrayXd other = log_scores(p.log_prior, loglik, weight);
        for (Eigen::Index k = 0; k < one.size(); ++k) {
            EXPECT_TRUE(near_ulps(one(k), other(k), 1));
        }
    });
}

TEST(Posterior, IsNotMovedByAConstantAddedToARowOrToThePrior) {
    on_problems(problems, [](PosteriorProblem p) {
        if (p.weight.size() == 0) {
            return;
        }
        // Whole numbers of 2^-20 and powers of two, so that adding the constant is itself exact.
        p.loglik = (p.loglik * 0x1p20).round() * 0x1p-20;
        p.log_prior = (p.log_prior * 0x1p20).round() * 0x1p-20;
        const Eigen::ArrayXd one = log_scores(p.log_prior, p.loglik, p.weight);
        p.loglik.row(0) -= 64.0;
        p.log_prior += 4096.0;
        const Eigen::ArrayXd other = log_scores(p.log_prior, p.loglik, p.weight);
        for (Eigen::Index k = 0; k < one.size(); ++k) {
            EXPECT_TRUE(near_ulps(one(k), other(k), 1));
        }
        // The evidence falls by the constant of the row alone.
        EXPECT_TRUE((posterior(p.log_prior, p.loglik, p.weight) >= 0.0).all());
    });
}

TEST(Posterior, IsTheSameInTwoStepsAsInOne) {
    on_problems(problems, [](const PosteriorProblem& p) {
        const Eigen::Index first = p.weight.size() / 2, rest = p.weight.size() - first;
        const Eigen::ArrayXd halfway = log_scores(p.log_prior, p.loglik.topRows(first), p.weight.head(first));
        const Eigen::ArrayXd two = log_scores(halfway, p.loglik.bottomRows(rest), p.weight.tail(rest));
        const Eigen::ArrayXd one = log_scores(p.log_prior, p.loglik, p.weight);
        // The halfway scores are rounded once: half a unit of at most 28,000 for each of the two.
        const double bound = 2.0 * 0x1p-53 * halfway.abs().maxCoeff() + 1e-15;
        for (Eigen::Index k = 0; k < one.size(); ++k) {
            EXPECT_TRUE(near_abs(one(k), two(k), bound + 4e-16 * std::abs(one(k))));
        }
    });
}

TEST(Posterior, MovesTowardsTheFavouredCauseAsAFindingWeighsMore) {
    on_problems(problems, [](PosteriorProblem p) {
        if (p.weight.size() == 0) {
            return;
        }
        p.weight(0) = 0.25;
        const Eigen::ArrayXd light = log_scores(p.log_prior, p.loglik, p.weight);
        p.weight(0) = 0.5;
        const Eigen::ArrayXd heavy = log_scores(p.log_prior, p.loglik, p.weight);
        for (Eigen::Index a = 1; a < light.size(); ++a) {
            const double favour = p.loglik(0, a) - p.loglik(0, 0);
            const double moved = (heavy(a) - heavy(0)) - (light(a) - light(0));
            EXPECT_TRUE(near_abs(0.25 * favour, moved, 1e-11));
            if (std::abs(favour) > 1e-9) {
                EXPECT_EQ(moved > 0.0, favour > 0.0);
            }
        }
    });
}

TEST(Posterior, CountsCopiesOfOneFindingOnceWhenFullyDependent) {
    on_problems(200, [](const PosteriorProblem& p) {
        if (p.weight.size() == 0) {
            return;
        }
        const Eigen::ArrayXd once = log_scores(p.log_prior, p.loglik.topRows(1), Eigen::ArrayXd::Ones(1));
        for (const int m : {2, 3, 5, 40}) {
            const Eigen::ArrayXXd copies = p.loglik.row(0).replicate(m, 1);
            const double weight = steelyard::engine::dependence_weight(m, 1.0);
            const Eigen::ArrayXd many = log_scores(p.log_prior, copies, Eigen::ArrayXd::Constant(m, weight));
            for (Eigen::Index k = 0; k < once.size(); ++k) {
                EXPECT_TRUE(
                    near_abs(once(k), many(k), 1e-15 * (std::abs(once(k)) + 700.0)));  // 1/m is rounded
            }
        }
    });
}

TEST(Posterior, AgreesWithAPlainProductOfLongDoublesOnSmallCases) {
    EXPECT_TRUE(rc::check([](std::uint32_t seed) {
        const PosteriorProblem p = posterior_problem(seed);
        const Eigen::Index findings = std::min<Eigen::Index>(p.weight.size(), 4);
        const Eigen::ArrayXXd loglik = p.loglik.topRows(findings) / 70.0;
        const Eigen::ArrayXd got = posterior(p.log_prior, loglik, p.weight.head(findings));
        std::vector<long double> product;
        long double sum = 0;
        for (Eigen::Index k = 0; k < got.size(); ++k) {
            long double term = std::exp(static_cast<long double>(p.log_prior(k)));
            for (Eigen::Index f = 0; f < findings; ++f) {
                term *= std::pow(std::exp(static_cast<long double>(loglik(f, k))),
                                 static_cast<long double>(p.weight(f)));
            }
            product.push_back(term);
            sum += term;
        }
        for (Eigen::Index k = 0; k < got.size(); ++k) {
            RC_ASSERT(
                near_rel(static_cast<double>(product[static_cast<std::size_t>(k)] / sum), got(k), 1e-13));
        }
    }));
}

// ---- edges ----

TEST(Posterior, OfTiesIsShared) {
    const Eigen::ArrayXd prior = Eigen::ArrayXd::Constant(4, -1e6);
    const Eigen::ArrayXXd loglik = Eigen::ArrayXXd::Constant(3, 4, -700.0);
    EXPECT_TRUE((posterior(prior, loglik, Eigen::ArrayXd::Ones(3)) == 0.25).all());
}

TEST(Posterior, HoldsAtTheEndsOfADouble) {
    Eigen::ArrayXd prior(2);
    prior << 0.0, -1e308;
    EXPECT_EQ(posterior(prior, Eigen::ArrayXXd(0, 2), Eigen::ArrayXd(0))(0), 1.0);
    prior << -5e-324, 0.0;
    EXPECT_EQ(posterior(prior, Eigen::ArrayXXd::Zero(1, 2), Eigen::ArrayXd::Constant(1, 5e-324))(0), 0.5);
}

// ---- errors ----

struct Bad {
    Eigen::ArrayXd prior = Eigen::ArrayXd::Zero(3);
    Eigen::ArrayXXd loglik = Eigen::ArrayXXd::Constant(2, 3, -1.0);
    Eigen::ArrayXd weight = Eigen::ArrayXd::Ones(2);
};

void expect_refused(const Bad& bad, const std::string& argument, steelyard::test::Place place, double value,
                    const std::string& requirement) {
    expect_domain_error([&] { static_cast<void>(log_scores(bad.prior, bad.loglik, bad.weight)); },
                        "log_scores", argument, place, value, requirement);
    expect_domain_error([&] { static_cast<void>(posterior(bad.prior, bad.loglik, bad.weight)); }, "posterior",
                        argument, place, value, requirement);
    expect_domain_error([&] { static_cast<void>(log_evidence(bad.prior, bad.loglik, bad.weight)); },
                        "log_evidence", argument, place, value, requirement);
    expect_domain_error([&] { static_cast<void>(ledger(bad.prior, bad.loglik, bad.weight)); }, "ledger",
                        argument, place, value, requirement);
    expect_domain_error(
        [&] {
            static_cast<void>(
                log_posterior_odds(bad.prior, bad.loglik, bad.weight, CauseIndex{0}, CauseIndex{1}));
        },
        "log_posterior_odds", argument, place, value, requirement);
}

TEST(Posterior, RefusesShapesThatDiffer) {
    Bad bad;
    bad.prior.resize(1);
    bad.prior << 0.0;
    expect_refused(bad, "log_prior size", {}, 1, "at least 2");
    bad = Bad();
    bad.loglik = Eigen::ArrayXXd::Constant(2, 4, -1.0);
    expect_refused(bad, "loglik columns size", {}, 4, "3");
    bad = Bad();
    bad.weight = Eigen::ArrayXd::Ones(3);
    expect_refused(bad, "weight size", {}, 3, "2");
}

TEST(Posterior, RefusesEntriesOutOfRange) {
    for (const double value : {nan, infinity, -infinity}) {
        Bad bad;
        bad.prior(2) = value;
        expect_refused(bad, "log_prior", {2, {}}, value, "finite");
    }
    for (const double value : {nan, -infinity, 1e-300}) {
        Bad bad;
        bad.loglik(1, 2) = value;
        expect_refused(bad, "loglik", {1, 2}, value, "finite and <= 0");
    }
    for (const double value : {nan, 0.0, -0.5, 1.0 + 0x1p-52, infinity}) {
        Bad bad;
        bad.weight(1) = value;
        expect_refused(bad, "weight", {1, {}}, value, "> 0 and <= 1");
    }
}

TEST(Posterior, RefusesSumsThatOverflow) {
    Bad bad;
    bad.loglik.col(1) = -1.7e308;
    expect_refused(bad, "score", {1, {}}, -infinity, "finite: the sum overflows");
    bad = Bad();
    bad.prior << 1.7e308, -1.7e308, 0.0;
    expect_refused(bad, "score", {1, {}}, -infinity, "finite: the sum overflows");
}

TEST(Posterior, SaysTheErrorAsASentence) {
    Bad bad;
    bad.loglik(1, 2) = nan;
    try {
        static_cast<void>(posterior(bad.prior, bad.loglik, bad.weight));
        FAIL();
    } catch (const steelyard::engine::DomainError& error) {
        EXPECT_STREQ(error.what(), "posterior: loglik(1, 2) is nan, but must be finite and <= 0");
    }
}

TEST(LogPosteriorOdds, RefuseACauseThatIsNotThere) {
    const Bad good;
    expect_domain_error(
        [&] {
            static_cast<void>(
                log_posterior_odds(good.prior, good.loglik, good.weight, CauseIndex{3}, CauseIndex{0}));
        },
        "log_posterior_odds", "a", {}, 3, "between 0 and 2");
    expect_domain_error(
        [&] {
            static_cast<void>(
                log_posterior_odds(good.prior, good.loglik, good.weight, CauseIndex{0}, CauseIndex{-1}));
        },
        "log_posterior_odds", "b", {}, -1, "between 0 and 2");
}

}  // namespace
