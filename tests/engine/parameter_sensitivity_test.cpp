// SPDX-License-Identifier: Apache-2.0
// The rows of tests/reference/sensitivity.csv about single figures and about distances of beliefs; those
// about variance are compared in variance_shares_test.cpp.
#include "steelyard/engine/parameter_sensitivity.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <cmath>
#include <limits>
#include <nlohmann/json.hpp>
#include <optional>
#include <string>
#include <vector>

#include "expect_domain_error.hpp"
#include "near.hpp"
#include "reference_inputs.hpp"
#include "reference_table.hpp"
#include "steelyard/engine/log_math.hpp"
#include "steelyard/engine/log_weight.hpp"
#include "steelyard/engine/prior_sensitivity.hpp"

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

std::size_t place(CauseIndex cause) {
    return static_cast<std::size_t>(cause.value);
}

/// One network of the inputs: what was seen as a log-likelihood, and its figures as curves.
struct Network {
    explicit Network(const json& input) : c(input), log_prior(numbers(c["prior_odds"]).log()) {
        log_likelihood = Eigen::ArrayXd::Zero(log_prior.size());
        for (const auto& [finding, seen] : c["observed"].items()) {
            for (Eigen::Index k = 0; k < log_prior.size(); ++k) {
                log_likelihood(k) += std::log(cell(finding, k, seen));
            }
        }
    }
    double cell(const std::string& finding, Eigen::Index cause, const json& category) const {
        return number(c["tables"][finding][static_cast<std::size_t>(cause)][category.get<std::size_t>()]);
    }
    SensitivityCurve curve(const json& figure) const {
        const CauseIndex owner{figure["cause"].get<Eigen::Index>()};
        if (figure["kind"] == "prior") {
            return prior_curve(log_prior, log_likelihood, owner);
        }
        const std::string finding = figure["finding"];
        const double now = cell(finding, owner.value, figure["category"]);
        return figure["category"] == c["observed"][finding]
                   ? seen_cell_curve(log_prior, log_likelihood, owner, now)
                   : other_cell_curve(log_prior, log_likelihood, owner, now);
    }
    std::string name(Eigen::Index cause) const { return c["causes"][static_cast<std::size_t>(cause)]; }

    json c;
    Eigen::ArrayXd log_prior, log_likelihood;
};

class SensitivityReference : public testing::Test {
  protected:
    SensitivityReference() : table("sensitivity.csv"), inputs(reference_json("sensitivity_inputs.json")) {}

    void expect(const std::string& which, const std::string& quantity, double got) {
        EXPECT_TRUE(table.matches(which, quantity, got));
    }
    void expect_text(const std::string& which, const std::string& quantity, const std::string& got) {
        EXPECT_EQ(table.rows().at({which, quantity}).value, got) << which << " " << quantity;
        table.rows().at({which, quantity}).used = true;
    }
    /// Rows of cases in this list were all compared.
    void expect_all_used(const json& list) {
        for (const std::string& row : table.unused()) {
            for (const json& entry : list) {
                EXPECT_NE(row.substr(0, row.find(' ')), entry["id"].get<std::string>())
                    << row << " was not compared";
            }
        }
    }

    ReferenceTable table;
    json inputs;
};

TEST_F(SensitivityReference, OneFigureAtATime) {
    for (const json& input : inputs["networks"]) {
        const Network network(input);
        const std::string id = input["id"];
        const Eigen::Index causes = network.log_prior.size();
        const Eigen::ArrayXd base = softmax(network.log_prior + network.log_likelihood);
        CauseIndex top;
        base.maxCoeff(&top.value);
        const CauseIndex target{input["target"].get<Eigen::Index>()};
        std::vector<Swing> bars;
        for (const json& figure : input["parameters"]) {
            const SensitivityCurve curve = network.curve(figure);
            const std::string tag = figure["name"].get<std::string>() + ": ";
            expect(id, tag + "theta0", curve.current);
            for (Eigen::Index k = 0; k < causes; ++k) {
                expect(id, "base[" + network.name(k) + "]", curve.posterior(curve.current)(k));
                expect(id, tag + "dP[" + network.name(k) + "]/dtheta", curve.derivative(curve.current)(k));
                for (const json& theta : figure["grid"]) {
                    expect(id, tag + "P[" + network.name(k) + "](theta=" + theta.get<std::string>() + ")",
                           curve.posterior(number(theta))(k));
                }
                if (CauseIndex{k} == top) {
                    continue;
                }
                const std::string where =
                    tag + "theta where P[" + network.name(k) + "]=P[" + network.name(top.value) + "]";
                const std::optional<double> tie = curve.tie(CauseIndex{k}, top);
                if (tie) {
                    expect(id, where, *tie);
                } else {
                    expect_text(id, where, "none");
                }
            }
            bars.push_back(swing(curve, number(figure["low"]), number(figure["high"]), target));
            expect(id, tag + "P[" + network.name(target.value) + "] at low", bars.back().at_low);
            expect(id, tag + "P[" + network.name(target.value) + "] at high", bars.back().at_high);
            expect(id, tag + "swing", bars.back().width());
        }
        std::string order;
        for (const std::size_t bar : tornado_order(bars)) {
            order += (order.empty() ? "" : " > ") + input["parameters"][bar]["name"].get<std::string>();
        }
        expect_text(id, "tornado_order", order);
        for (Eigen::Index i = 0; i < causes; ++i) {
            for (Eigen::Index j = i + 1; j < causes; ++j) {
                const std::string pair = "[" + network.name(i) + ":" + network.name(j) + "]";
                const LogWeight now = LogWeight::nats(network.log_prior(i) - network.log_prior(j));
                const TippingPrior tip =
                    tipping_prior(network.log_prior, network.log_likelihood, CauseIndex{j}, CauseIndex{i});
                expect(id, "current_prior_odds" + pair, now.to_ratio());
                expect(id, "tipping_prior_odds" + pair, (now + tip.odds_factor).to_ratio());
            }
        }
    }
    expect_all_used(inputs["networks"]);
}

TEST_F(SensitivityReference, TipsWherePriorCurvesTie) {
    const Network network(inputs["networks"][0]);
    const TippingPrior tip =
        tipping_prior(network.log_prior, network.log_likelihood, CauseIndex{2}, CauseIndex{1});
    expect("S1", "prior_B: theta where P[C]=P[B]", tip.prior.to_probability().value());
    expect("S1", "prior_B: dP[B]/dtheta", prior_derivative(network.log_prior, network.log_likelihood)(1, 1));
    expect("S1", "prior_B: dP[C]/dtheta", prior_derivative(network.log_prior, network.log_likelihood)(2, 1));
}

TEST_F(SensitivityReference, DistanceOfBeliefs) {
    for (const json& input : inputs["chan_darwiche"]) {
        const std::string id = input["id"];
        const Eigen::ArrayXd log_p = numbers(input["p"]).log();
        const Eigen::ArrayXd log_q = numbers(input["q"]).log();
        const CauseIndex event{input["event"].get<Eigen::Index>()};
        const double distance = belief_distance(log_p, log_q);
        expect(id, "distance", distance);
        expect(id, "KL(p||q)_nats", relative_entropy(log_p, log_q));
        expect(id, "KL(q||p)_nats", relative_entropy(log_q, log_p));
        const BeliefBounds bounds =
            belief_bounds(Probability::of(number(input["p"][place(event)])), distance);
        expect(id, "bound_lower_on_event", bounds.low.value());
        expect(id, "bound_upper_on_event", bounds.high.value());
        expect(id, "new_prob_of_event", softmax(log_q)(event.value));
        for (const json& likelihood : input["likelihoods"]) {
            std::string tag;
            for (const json& entry : likelihood) {
                tag += (tag.empty() ? "[" : "/") + entry.get<std::string>();
            }
            tag += "]";
            const double before = softmax(log_p + numbers(likelihood).log())(event.value);
            const BeliefBounds reach = belief_bounds(Probability::of(before), distance);
            expect(id, "posterior_old" + tag, before);
            expect(id, "posterior_new" + tag, softmax(log_q + numbers(likelihood).log())(event.value));
            expect(id, "posterior_bound_lower" + tag, reach.low.value());
            expect(id, "posterior_bound_upper" + tag, reach.high.value());
        }
    }
    for (const json& input : inputs["chan_darwiche_single_parameter"]) {
        const std::string id = input["id"];
        const double before = number(input["theta"]);
        const double after = number(input["theta_new"]);
        const double distance =
            belief_distance(array({before, 1.0 - before}).log(), array({after, 1.0 - after}).log());
        expect(id, "distance", distance);
        EXPECT_TRUE(near_rel(
            distance,
            std::abs((LogOdds::of(Probability::of(after)) - LogOdds::of(Probability::of(before))).to_nats()),
            1e-13));
        const BeliefBounds reach = belief_bounds(Probability::of(number(input["query_prob"])), distance);
        expect(id, "query_lower", reach.low.value());
        expect(id, "query_upper", reach.high.value());
    }
    expect_all_used(inputs["chan_darwiche"]);
    expect_all_used(inputs["chan_darwiche_single_parameter"]);
}

/// Four causes with random priors and a finding of three bands, the middle one seen, of a random weight.
struct Case {
    Eigen::ArrayXd prior;
    Eigen::ArrayXXd rows;  // shape (3, 4): columns sum to 1
    double weight;
    CauseIndex owner;

    Eigen::ArrayXd weights(const Eigen::ArrayXXd& table) const {
        return prior * table.row(1).transpose().pow(weight);
    }
    Eigen::ArrayXd log_likelihood() const { return weight * rows.row(1).transpose().log(); }
};

Case random_case() {
    const auto list = *rc::gen::container<std::vector<int>>(16, rc::gen::inRange(1, 1000));
    const Eigen::ArrayXd all = Eigen::Map<const Eigen::ArrayXi>(list.data(), 16).cast<double>();
    Case c{all.head(4) / all.head(4).sum(), Eigen::ArrayXXd(3, 4), *rc::gen::element(1.0, 0.5, 0.3),
           CauseIndex{*rc::gen::inRange(0, 4)}};
    for (Eigen::Index k = 0; k < 4; ++k) {
        c.rows.col(k) = all.segment(4 + 3 * k, 3) / all.segment(4 + 3 * k, 3).sum();
    }
    return c;
}

double random_theta() {
    return (*rc::gen::inRange(0, 10000) + 0.5) / 10000.0;
}

/// Entry i becomes theta, the others share the rest in proportion: written out, as the independent peer.
Eigen::ArrayXd covaried(const Eigen::ArrayXd& row, Eigen::Index i, double theta) {
    Eigen::ArrayXd varied = row * ((1.0 - theta) / (row.sum() - row(i)));
    varied(i) = theta;
    return varied;
}

TEST(SensitivityCurve, IsThePosteriorOfTheCovariedRow) {
    EXPECT_TRUE(rc::check([] {
        const Case c = random_case();
        const double theta = random_theta();
        const Eigen::Index owner = c.owner.value;
        for (const Eigen::Index band : {0, 1, 2}) {
            Eigen::ArrayXXd table = c.rows;
            table.col(owner) = covaried(c.rows.col(owner), band, theta);
            const Eigen::ArrayXd expected = c.weights(table) / c.weights(table).sum();
            const double cell = c.rows(band, owner);
            const SensitivityCurve curve =
                band == 1 ? seen_cell_curve(c.prior.log(), c.log_likelihood(), c.owner, cell, c.weight)
                          : other_cell_curve(c.prior.log(), c.log_likelihood(), c.owner, cell, c.weight);
            RC_ASSERT((expected - curve.posterior(theta)).abs().maxCoeff() < 1e-13);
        }
        const Eigen::ArrayXd moved = covaried(c.prior, owner, theta) * c.log_likelihood().exp();
        const SensitivityCurve curve = prior_curve(c.prior.log(), c.log_likelihood(), c.owner);
        RC_ASSERT((moved / moved.sum() - curve.posterior(theta)).abs().maxCoeff() < 1e-13);
        RC_ASSERT(near_rel(c.prior(owner), curve.current, 1e-13));
    }));
}

std::vector<SensitivityCurve> curves(const Case& c) {
    const Eigen::ArrayXd row = c.rows.col(c.owner.value);
    return {prior_curve(c.prior.log(), c.log_likelihood(), c.owner),
            seen_cell_curve(c.prior.log(), c.log_likelihood(), c.owner, row(1), c.weight),
            other_cell_curve(c.prior.log(), c.log_likelihood(), c.owner, row(0), c.weight)};
}

TEST(SensitivityCurve, OfWeightOneIsAPieceOfAHyperbola) {
    // Coupe and van der Gaag 2002: two evaluations of numerator and denominator give the curve everywhere.
    EXPECT_TRUE(rc::check([] {
        Case c = random_case();
        c.weight = 1.0;
        const double theta = random_theta();
        const Eigen::Index owner = c.owner.value;
        const auto weights_at = [&](Eigen::Index band, double at) -> Eigen::ArrayXd {
            Eigen::ArrayXXd table = c.rows;
            table.col(owner) = covaried(c.rows.col(owner), band, at);
            return c.weights(table);
        };
        const std::vector<SensitivityCurve> all = curves(c);
        for (const Eigen::Index band : {1, 0}) {
            const Eigen::ArrayXd zero = weights_at(band, 0.0);
            const Eigen::ArrayXd one = weights_at(band, 1.0);
            const Eigen::ArrayXd hyperbola =
                ((one - zero) * theta + zero) / ((one.sum() - zero.sum()) * theta + zero.sum());
            RC_ASSERT((hyperbola - all[band == 1 ? 1 : 2].posterior(theta)).abs().maxCoeff() < 1e-13);
        }
    }));
}

TEST(SensitivityCurve, HasTheSlopeOfItsNeighbours) {
    EXPECT_TRUE(rc::check([] {
        const Case c = random_case();
        for (const SensitivityCurve& curve : curves(c)) {
            const double theta = 0.05 + 0.9 * random_theta();
            const double step = 1e-5;
            const Eigen::ArrayXd between =
                (curve.posterior(theta + step) - curve.posterior(theta - step)) / (2.0 * step);
            const Eigen::ArrayXd slope = curve.derivative(theta);
            RC_ASSERT((between - slope).abs().maxCoeff() <= 1e-5 * (1.0 + slope.abs().maxCoeff()));
            RC_ASSERT(std::abs(slope.sum()) <= 1e-13 * (1.0 + slope.abs().maxCoeff()));
        }
    }));
}

TEST(SensitivityCurve, TiesWhereItSaysAndNowhereElse) {
    EXPECT_TRUE(rc::check([] {
        const Case c = random_case();
        const CauseIndex other{(c.owner.value + *rc::gen::inRange(1, 4)) % 4};
        for (const SensitivityCurve& curve : curves(c)) {
            const std::optional<double> theta = curve.tie(c.owner, other);
            RC_ASSERT(theta == curve.tie(other, c.owner));
            if (theta) {
                RC_ASSERT((*theta >= 0.0 && *theta <= 1.0));
                const Eigen::ArrayXd tied = curve.posterior(*theta);
                RC_ASSERT(near_rel(tied(c.owner.value), tied(other.value), 1e-10));
            } else {
                // The curve is monotone, so the same cause is ahead at both ends.
                const Eigen::ArrayXd zero = curve.posterior(0.0);
                const Eigen::ArrayXd one = curve.posterior(1.0);
                RC_ASSERT((zero(c.owner.value) < zero(other.value)) ==
                          (one(c.owner.value) < one(other.value)));
            }
            const CauseIndex third{(c.owner.value + 1) % 4};
            const CauseIndex fourth{(c.owner.value + 2) % 4};
            RC_ASSERT(!curve.tie(third, fourth).has_value());
        }
    }));
}

TEST(SensitivityCurve, ReachesItsEnds) {
    const Eigen::ArrayXd log_prior = array({0.5, 0.3, 0.2}).log();
    const Eigen::ArrayXd log_likelihood = array({0.02, 0.18, 0.21}).log();
    const SensitivityCurve prior = prior_curve(log_prior, log_likelihood, CauseIndex{1});
    EXPECT_EQ(prior.posterior(0.0)(1), 0.0);
    EXPECT_EQ(prior.posterior(1.0)(1), 1.0);
    EXPECT_EQ(prior.posterior(1.0)(0), 0.0);
    const SensitivityCurve seen = seen_cell_curve(log_prior, log_likelihood, CauseIndex{1}, 0.3);
    EXPECT_EQ(seen.posterior(0.0)(1), 0.0);
    EXPECT_LT(seen.posterior(1.0)(1), 1.0);
    const SensitivityCurve unseen = other_cell_curve(log_prior, log_likelihood, CauseIndex{1}, 0.5);
    EXPECT_GT(unseen.posterior(0.0)(1), prior.posterior(0.3)(1));
    EXPECT_EQ(unseen.posterior(1.0)(1), 0.0);
}

TEST(TornadoOrder, PutsTheWidestFirstAndKeepsTheOrderOfEquals) {
    const std::vector<Swing> bars = {{0.2, 0.3}, {0.9, 0.1}, {0.5, 0.5}, {0.3, 0.2}};
    EXPECT_EQ(tornado_order(bars), (std::vector<std::size_t>{1, 0, 3, 2}));
    EXPECT_TRUE(tornado_order({}).empty());
}

TEST(BeliefDistance, BoundsWhateverIsSeen) {
    EXPECT_TRUE(rc::check([] {
        const Case c = random_case();
        const Eigen::ArrayXd log_q = c.rows.row(0).transpose().log();
        const double distance = belief_distance(c.prior.log(), log_q);
        RC_ASSERT(near_abs(distance, belief_distance(log_q + 3.0, c.prior.log()), 1e-14));
        const Eigen::ArrayXd evidence = c.rows.row(2).transpose().log() * 20.0;
        const Eigen::ArrayXd before = softmax(c.prior.log() + evidence);
        const Eigen::ArrayXd after = softmax(log_q + evidence);
        for (Eigen::Index k = 0; k < before.size(); ++k) {
            const BeliefBounds reach = belief_bounds(Probability::of(before(k)), distance);
            RC_ASSERT((reach.low.value() * (1.0 - 1e-13) <= after(k) &&
                       after(k) <= reach.high.value() * (1.0 + 1e-13)));
        }
        // Tight: of the two causes whose ratios differ most, once nothing else is left.
        Eigen::Index most = 0;
        Eigen::Index least = 0;
        (log_q - c.prior.log()).maxCoeff(&most);
        (log_q - c.prior.log()).minCoeff(&least);
        Eigen::ArrayXd only = Eigen::ArrayXd::Constant(4, -infinity);
        only(most) = only(least) = 0.0;
        const double reached = softmax(log_q + only)(most);
        const BeliefBounds reach =
            belief_bounds(Probability::of(softmax(c.prior.log() + only)(most)), distance);
        RC_ASSERT(near_rel(reach.high.value(), reached, 1e-13));
        RC_ASSERT((relative_entropy(c.prior.log(), log_q) >= 0.0 &&
                   relative_entropy(c.prior.log(), log_q) <= distance + 1e-13));
    }));
}

TEST(ParameterSensitivity, RefusesWhatCannotBe) {
    const std::optional<Eigen::Index> none;
    const Eigen::ArrayXd even = array({0.0, 0.0});
    const CauseIndex first{0};
    const SensitivityCurve curve = prior_curve(even, even, first);
    expect_domain_error([&] { (void)curve.posterior(1.5); }, "SensitivityCurve::posterior", "theta", {}, 1.5,
                        "between 0 and 1");
    expect_domain_error([&] { (void)curve.derivative(0.0); }, "SensitivityCurve::derivative", "theta", {}, 0,
                        "> 0 and < 1");
    expect_domain_error([&] { (void)curve.tie(first, first); }, "SensitivityCurve::tie", "b", {}, 0,
                        "another cause than a");
    expect_domain_error([&] { (void)curve.tie(first, CauseIndex{2}); }, "SensitivityCurve::tie", "b", {}, 2,
                        "between 0 and 1");
    expect_domain_error(
        [&] {
            (void)prior_curve(array({0.0, -2000.0}), even, first);
        },
        "prior_curve", "prior", {}, 1, "> 0 and < 1");
    expect_domain_error([&] { (void)prior_curve(even, even, CauseIndex{2}); }, "prior_curve", "cause", {}, 2,
                        "between 0 and 1");
    expect_domain_error([&] { (void)seen_cell_curve(even, even, first, 1.0); }, "seen_cell_curve", "cell", {},
                        1, "> 0 and < 1");
    expect_domain_error([&] { (void)other_cell_curve(even, even, first, 0.0); }, "other_cell_curve", "cell",
                        {}, 0, "> 0 and < 1");
    expect_domain_error([&] { (void)seen_cell_curve(even, even, first, 0.5, 0.0); }, "seen_cell_curve",
                        "weight", {}, 0, "> 0 and <= 1");
    expect_domain_error(
        [&] {
            (void)seen_cell_curve(even, array({nan, 0.0}), first, 0.5);
        },
        "seen_cell_curve", "log_likelihood", {0, none}, nan, "finite");
    expect_domain_error([&] { (void)swing(curve, 0.6, 0.4, first); }, "swing", "high", {}, 0.4,
                        "between 0.6 and 1");
    expect_domain_error([&] { (void)swing(curve, 0.4, 0.6, CauseIndex{2}); }, "swing", "target", {}, 2,
                        "between 0 and 1");
    expect_domain_error([&] { (void)belief_distance(even, array({0.0})); }, "belief_distance", "log_q size",
                        {}, 1, "2");
    expect_domain_error(
        [&] {
            (void)belief_distance(even, array({0.0, -infinity}));
        },
        "belief_distance", "log_q", {1, none}, -infinity, "finite");
    expect_domain_error(
        [&] {
            (void)belief_distance(array({1e308, -1e308}), array({-1e308, 1e308}));
        },
        "belief_distance", "distance", {}, infinity, "finite: the difference overflows");
    expect_domain_error([&] { (void)belief_bounds(Probability::of(0.5), -1.0); }, "belief_bounds", "distance",
                        {}, -1, "finite and >= 0");
    expect_domain_error([&] { (void)relative_entropy(array({nan}), array({0.0})); }, "relative_entropy",
                        "log_p", {0, none}, nan, "finite");
}

}  // namespace
