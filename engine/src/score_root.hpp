// SPDX-License-Identifier: Apache-2.0
#pragma once
// The one root of a decreasing score, by Newton's method kept inside a bracket.

#include <cmath>
#include <limits>

namespace steelyard::engine {

/// A score and minus its derivative.
struct ScoreAndInformation {
    double score = 0.0;
    double information = 0.0;
};

/// Root of a decreasing score on the whole line. Steps that leave the bracket known so far are replaced by
/// halving it (or, while one side is open, by going on in steps that double).
/// @param at  ScoreAndInformation at(double x); a root must exist
template <class Function>
double root_of_score(const Function& at, double start) {
    double low = -std::numeric_limits<double>::infinity();
    double high = std::numeric_limits<double>::infinity();
    double x = start;
    double stride = 1.0;
    for (int step = 0; step < 300; ++step) {
        const ScoreAndInformation here = at(x);
        if (here.score == 0.0) {
            return x;
        }
        (here.score > 0.0 ? low : high) = x;
        double next = x + here.score / here.information;
        if (!(next > low && next < high)) {
            const bool open = std::isinf(low) || std::isinf(high);
            next = open ? x + (here.score > 0.0 ? stride : -stride) : low + 0.5 * (high - low);
            stride *= 2.0;
        }
        if (std::abs(next - x) <= 4e-16 * std::abs(x) || next == low || next == high) {
            return next;
        }
        x = next;
    }
    return x;
}

}  // namespace steelyard::engine
