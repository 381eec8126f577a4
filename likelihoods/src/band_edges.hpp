// SPDX-License-Identifier: Apache-2.0
#pragma once
// Comparing values with edges and limits. A value exactly on an edge belongs to the upper band.
//
// 5.4 mg/dL of phosphate is 1.7437... mmol/L, and 32.3 + 20.3 - 52.6 is -7.1e-15 in floating point: a value
// that the laboratory would say is on the edge can land a hair beside it. So a value within 1e-9 (relative to
// the edge, and to 1 near zero) counts as on the edge. That is a million times the rounding of such sums and
// far below what any laboratory reports, so no two printed values are ever confused. Conditions compare in
// the same way.

#include <Eigen/Core>
#include <algorithm>
#include <cmath>
#include <span>

#include "steelyard/likelihoods/panel.hpp"

namespace steelyard::likelihoods::detail {

inline double edge_tolerance(double edge) {
    return 1e-9 * std::max(1.0, std::abs(edge));
}

inline bool at_or_above(double value, double edge) {
    return value >= edge - edge_tolerance(edge);
}
inline bool strictly_above(double value, double edge) {
    return value > edge + edge_tolerance(edge);
}

/// The first and last band that an interval touches; equal when it lies wholly inside one.
struct BandSpan {
    Eigen::Index first = 0, last = 0;
    bool single() const noexcept { return first == last; }
    std::size_t count() const noexcept { return static_cast<std::size_t>(last - first + 1); }
};

/// @param edges  increasing
inline BandSpan bands_of(const Interval& value, std::span<const double> edges) {
    BandSpan span;
    for (const double edge : edges) {
        span.first += at_or_above(value.low, edge) ? 1 : 0;
        // An open upper end on an edge (`<5`) does not reach the band above it.
        const bool reaches =
            value.high_open ? strictly_above(value.high, edge) : at_or_above(value.high, edge);
        span.last += reaches ? 1 : 0;
    }
    span.last = std::max(span.first, span.last);
    return span;
}

}  // namespace steelyard::likelihoods::detail
