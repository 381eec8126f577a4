// SPDX-License-Identifier: Apache-2.0
// tests/reference/sobol_points.csv, and the rows of tests/reference/sensitivity.csv about variance.
#include "steelyard/engine/variance_shares.hpp"

#include <gtest/gtest.h>

#include <cmath>
#include <cstdint>
#include <limits>
#include <nlohmann/json.hpp>
#include <numbers>
#include <optional>
#include <random>
#include <string>
#include <vector>

#include "expect_domain_error.hpp"
#include "near.hpp"
#include "reference_inputs.hpp"
#include "reference_table.hpp"
#include "steelyard/engine/quasi_random.hpp"

namespace {

using namespace steelyard::engine;
using nlohmann::json;
using steelyard::test::expect_domain_error;
using steelyard::test::near_abs;
using steelyard::test::near_rel;
using steelyard::test::numbers;
using steelyard::test::reference_json;
using steelyard::test::ReferenceTable;

constexpr double nan = std::numeric_limits<double>::quiet_NaN();

Eigen::ArrayXd array(const std::vector<double>& values) {
    return Eigen::Map<const Eigen::ArrayXd>(values.data(), static_cast<Eigen::Index>(values.size()));
}

/// A function of independent uniform sources with indices known in closed form.
struct Example {
    explicit Example(const json& input) : c(input) {}
    bool is_ishigami() const { return c["function"] == "ishigami"; }
    Eigen::Index sources() const { return is_ishigami() ? 3 : static_cast<Eigen::Index>(c["a"].size()); }
    double mean() const { return is_ishigami() ? c["a"].get<double>() / 2.0 : 1.0; }

    /// @param u  shape (n, sources), in the unit cube
    Eigen::ArrayXd operator()(const Eigen::ArrayXXd& u) const {
        if (is_ishigami()) {
            const Eigen::ArrayXXd x = (2.0 * u - 1.0) * std::numbers::pi;
            return x.col(0).sin() + c["a"].get<double>() * x.col(1).sin().square() +
                   c["b"].get<double>() * x.col(2).square().square() * x.col(0).sin();
        }
        const Eigen::ArrayXd a = numbers(c["a"]);
        Eigen::ArrayXd product = Eigen::ArrayXd::Ones(u.rows());
        for (Eigen::Index i = 0; i < a.size(); ++i) {
            product *= ((4.0 * u.col(i) - 2.0).abs() + a(i)) / (1.0 + a(i));
        }
        return product;
    }

    json c;
};

/// f at A (the first columns), at B (the last), and at A with one column of B.
struct Values {
    Values(const Example& f, const Eigen::ArrayXXd& points, double constant = 0.0) {
        const Eigen::Index sources = f.sources();
        const Eigen::ArrayXXd a = points.leftCols(sources);
        const Eigen::ArrayXXd b = points.rightCols(sources);
        f_a = f(a) + constant;
        f_b = f(b) + constant;
        f_ab.resize(points.rows(), sources);
        for (Eigen::Index i = 0; i < sources; ++i) {
            Eigen::ArrayXXd mixed = a;
            mixed.col(i) = b.col(i);
            f_ab.col(i) = f(mixed) + constant;
        }
    }
    VarianceShares shares() const { return variance_shares(f_a, f_b, f_ab); }

    Eigen::ArrayXd f_a, f_b;
    Eigen::ArrayXXd f_ab;
};

TEST(SobolPoints, AgreeWithTheReferenceTable) {
    const ReferenceTable table("sobol_points.csv");
    const Eigen::ArrayXXd points = sobol_points(1024, 6);
    for (const auto& [key, row] : table.rows()) {
        const std::string& quantity = key.second;
        if (quantity == "mean_of_product_over_1024") {
            EXPECT_TRUE(table.matches("SOB6", quantity, points.rowwise().prod().mean()));
            continue;
        }
        const std::size_t cut = quantity.find(';');
        ASSERT_NE(cut, std::string::npos) << quantity;
        const auto i = static_cast<Eigen::Index>(std::stol(quantity.substr(2)));
        const auto d = static_cast<Eigen::Index>(std::stol(quantity.substr(cut + 1)));
        EXPECT_TRUE(table.matches("SOB6", quantity, points(i, d)));
    }
    EXPECT_EQ(table.unused(), std::vector<std::string>{});
}

TEST(SobolPoints, FillEveryColumnEvenlyWhateverTheShift) {
    std::mt19937 random(20260106);
    const Eigen::Index n = 256;
    for (const Eigen::Index dimensions : {Eigen::Index{1}, Eigen::Index{40}, most_sobol_dimensions}) {
        DigitalShift shift(dimensions);
        for (Eigen::Index d = 0; d < dimensions; ++d) {
            shift(d) = static_cast<std::uint32_t>(random());
        }
        for (const Eigen::ArrayXXd& points : {sobol_points(n, dimensions), sobol_points(n, shift)}) {
            for (Eigen::Index d = 0; d < dimensions; ++d) {
                Eigen::ArrayXi inside = Eigen::ArrayXi::Zero(n);
                for (Eigen::Index i = 0; i < n; ++i) {
                    ++inside(static_cast<Eigen::Index>(points(i, d) * static_cast<double>(n)));
                }
                EXPECT_TRUE((inside == 1).all()) << "dimension " << d << " of " << dimensions;
            }
        }
    }
}

TEST(SobolPoints, AreShiftedBitByBitAndNeverReachZeroOrOne) {
    const DigitalShift shift = (DigitalShift(3) << 0U, 0xFFFFFFFFU, 0x80000001U).finished();
    const Eigen::ArrayXXd plain = sobol_points(8, 3);
    const Eigen::ArrayXXd points = sobol_points(8, shift);
    const double cell = std::ldexp(1.0, -32);
    for (Eigen::Index i = 0; i < 8; ++i) {
        EXPECT_EQ(points(i, 0), plain(i, 0) + cell / 2.0);
        EXPECT_EQ(points(i, 1), 1.0 - plain(i, 1) - cell / 2.0);
        const double half = plain(i, 2) < 0.5 ? plain(i, 2) + 0.5 : plain(i, 2) - 0.5;
        EXPECT_EQ(points(i, 2), half + cell + cell / 2.0);
    }
    EXPECT_EQ(plain(0, 0), 0.0);
    EXPECT_EQ(points(0, 0), cell / 2.0);
    EXPECT_EQ(points(0, 1), 1.0 - cell / 2.0);
}

TEST(VarianceShares, AgreeWithTheReferenceTable) {
    const ReferenceTable table("sensitivity.csv");
    const json inputs = reference_json("sensitivity_inputs.json");
    for (const json& input : inputs["sobol_indices"]) {
        const Example f(input);
        const std::string id = input["id"];
        for (const int log2n : input["log2n"]) {
            const Values values(f, sobol_points(Eigen::Index{1} << log2n, 2 * f.sources()));
            const VarianceShares shares = values.shares();
            EXPECT_TRUE(shares.varies);
            const std::string at = "[n=2^" + std::to_string(log2n) + "]";
            EXPECT_TRUE(table.matches(id, "estimate_variance" + at, shares.variance));
            const double centre = (values.f_a.mean() + values.f_b.mean()) / 2.0;
            for (Eigen::Index i = 0; i < f.sources(); ++i) {
                const std::string source = std::to_string(i + 1);
                // The reference does not take the mean from f. Estimator b without that is the one with it
                // plus mean(f) mean(f(AB) - f(A)) / variance, a term whose expectation is 0.
                const double step = values.f_ab.col(i).mean() - values.f_a.mean();
                const double uncentred = shares.first(i) + centre * step / shares.variance;
                EXPECT_TRUE(table.matches(id, "estimate_S" + source + at, uncentred));
                EXPECT_TRUE(table.matches(id, "estimate_ST" + source + at, shares.total(i)));
            }
        }
    }
}

/// The closed form's rows of the reference are what the estimates must come to.
TEST(VarianceShares, OfReplicatedPointsHoldTheClosedFormWithinTheirError) {
    const ReferenceTable table("sensitivity.csv");
    const json inputs = reference_json("sensitivity_inputs.json");
    std::mt19937 random(20260107);
    for (const json& input : inputs["sobol_indices"]) {
        const Example f(input);
        const std::string id = input["id"];
        std::vector<VarianceShares> replicates;
        for (int r = 0; r < 32; ++r) {
            DigitalShift shift(2 * f.sources());
            for (Eigen::Index d = 0; d < shift.size(); ++d) {
                shift(d) = static_cast<std::uint32_t>(random());
            }
            replicates.push_back(Values(f, sobol_points(256, shift)).shares());
        }
        const ReplicatedShares shares = replicated_shares(replicates);
        EXPECT_TRUE(shares.varies);
        EXPECT_TRUE(near_rel(table.value(id, "variance"), shares.variance, 0.03));
        for (Eigen::Index i = 0; i < f.sources(); ++i) {
            const std::string source = std::to_string(i + 1);
            // Four standard errors of 32 replicates: Student's t with 31 degrees of freedom, two-sided 4e-4.
            EXPECT_LE(std::abs(shares.first(i) - table.value(id, "S" + source)), 4.0 * shares.first_error(i));
            EXPECT_LE(std::abs(shares.total(i) - table.value(id, "ST" + source)),
                      4.0 * shares.total_error(i));
            EXPECT_LT(shares.first_error(i), 0.02);
            EXPECT_LT(shares.total_error(i), 0.02);
            EXPECT_GT(shares.first_error(i), 0.0);
        }
    }
}

TEST(VarianceShares, ClosedFormsAreThoseOfTheFunctions) {
    const ReferenceTable table("sensitivity.csv");
    const json inputs = reference_json("sensitivity_inputs.json");
    for (const json& input : inputs["sobol_indices"]) {
        const std::string id = input["id"];
        std::vector<double> first;
        std::vector<double> total;
        double variance = 0.0;
        if (Example(input).is_ishigami()) {
            // Ishigami and Homma 1990, from memory; the interaction term is 8 b^2 pi^8 / 225.
            const double a = input["a"];
            const double b = input["b"];
            const double own = std::pow(1.0 + b * std::pow(std::numbers::pi, 4) / 5.0, 2) / 2.0;
            const double second = a * a / 8.0;
            const double joint = 8.0 * b * b * std::pow(std::numbers::pi, 8) / 225.0;
            variance = own + second + joint;
            first = {own, second, 0.0};
            total = {own + joint, second, joint};
        } else {
            const Eigen::ArrayXd part = 1.0 / (3.0 * (1.0 + numbers(input["a"])).square());
            variance = (1.0 + part).prod() - 1.0;
            for (const double own : part) {
                first.push_back(own);
                total.push_back(own * (1.0 + part).prod() / (1.0 + own));
            }
        }
        EXPECT_TRUE(table.matches(id, "variance", variance));
        for (std::size_t i = 0; i < first.size(); ++i) {
            EXPECT_TRUE(table.matches(id, "S" + std::to_string(i + 1), first[i] / variance));
            EXPECT_TRUE(table.matches(id, "ST" + std::to_string(i + 1), total[i] / variance));
        }
    }
}

TEST(VarianceShares, KnowNoScaleAndNoOrigin) {
    const json inputs = reference_json("sensitivity_inputs.json");
    const Example f(inputs["sobol_indices"][0]);
    const Eigen::ArrayXXd points = sobol_points(256, 6);
    const VarianceShares plain = Values(f, points).shares();
    const VarianceShares raised = Values(f, points, 1e6).shares();
    const Values values(f, points);
    for (const double scale : {1e-200, 1e-3, 1e150, -2.0}) {
        const VarianceShares scaled =
            variance_shares(values.f_a * scale, values.f_b * scale, values.f_ab * scale);
        EXPECT_LE((plain.first - scaled.first).abs().maxCoeff(), 1e-13) << scale;
        EXPECT_LE((plain.total - scaled.total).abs().maxCoeff(), 1e-13) << scale;
        EXPECT_TRUE(near_rel(plain.variance * scale * scale, scaled.variance, 1e-13));
    }
    EXPECT_LE((plain.first - raised.first).abs().maxCoeff(), 1e-9);
    EXPECT_LE((plain.total - raised.total).abs().maxCoeff(), 1e-9);
}

TEST(VarianceShares, OfOneSourceAreAllOfTheVariance) {
    // f is its only source, and A, B are balanced: both indices come to 1.
    const Eigen::ArrayXXd points = sobol_points(4096, 2);
    const VarianceShares shares = variance_shares(points.col(0), points.col(1), points.col(1));
    EXPECT_TRUE(near_abs(1.0, shares.first(0), 1e-3));
    EXPECT_TRUE(near_abs(1.0, shares.total(0), 1e-3));
    EXPECT_TRUE(near_rel(1.0 / 12.0, shares.variance, 1e-3));
}

TEST(VarianceShares, AreZeroWhereNothingVaries) {
    const double value = 0.3;
    const Eigen::ArrayXd still = Eigen::ArrayXd::Constant(7, value);
    Eigen::ArrayXd rounding = still;
    rounding(3) = std::nextafter(value, 1.0);
    for (const Eigen::ArrayXd& f_a : {still, rounding}) {
        const VarianceShares shares = variance_shares(f_a, still, Eigen::ArrayXXd::Constant(7, 2, 0.4));
        EXPECT_FALSE(shares.varies);
        EXPECT_EQ(shares.variance, 0.0);
        EXPECT_TRUE((shares.first == 0.0).all());
        EXPECT_TRUE((shares.total == 0.0).all());
    }
    const VarianceShares zero =
        variance_shares(Eigen::ArrayXd::Zero(3), Eigen::ArrayXd::Zero(3), Eigen::ArrayXXd::Zero(3, 1));
    EXPECT_FALSE(zero.varies);
    EXPECT_FALSE(replicated_shares({zero, zero}).varies);
    EXPECT_EQ(replicated_shares({zero, zero}).first_error(0), 0.0);
}

TEST(ReplicatedShares, AreMeansWithTheirErrors) {
    std::vector<VarianceShares> replicates(3);
    const std::vector<double> first = {0.1, 0.2, 0.6};
    const std::vector<double> total = {0.5, 0.5, 0.5};
    for (std::size_t r = 0; r < 3; ++r) {
        replicates[r] = {array({first[r]}), array({total[r]}), 2.0, r > 0};
    }
    const ReplicatedShares shares = replicated_shares(replicates);
    // By hand: squares 0.04 + 0.01 + 0.09 about 0.3, over 2 * 3.
    EXPECT_TRUE(near_rel(0.3, shares.first(0), 1e-15));
    EXPECT_TRUE(near_rel(std::sqrt(0.14 / 6.0), shares.first_error(0), 1e-14));
    EXPECT_EQ(shares.total(0), 0.5);
    EXPECT_EQ(shares.total_error(0), 0.0);
    EXPECT_EQ(shares.variance, 2.0);
    EXPECT_TRUE(shares.varies);
}

TEST(VarianceShares, RefuseWhatCannotBe) {
    const std::optional<Eigen::Index> none;
    const Eigen::ArrayXd two = array({0.0, 1.0});
    const Eigen::ArrayXXd mixed = Eigen::ArrayXXd::Zero(2, 2);
    expect_domain_error([&] { (void)variance_shares(array({}), array({}), Eigen::ArrayXXd(0, 1)); },
                        "variance_shares", "f_a size", {}, 0, "at least 1");
    expect_domain_error([&] { (void)variance_shares(two, array({0.0}), mixed); }, "variance_shares",
                        "f_b size", {}, 1, "2");
    expect_domain_error([&] { (void)variance_shares(two, two, Eigen::ArrayXXd::Zero(3, 2)); },
                        "variance_shares", "f_ab rows size", {}, 3, "2");
    expect_domain_error(
        [&] {
            (void)variance_shares(array({0.0, nan}), two, mixed);
        },
        "variance_shares", "f_a", {1, none}, nan, "finite");
    expect_domain_error([&] { (void)variance_shares(two, two, mixed / 0.0); }, "variance_shares", "f_ab",
                        {0, 0}, nan, "finite");
    const VarianceShares one = variance_shares(two, two, mixed);
    const VarianceShares other = variance_shares(two, two, mixed.leftCols(1));
    expect_domain_error([&] { (void)replicated_shares({one}); }, "replicated_shares", "replicates size", {},
                        1, "at least 2");
    expect_domain_error(
        [&] {
            (void)replicated_shares({one, other});
        },
        "replicated_shares", "first size", {}, 1, "2");
    expect_domain_error([] { (void)sobol_points(0, 2); }, "sobol_points", "n", {}, 0,
                        "between 1 and 2147483648");
    expect_domain_error([] { (void)sobol_points(1, Eigen::Index{0}); }, "sobol_points", "dimensions", {}, 0,
                        "between 1 and 3667");
    expect_domain_error([] { (void)sobol_points(1, DigitalShift::Zero(3668)); }, "sobol_points", "dimensions",
                        {}, 3668, "between 1 and 3667");
}

}  // namespace
