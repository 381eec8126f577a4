// SPDX-License-Identifier: Apache-2.0
// One law for many patterns must say what surprise() says of each.
#include "steelyard/engine/surprise_law.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <cmath>
#include <limits>

#include "expect_domain_error.hpp"
#include "near.hpp"
#include "random_tables.hpp"
#include "steelyard/engine/counter_random.hpp"

namespace {

using namespace steelyard::engine;
using steelyard::test::expect_domain_error;
using steelyard::test::near_rel;
using steelyard::test::random_table;

double any_uniform(std::uint64_t draw, std::uint32_t finding) {
    return steelyard::engine::uniform(7, finding, draw);
}

struct Findings {
    Findings() {
        const int count = *rc::gen::inRange(1, 5);
        for (int f = 0; f < count; ++f) {
            bands.push_back(random_table(*rc::gen::inRange<Eigen::Index>(2, 5), 3, 1));
        }
    }
    /// A pattern of them, as both functions take it.
    std::pair<std::vector<BandIndex>, Eigen::ArrayXd> any_pattern() const {
        std::vector<BandIndex> seen;
        Eigen::ArrayXd loglik = Eigen::ArrayXd::Zero(3);
        for (const Eigen::ArrayXXd& table : bands) {
            seen.push_back(BandIndex{*rc::gen::inRange<Eigen::Index>(0, table.rows())});
            loglik += table.row(seen.back().value).transpose().log();
        }
        return {seen, loglik};
    }
    std::vector<Eigen::ArrayXXd> bands;
};

TEST(SurpriseLaw, SaysWhatSurpriseSaysOfEachPattern) {
    EXPECT_TRUE(rc::check("exact", [] {
        const Findings findings;
        const SurpriseLaw law(findings.bands);
        RC_ASSERT(law.exact());
        for (int i = 0; i < 5; ++i) {
            const auto [seen, loglik] = findings.any_pattern();
            const Eigen::ArrayXd expected = surprise(findings.bands, seen).probability;
            const Eigen::ArrayXd found = law.probability(loglik);
            for (Eigen::Index k = 0; k < 3; ++k) {
                RC_ASSERT(near_rel(found(k), expected(k), 1e-11));
            }
        }
    }));
    EXPECT_TRUE(rc::check("drawn, from the same draws", [] {
        const Findings findings;
        const SurpriseLaw law(findings.bands, any_uniform, {1, 200});
        const auto [seen, loglik] = findings.any_pattern();
        const Eigen::ArrayXd expected = surprise(findings.bands, seen, any_uniform, {1, 200}).probability;
        RC_ASSERT(law.exact() == (findings.bands.size() == 0));
        RC_ASSERT((law.probability(loglik) == expected).all());
    }));
}

TEST(SurpriseLaw, IsZeroWhereThePatternCannotBe) {
    Eigen::ArrayXXd table(2, 2);
    table << 1.0, 0.5, 0.0, 0.5;
    const SurpriseLaw law({table});
    const Eigen::ArrayXd second = law.probability(table.row(1).transpose().log());
    EXPECT_EQ(second(0), 0.0);
    EXPECT_EQ(second(1), 1.0);  // both bands are equally likely
}

TEST(SurpriseLaw, RefusesWhatItCannotUse) {
    Eigen::ArrayXXd table(2, 2);
    table << 0.9, 0.5, 0.1, 0.5;
    const std::string name = "SurpriseLaw";
    expect_domain_error([&] { SurpriseLaw law(std::vector<Eigen::ArrayXXd>{}); }, name, "bands size", {}, 0.0,
                        "at least 1");
    expect_domain_error(
        [&] {
            SurpriseLaw law({table}, {}, {1, 100});
        },
        name, "uniform", {}, 0.0, "given for more outcomes than the limit");
    expect_domain_error(
        [&] {
            SurpriseLaw law({table}, [](auto, auto) { return 0.0; }, {1, 100});
        },
        "drawn_log_shares", "uniform", {}, 0.0, "in (0, 1)");
    const Eigen::ArrayXXd few = drawn_log_shares(
        table, [](auto) { return 0.5; }, 3);
    const Eigen::ArrayXXd more = drawn_log_shares(
        table, [](auto) { return 0.5; }, 4);
    EXPECT_THROW((void)SurpriseLaw::of_draws({&few, &more}), DomainError);
    EXPECT_THROW((void)SurpriseLaw::of_draws({}), DomainError);
    EXPECT_THROW(SurpriseLaw({table}, any_uniform, {1, 0}), DomainError);
    EXPECT_THROW(SurpriseLaw({table * 2.0}), DomainError);
    const SurpriseLaw law({table});
    EXPECT_THROW((void)law.probability(Eigen::ArrayXd::Zero(3)), DomainError);
    expect_domain_error([&] { (void)law.probability(Eigen::ArrayXd::Constant(2, 0.5)); },
                        name + "::probability", "loglik", {0, {}}, 0.5, "<= 0");
    expect_domain_error(
        [&] { (void)law.probability(Eigen::ArrayXd::Constant(2, std::numeric_limits<double>::quiet_NaN())); },
        name + "::probability", "loglik", {0, {}}, std::numeric_limits<double>::quiet_NaN(), "<= 0");
}

}  // namespace
