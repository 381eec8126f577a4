// SPDX-License-Identifier: Apache-2.0
#pragma once
// Which cause, which finding, which band. Three types rather than three integers, so that a cause cannot be
// used where a band is meant. An index is only a place: the function that takes it checks it against the
// array it points into.

#include <Eigen/Core>
#include <compare>

namespace steelyard::engine {

/// A cause, counted from 0 in the order of the cause set.
struct CauseIndex {
    Eigen::Index value = 0;
    friend constexpr auto operator<=>(CauseIndex, CauseIndex) = default;
};

/// A finding, counted from 0 in the order of the caller's arrays.
struct FindingIndex {
    Eigen::Index value = 0;
    friend constexpr auto operator<=>(FindingIndex, FindingIndex) = default;
};

/// A band of a finding, counted from 0 from the lowest value up (or in the order of a feature's levels).
struct BandIndex {
    Eigen::Index value = 0;
    friend constexpr auto operator<=>(BandIndex, BandIndex) = default;
};

}  // namespace steelyard::engine
