// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/one_against_rest.hpp"

#include <gtest/gtest.h>

#include <cmath>
#include <limits>
#include <vector>

#include "expect_domain_error.hpp"
#include "near.hpp"

namespace {

using namespace steelyard::engine;  // the functions under test
using steelyard::test::expect_domain_error;
using steelyard::test::near_rel;

constexpr double nan = std::numeric_limits<double>::quiet_NaN();
constexpr double infinity = std::numeric_limits<double>::infinity();

Eigen::ArrayXd array(const std::vector<double>& values) {
    return Eigen::Map<const Eigen::ArrayXd>(values.data(), static_cast<Eigen::Index>(values.size()));
}

Eigen::ArrayXXd two_rows() {
    Eigen::ArrayXXd rows(2, 2);
    rows << 0.8, 0.3, 0.2, 0.7;
    return rows;
}

TEST(RatioToRest, IsThePairRatioForTwoCausesAtAnyMix) {
    for (const double share : {0.01, 0.5, 0.99}) {
        const Eigen::ArrayXXd ratio = ratio_to_rest(two_rows(), array({share, 1.0 - share}));
        const Eigen::ArrayXd pair = pair_ratio(two_rows(), CauseIndex{0}, CauseIndex{1});
        EXPECT_LE((ratio.col(0) / pair - 1.0).abs().maxCoeff(), 1e-14);
        EXPECT_LE((ratio.col(1) * pair - 1.0).abs().maxCoeff(), 1e-14);
    }
}

TEST(RatioToRest, IsOneForACauseLikeTheMixOfTheRest) {
    Eigen::ArrayXXd rows(2, 3);
    rows << 0.25, 0.4, 0.1, 0.75, 0.6, 0.9;  // 0.25 is halfway between 0.4 and 0.1
    const Eigen::ArrayXXd ratio = ratio_to_rest(rows, array({0.5, 0.25, 0.25}));
    EXPECT_LE((ratio.col(0) - 1.0).abs().maxCoeff(), 1e-15);
}

TEST(BandSum, IsOneForRatiosOfOneStudy) {
    const Eigen::ArrayXd mix = array({0.9, 0.1});
    EXPECT_LE((band_sum(ratio_to_rest(two_rows(), mix), mix) - 1.0).abs().maxCoeff(), 1e-15);
}

TEST(ShapeFromRest, RestoresTheRowsUpToOneFactorABand) {
    const Eigen::ArrayXd mix = array({0.9, 0.1});
    const Eigen::ArrayXXd shape = shape_from_rest(ratio_to_rest(two_rows(), mix), mix);
    const Eigen::ArrayXd share = (two_rows().matrix() * mix.matrix()).array();
    EXPECT_LE((shape.colwise() * share - two_rows()).abs().maxCoeff(), 1e-15);
}

TEST(LogSlopeFromRest, IsTheDerivativeOfTheShape) {
    const Eigen::ArrayXd mix = array({0.9, 0.1});
    Eigen::ArrayXXd ratio(2, 2);
    ratio << 4.0, 0.25, 0.3, 7.0;
    constexpr double step = 1e-5;
    const Eigen::ArrayXXd above = shape_from_rest(ratio * std::exp(step), mix).log();
    const Eigen::ArrayXXd below = shape_from_rest(ratio * std::exp(-step), mix).log();
    const Eigen::ArrayXXd slope = log_slope_from_rest(ratio, mix);
    EXPECT_LE((slope - (above - below) / (2.0 * step)).abs().maxCoeff(), 1e-9);
}

TEST(OneAgainstRest, RefusesBadArguments) {
    const Eigen::ArrayXd mix = array({0.5, 0.5});
    const Eigen::ArrayXXd rows = two_rows();
    expect_domain_error([&] { static_cast<void>(ratio_to_rest(rows, array({1}))); }, "ratio_to_rest",
                        "mix size", {}, 1, "at least 2");
    expect_domain_error(
        [&] {
            static_cast<void>(ratio_to_rest(rows, array({0.2, 0.3, 0.5})));
        },
        "ratio_to_rest", "mix size", {}, 3, "2");
    expect_domain_error(
        [&] {
            static_cast<void>(shape_from_rest(rows, array({0.2, 0.3, 0.5})));
        },
        "shape_from_rest", "study_mix size", {}, 3, "2");
    expect_domain_error(
        [&] {
            static_cast<void>(band_sum(rows, array({0.5, 0.4})));
        },
        "band_sum", "study_mix sum", {}, 0.9, "1 within 1e-06");
    for (const double bad : {0.0, 1.0, nan}) {
        expect_domain_error(
            [&] {
                static_cast<void>(ratio_to_rest(rows, array({bad, 0.5})));
            },
            "ratio_to_rest", "mix", {0, {}}, bad, "> 0 and < 1");
    }
    for (const double bad : {0.0, -1.0, nan, infinity}) {
        Eigen::ArrayXXd wrong = rows;
        wrong(1, 0) = bad;
        expect_domain_error([&] { static_cast<void>(ratio_to_rest(wrong, mix)); }, "ratio_to_rest",
                            "probability", {1, 0}, bad, "> 0 and <= 1");
        expect_domain_error([&] { static_cast<void>(shape_from_rest(wrong, mix)); }, "shape_from_rest",
                            "ratio", {1, 0}, bad, "finite and > 0");
        expect_domain_error([&] { static_cast<void>(band_sum(wrong, mix)); }, "band_sum", "ratio", {1, 0},
                            bad, "finite and > 0");
        expect_domain_error([&] { static_cast<void>(pair_ratio(wrong, CauseIndex{0}, CauseIndex{1})); },
                            "pair_ratio", "probability", {1, 0}, bad, "> 0 and <= 1");
    }
    expect_domain_error([&] { static_cast<void>(pair_ratio(rows, CauseIndex{2}, CauseIndex{1})); },
                        "pair_ratio", "a", {}, 2, "between 0 and 1");
    expect_domain_error([&] { static_cast<void>(pair_ratio(rows, CauseIndex{0}, CauseIndex{-1})); },
                        "pair_ratio", "b", {}, -1, "between 0 and 1");
}

}  // namespace
