// SPDX-License-Identifier: Apache-2.0
#pragma once
// Whether a value meets the limits of a condition of use.

#include "band_edges.hpp"
#include "steelyard/likelihoods/table_set.hpp"

namespace steelyard::likelihoods::detail {

enum class Verdict { holds, fails, unknown };

/// Of a whole interval: unknown when part of it meets the limits and part does not.
inline Verdict check_value(const Condition& condition, const Interval& value) {
    const auto combine = [](bool low_end, bool high_end) {
        if (low_end == high_end) {
            return low_end ? Verdict::holds : Verdict::fails;
        }
        return Verdict::unknown;
    };
    // `value >= limit` at both ends. An open upper end on the limit never reaches it.
    const auto at_least = [&](double limit) {
        return combine(at_or_above(value.low, limit),
                       value.high_open ? strictly_above(value.high, limit) : at_or_above(value.high, limit));
    };
    // `value > limit` at both ends. An open lower end on the limit is above it.
    const auto above = [&](double limit) {
        return combine(value.low_open ? at_or_above(value.low, limit) : strictly_above(value.low, limit),
                       strictly_above(value.high, limit));
    };
    const auto negated = [](Verdict verdict) {
        if (verdict == Verdict::unknown) {
            return verdict;
        }
        return verdict == Verdict::holds ? Verdict::fails : Verdict::holds;
    };
    Verdict all = Verdict::holds;
    const auto settle = [&](Verdict verdict) {
        if (all != Verdict::fails && verdict != Verdict::holds) {
            all = verdict;
        }
    };
    if (condition.at_least) {
        settle(at_least(*condition.at_least));
    }
    if (condition.above) {
        settle(above(*condition.above));
    }
    if (condition.at_most) {
        settle(negated(above(*condition.at_most)));
    }
    if (condition.below) {
        settle(negated(at_least(*condition.below)));
    }
    return all;
}

}  // namespace steelyard::likelihoods::detail
