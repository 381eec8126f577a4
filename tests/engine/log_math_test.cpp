// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/log_math.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <cmath>
#include <limits>
#include <map>
#include <string>
#include <vector>

#include "expect_domain_error.hpp"
#include "near.hpp"
#include "reference_table.hpp"
#include "steelyard/engine/distributions.hpp"

namespace {

using steelyard::engine::compensated_sum;
using steelyard::engine::log1m_exp;
using steelyard::engine::log_sum_exp;
using steelyard::engine::softmax;
using steelyard::test::expect_domain_error;
using steelyard::test::near_rel;
using steelyard::test::near_ulps;
using steelyard::test::ReferenceTable;

constexpr double nan = std::numeric_limits<double>::quiet_NaN();
constexpr double infinity = std::numeric_limits<double>::infinity();

Eigen::ArrayXd array(const std::vector<double>& values) {
    return Eigen::Map<const Eigen::ArrayXd>(values.data(), static_cast<Eigen::Index>(values.size()));
}

TEST(LogMath, AgreesWithTheReferenceTable) {
    const ReferenceTable table("log_math.csv");
    // The inputs of the table's cases. Two softmax entries that no double holds in full are in the test
    // below.
    const std::map<std::string, std::vector<double>> exponents = {{"LSE1", {-1000, -1001, -1002}},
                                                                  {"LSE2", {0, -800, -infinity}},
                                                                  {"LSE3", {-infinity, -infinity}},
                                                                  {"LSE4", {710, 709.5, 1}},
                                                                  {"LSE5", {-0.1, -0.2, -0.3, -50}}};
    for (const auto& [name, values] : exponents) {
        EXPECT_TRUE(table.matches(name, "logsumexp", log_sum_exp(array(values))));
        for (std::size_t i = 0; i < values.size(); ++i) {
            const std::string quantity = "softmax[" + std::to_string(i) + "]";
            if (table.has(name, quantity)) {
                const double got = softmax(array(values))(static_cast<Eigen::Index>(i));
                EXPECT_TRUE(table.matches(name, quantity, got));
                EXPECT_TRUE(near_rel(table.value(name, quantity), got, 1e-12)) << name << quantity;
            }
        }
    }
    std::vector<double> alternating;
    for (int i = 0; i < 100000; ++i) {
        alternating.push_back((i % 2 == 0 ? 1.0 : -1.0) / (i + 1));
    }
    const std::map<std::string, std::vector<double>> sums = {{"SUM1", {1e16, 1, -1e16}},
                                                             {"SUM2", {1, 1e100, 1, -1e100}},
                                                             {"SUM3", std::vector<double>(10, 0.1)},
                                                             {"SUM4", alternating}};
    for (const auto& [name, terms] : sums) {
        EXPECT_TRUE(table.matches(name, "correctly_rounded_sum", compensated_sum(array(terms))));
        EXPECT_TRUE(table.matches(name, "neumaier", compensated_sum(array(terms))));
    }
    using namespace steelyard::engine;  // the laws of distributions.hpp
    const std::map<std::string, double> laws = {
        {"norm_cdf(-1.96)", normal_lower(-1.96)},    {"norm_cdf(0.3)", normal_lower(0.3)},
        {"norm_cdf(-8.0)", normal_lower(-8.0)},      {"norm_sf(1.96)", normal_upper(1.96)},
        {"norm_sf(8.0)", normal_upper(8.0)},         {"norm_sf(30.0)", normal_upper(30.0)},
        {"norm_ppf(0.975)", normal_quantile(0.975)}, {"norm_ppf(0.995)", normal_quantile(0.995)},
        {"norm_ppf(0.5)", normal_quantile(0.5)},     {"norm_ppf(1e-10)", normal_quantile(1e-10)},
        {"t_sf(2.0 10)", student_t_upper(2.0, 10)},  {"t_sf(8.147 119)", student_t_upper(8.147, 119)}};
    for (const auto& [quantity, got] : laws) {
        EXPECT_TRUE(table.matches("special", quantity, got));
        EXPECT_TRUE(near_rel(table.value("special", quantity), got, 1e-11)) << quantity;
    }
    EXPECT_TRUE(table.unused().empty());
}

TEST(Softmax, UnderflowsQuietly) {
    EXPECT_EQ(softmax(array({0, -800, -infinity}))(1), 0.0);  // e^-800 = 3.7e-348
    // 60-digit decimals: e^1 / (e^710 + e^709.5 + e^1); a subnormal has fewer digits.
    EXPECT_TRUE(near_rel(7.5739653225234650297e-309, softmax(array({710, 709.5, 1}))(2), 1e-12));
}

TEST(LogSumExp, KeepsItsEdgeTable) {
    EXPECT_EQ(log_sum_exp(Eigen::ArrayXd()), -infinity);
    EXPECT_EQ(log_sum_exp(array({-3.5})), -3.5);
    EXPECT_TRUE(near_ulps(2.0 + std::log(3.0), log_sum_exp(array({2, 2, 2})), 1));
    EXPECT_EQ(log_sum_exp(array({-infinity, 4, -infinity})), 4.0);
    EXPECT_EQ(log_sum_exp(array({-infinity, -infinity})), -infinity);
    EXPECT_EQ(log_sum_exp(array({1, infinity, -infinity})), infinity);
    EXPECT_TRUE(std::isnan(log_sum_exp(array({1, nan, infinity}))));
    EXPECT_TRUE(std::isnan(log_sum_exp(array({nan, 1, 2}))));
    EXPECT_EQ(log_sum_exp(array({1e308, 1e308})), 1e308);
    EXPECT_EQ(log_sum_exp(array({-5e-324, -1e308})), -5e-324);
}

TEST(Softmax, KeepsItsEdgeTable) {
    EXPECT_EQ(softmax(Eigen::ArrayXd()).size(), 0);
    EXPECT_EQ(softmax(array({-700}))(0), 1.0);
    EXPECT_TRUE((softmax(array({5, 5, 5, 5})) == 0.25).all());
    EXPECT_EQ(softmax(array({-infinity, 0}))(0), 0.0);
    EXPECT_EQ(softmax(array({-1e308, 1e308}))(1), 1.0);
    expect_domain_error(
        [] {
            static_cast<void>(softmax(array({0, nan})));
        },
        "softmax", "x", {1, {}}, nan, "finite or -inf");
    expect_domain_error(
        [] {
            static_cast<void>(softmax(array({infinity, 0})));
        },
        "softmax", "x", {0, {}}, infinity, "finite or -inf");
    expect_domain_error(
        [] {
            static_cast<void>(softmax(array({-infinity, -infinity})));
        },
        "softmax", "largest x", {}, -infinity, "finite");
}

TEST(Softmax, SumsToOneWithinOneEpsilonAnEntry) {
    EXPECT_TRUE(rc::check([](const std::vector<std::int32_t>& words) {
        if (words.empty()) {
            return;
        }
        std::vector<double> x;
        for (const std::int32_t word : words) {
            x.push_back(static_cast<double>(word) * 1e-8);
        }
        const double bound = static_cast<double>(x.size()) * 0x1p-52;
        RC_ASSERT(std::abs(compensated_sum(softmax(array(x))) - 1.0) <= bound);
    }));
}

TEST(Log1mExp, AgreesWithLongDoubleOnBothSidesOfTheSwitch) {
    for (const double x : {-1e-300, -1e-16, -1e-3, -0.5, -0.69, -0.7, -1.0, -5.0, -36.0, -40.0, -700.0}) {
        const long double exact = x > -1 ? std::log(-std::expm1(static_cast<long double>(x)))
                                         : std::log1p(-std::exp(static_cast<long double>(x)));
        EXPECT_TRUE(near_ulps(static_cast<double>(exact), log1m_exp(x), 2)) << x;
    }
    EXPECT_EQ(log1m_exp(0.0), -infinity);
    EXPECT_EQ(log1m_exp(-infinity), 0.0);
    expect_domain_error([] { static_cast<void>(log1m_exp(1e-300)); }, "log1m_exp", "x", {}, 1e-300, "<= 0");
    expect_domain_error([] { static_cast<void>(log1m_exp(nan)); }, "log1m_exp", "x", {}, nan, "<= 0");
}

TEST(CompensatedSum, KeepsItsEdgeTable) {
    EXPECT_EQ(compensated_sum(Eigen::ArrayXd()), 0.0);
    EXPECT_EQ(compensated_sum(array({0.1})), 0.1);
    EXPECT_EQ(compensated_sum(array({1, -infinity})), -infinity);
    EXPECT_EQ(compensated_sum(array({infinity, 1, 2})), infinity);
    EXPECT_TRUE(std::isnan(compensated_sum(array({infinity, -infinity}))));
    EXPECT_TRUE(std::isnan(compensated_sum(array({1, nan, 2}))));
}

TEST(Distributions, AreMirroredAndInvert) {
    using namespace steelyard::engine;
    for (const double z : {-30.0, -3.0, -0.1, 0.0, 0.7, 12.0}) {
        EXPECT_EQ(normal_lower(z), normal_upper(-z));
    }
    EXPECT_EQ(normal_upper(infinity), 0.0);
    EXPECT_EQ(normal_lower(infinity), 1.0);
    EXPECT_EQ(student_t_upper(infinity, 4), 0.0);
    EXPECT_EQ(student_t_upper(-infinity, 4), 1.0);
    for (const double degrees : {1.0, 1.5, 4.0, 30.0, 299.0}) {
        for (const double p : {1e-12, 0.025, 0.4, 0.5, 0.9, 0.975}) {
            EXPECT_TRUE(near_rel(1.0 - p, student_t_upper(student_t_quantile(p, degrees), degrees), 1e-12))
                << p << " " << degrees;
        }
        EXPECT_EQ(student_t_upper(0.0, degrees), 0.5);
    }
    // P(T > 1) = 1/4 for one degree of freedom, and P(T > t) = (1 - t / sqrt(2 + t^2)) / 2 for two: closed
    // forms.
    EXPECT_TRUE(near_ulps(0.25, student_t_upper(1.0, 1.0), 1));
    EXPECT_TRUE(near_rel(0.5 - 1.0 / std::sqrt(12.0), student_t_upper(1.0, 2.0), 1e-15));
    // For one degree the tail tends to 1 / (pi t).
    EXPECT_TRUE(near_rel(1.0 / (3.14159265358979323846 * 1e9), student_t_upper(1e9, 1.0), 1e-15));
}

TEST(Distributions, RefuseWhatIsOutsideTheirDomain) {
    using namespace steelyard::engine;
    expect_domain_error([] { static_cast<void>(normal_lower(nan)); }, "normal_lower", "z", {}, nan,
                        "a number or an infinity");
    expect_domain_error([] { static_cast<void>(normal_upper(nan)); }, "normal_upper", "z", {}, nan,
                        "a number or an infinity");
    expect_domain_error([] { static_cast<void>(student_t_upper(nan, 3)); }, "student_t_upper", "t", {}, nan,
                        "a number or an infinity");
    for (const double bad : {0.0, 1.0, -0.1, nan}) {
        expect_domain_error([&] { static_cast<void>(normal_quantile(bad)); }, "normal_quantile", "p", {}, bad,
                            "> 0 and < 1");
        expect_domain_error([&] { static_cast<void>(student_t_quantile(bad, 3)); }, "student_t_quantile", "p",
                            {}, bad, "> 0 and < 1");
    }
    for (const double bad : {0.0, -1.0, nan, infinity}) {
        expect_domain_error([&] { static_cast<void>(student_t_upper(1, bad)); }, "student_t_upper", "degrees",
                            {}, bad, "finite and > 0");
        expect_domain_error([&] { static_cast<void>(student_t_quantile(0.5, bad)); }, "student_t_quantile",
                            "degrees", {}, bad, "finite and > 0");
    }
}

}  // namespace
