// SPDX-License-Identifier: Apache-2.0
#include "binomial_sampler.hpp"

#include <algorithm>
#include <cmath>

#include "steelyard/engine/counter_random.hpp"

namespace steelyard::engine {
namespace {

/// ln k! less Stirling's formula for it: (k + 1/2) ln(k + 1) - (k + 1) + ln(2 pi) / 2.
double stirling_rest(double k) {
    static constexpr std::array<double, 10> table = {
        0.08106146679532726,  0.04134069595540929, 0.02767792568499834, 0.02079067210376509,
        0.01664469118982119,  0.01387612882307075, 0.01189670994589177, 0.01041126526197209,
        0.009255462182712733, 0.008330563433362871};
    if (k < 10.0) {
        return table[static_cast<std::size_t>(k)];
    }
    const double square = (k + 1.0) * (k + 1.0);
    return (1.0 / 12.0 - (1.0 / 360.0 - 1.0 / 1260.0 / square) / square) / (k + 1.0);
}

/// P(x) / P(mode) of the binomial law.
double height(double trials, double p, double x) {
    const double odds = p / (1.0 - p);
    const double mode = std::floor((trials + 1.0) * p);
    return std::exp((mode + 0.5) * std::log((mode + 1.0) / (odds * (trials - mode + 1.0))) +
                    (trials + 1.0) * std::log((trials - mode + 1.0) / (trials - x + 1.0)) +
                    (x + 0.5) * std::log(odds * (trials - x + 1.0) / (x + 1.0)) + stirling_rest(mode) +
                    stirling_rest(trials - mode) - stirling_rest(x) - stirling_rest(trials - x));
}

}  // namespace

BinomialSampler::BinomialSampler(std::uint64_t seed, std::uint32_t stream) : seed_(seed), stream_(stream) {}

std::uint32_t BinomialSampler::word() {
    if (used_ == 4) {
        words_ = philox_block(
            {static_cast<std::uint32_t>(block_), stream_, static_cast<std::uint32_t>(block_ >> 32U), 0U},
            {static_cast<std::uint32_t>(seed_), static_cast<std::uint32_t>(seed_ >> 32U)});
        ++block_;
        used_ = 0;
    }
    return words_[used_++];
}

double BinomialSampler::uniform() {
    const std::uint64_t high = word() >> 5U;  // 27 bits
    const std::uint64_t low = word() >> 6U;   // 26 bits
    return (static_cast<double>((high << 26U) | low) + 0.5) * 0x1p-53;
}

double BinomialSampler::coarse() {
    return (static_cast<double>(word()) + 0.5) * 0x1p-32;
}

double BinomialSampler::draw(double trials, double p) {
    if (trials <= 0.0 || p <= 0.0) {
        return 0.0;
    }
    if (p >= 1.0) {
        return trials;
    }
    if (p > 0.5) {
        return trials - draw(trials, 1.0 - p);
    }
    return trials * p < 10.0 ? by_inversion(trials, p) : by_rejection(trials, p);
}

double BinomialSampler::by_inversion(double trials, double p) {
    const double odds = p / (1.0 - p);
    double left = uniform();
    double mass = std::exp(trials * std::log1p(-p));  // at least e^-14
    double x = 0.0;
    while (left > mass && x < trials) {
        left -= mass;
        x += 1.0;
        mass *= odds * (trials - x + 1.0) / x;
        if (mass == 0.0) {  // past everything that a double can hold
            break;
        }
    }
    return x;
}

double BinomialSampler::by_rejection(double trials, double p) {
    const double sd = std::sqrt(trials * p * (1.0 - p));
    const double b = 1.15 + 2.53 * sd;
    const double a = -0.0873 + 0.0248 * b + 0.01 * p;
    const double centre = trials * p + 0.5;
    const double inner = 0.92 - 4.2 / b;
    for (;;) {
        const double u = coarse() - 0.5;
        const double v = coarse();
        const double near = 0.5 - std::abs(u);
        const double place = (2.0 * a / near + b) * u + centre;
        if (place < 0.0 || place >= trials + 1.0) {
            continue;
        }
        const auto x =
            static_cast<double>(static_cast<std::int64_t>(place));  // the floor: place is not negative
        if (near >= 0.07 && v <= inner) {
            return x;
        }
        if (v <= height(trials, p, x) * (a / (near * near) + b) / ((2.83 + 5.1 / b) * sd)) {
            return x;
        }
    }
}

}  // namespace steelyard::engine
