// SPDX-License-Identifier: Apache-2.0
#pragma once
// Numbers as people read them. A percentage never says 0 or 100; a minus sign is a hyphen so that columns
// line up.

#include <string>

#include "steelyard/likelihoods/panel.hpp"

namespace steelyard::cli {

/// `<1 %`, `37 %`, `>99 %`.
std::string percent(double probability);

/// The step, in percentage points, to which a posterior may be rounded so that it says no more than its
/// interval supports: 1 when the interval is at most 5 points wide, 5 up to 30 points, 10 beyond. @param low,
/// high  its 95 % interval
int supported_step(double low, double high);

/// A probability rounded to a step: `40 %`; `<5 %` and `>95 %` at the ends, never 0 or 100.
std::string percent_in_steps(double probability, int step);

/// The shortest decimal that reads back, cut to `digits` significant digits: `2.8`, `0.123`, `1030`.
std::string plain(double value, int digits = 4);

/// With sign and a fixed number of decimals: `+5.1`, `-0.3`, `0.0`.
std::string signed_fixed(double value, int decimals);

/// A value or what is known of it: `2.8`, `below 5`, `above 20`, `3 to 5`.
std::string in_words(const likelihoods::Interval& interval, int digits = 6);

/// A unit as shown to people: `mmHg`, `mL/min/1.73 m2`; empty for pH and plain ratios.
std::string unit_shown(std::string_view ucum);

/// nats to decibans.
double decibans(double nats);

}  // namespace steelyard::cli
