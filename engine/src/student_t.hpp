// SPDX-License-Identifier: Apache-2.0
#pragma once
// Student's t in long double, for bodies that go on computing before they round.

namespace steelyard::engine {

/// P(T > t) for t >= 0, at most 1/2. Relative error below 1e-14 for degrees up to 1e4 where long double has
/// 64 bits.
long double student_t_tail(long double t, long double degrees);

/// P(low < T <= high) for low <= high, infinities allowed: the difference of the two lower tails or of the
/// two upper tails, whichever are small, and the complement of both when the interval spans 0.
long double student_t_between(long double low, long double high, long double degrees);

}  // namespace steelyard::engine
