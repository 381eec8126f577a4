// SPDX-License-Identifier: Apache-2.0
// What must not compile, as facts the compiler checks. Each "not" stands beside a "yes", so that a misspelt
// test fails.

#include <type_traits>

#include "steelyard/engine/index.hpp"
#include "steelyard/engine/log_weight.hpp"
#include "steelyard/engine/probability.hpp"

namespace {

using steelyard::engine::BandIndex;
using steelyard::engine::CauseIndex;
using steelyard::engine::FindingIndex;
using steelyard::engine::LogOdds;
using steelyard::engine::LogWeight;
using steelyard::engine::Probability;

template <class A, class B>
concept addable = requires(A a, B b) {
    a + b;
};
template <class A, class B>
concept subtractable = requires(A a, B b) {
    a - b;
};
template <class A, class B>
concept multipliable = requires(A a, B b) {
    a* b;
};
template <class A, class B>
concept comparable = requires(A a, B b) {
    a < b;
};
template <class A, class B>
concept equatable = requires(A a, B b) {
    a == b;
};

template <class T>
constexpr bool is_small_value = std::is_trivially_copyable_v<T> &&
                                sizeof(T) <= sizeof(double) && std::is_copy_assignable_v<T>;
static_assert(is_small_value<Probability> && is_small_value<LogOdds> && is_small_value<LogWeight>);
static_assert(is_small_value<CauseIndex> && is_small_value<FindingIndex> && is_small_value<BandIndex>);

// An object that exists was checked: no undefined state, no unchecked way in, no silent way out.
template <class T>
constexpr bool is_checked_value =
    !std::is_default_constructible_v<T> && !std::is_constructible_v<T, double> &&
    !std::is_convertible_v<double, T> && !std::is_convertible_v<T, double>;
static_assert(is_checked_value<Probability> && is_checked_value<LogOdds> && is_checked_value<LogWeight>);

// Weights add; a weight moves log odds; a difference of log odds is a weight.
static_assert(std::is_same_v<decltype(LogWeight::nats(1) + LogWeight::nats(1)), LogWeight>);
static_assert(std::is_same_v<decltype(LogWeight::nats(1) - LogWeight::nats(1)), LogWeight>);
static_assert(std::is_same_v<decltype(LogOdds::nats(1) + LogWeight::nats(1)), LogOdds>);
static_assert(std::is_same_v<decltype(LogOdds::nats(1) - LogWeight::nats(1)), LogOdds>);
static_assert(std::is_same_v<decltype(LogOdds::nats(1) - LogOdds::nats(1)), LogWeight>);
static_assert(!addable<LogOdds, LogOdds>);
static_assert(!addable<LogWeight, LogOdds>);  // the odds come first: one spelling
static_assert(!addable<LogWeight, double> && !addable<double, LogWeight>);
static_assert(!subtractable<LogWeight, LogOdds>);
static_assert(!multipliable<LogWeight, double> && !multipliable<LogWeight, LogWeight>);

// Nothing adds to a probability.
static_assert(!addable<Probability, Probability> && !addable<Probability, LogWeight> &&
              !addable<Probability, double>);
static_assert(!subtractable<Probability, Probability> && !multipliable<Probability, Probability>);

// Only like is compared with like.
static_assert(comparable<Probability, Probability> && comparable<LogOdds, LogOdds> &&
              comparable<LogWeight, LogWeight>);
static_assert(!comparable<Probability, LogOdds> && !comparable<LogOdds, LogWeight> &&
              !comparable<Probability, double>);

// A place among causes is not a place among bands.
static_assert(equatable<CauseIndex, CauseIndex> && comparable<BandIndex, BandIndex>);
static_assert(!equatable<CauseIndex, BandIndex> && !equatable<CauseIndex, FindingIndex> &&
              !equatable<FindingIndex, BandIndex>);
static_assert(!std::is_convertible_v<CauseIndex, BandIndex> &&
              !std::is_constructible_v<CauseIndex, FindingIndex>);
static_assert(!std::is_convertible_v<int, CauseIndex> && !std::is_convertible_v<CauseIndex, Eigen::Index>);
static_assert(!addable<CauseIndex, CauseIndex> && !addable<CauseIndex, int>);
static_assert(CauseIndex{1} < CauseIndex{2} && BandIndex{3} == BandIndex{3} &&
              FindingIndex{1} != FindingIndex{0});

}  // namespace
