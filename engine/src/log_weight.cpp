// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/log_weight.hpp"

#include <cmath>
#include <limits>

#include "steelyard/engine/domain_error.hpp"

namespace steelyard::engine {
namespace {

constexpr double infinity = std::numeric_limits<double>::infinity();

}  // namespace

LogWeight LogWeight::nats(double value) {
    check_between("LogWeight::nats", "value", value, -infinity, infinity);
    return LogWeight(value);
}

LogWeight LogWeight::bits(double value) {
    check_between("LogWeight::bits", "value", value, -infinity, infinity);
    return LogWeight(value * nats_per_bit);
}

LogWeight LogWeight::bans(double value) {
    check_between("LogWeight::bans", "value", value, -infinity, infinity);
    const double nats = value * nats_per_ban;
    check_between("LogWeight::bans", "value in nats", nats, -infinity, infinity);
    return LogWeight(nats);
}

LogWeight LogWeight::decibans(double value) {
    check_between("LogWeight::decibans", "value", value, -infinity, infinity);
    return LogWeight(value * nats_per_deciban);
}

LogWeight LogWeight::of_ratio(double ratio) {
    check_positive("LogWeight::of_ratio", "ratio", ratio);
    return LogWeight(std::log(ratio));
}

double LogWeight::to_ratio() const {
    return std::exp(nats_);
}

LogWeight LogWeight::discounted(double factor) const {
    check_between("LogWeight::discounted", "factor", factor, 0.0, 1.0);
    return LogWeight(nats_ * factor);
}

LogWeight operator+(LogWeight left, LogWeight right) {
    return LogWeight::nats(left.to_nats() + right.to_nats());
}

LogWeight operator-(LogWeight left, LogWeight right) {
    return LogWeight::nats(left.to_nats() - right.to_nats());
}

LogOdds operator+(LogOdds odds, LogWeight weight) {
    return LogOdds::nats(odds.to_nats() + weight.to_nats());
}

LogOdds operator-(LogOdds odds, LogWeight weight) {
    return LogOdds::nats(odds.to_nats() - weight.to_nats());
}

LogWeight operator-(LogOdds after, LogOdds before) {
    return LogWeight::nats(after.to_nats() - before.to_nats());
}

}  // namespace steelyard::engine
