// SPDX-License-Identifier: Apache-2.0
#pragma once
// Odds against the rest, stated cause by cause, need not agree with each other: each stands for a
// probability, and the probabilities of all causes must sum to 1.

#include <string>
#include <vector>

#include "steelyard/priors/prior_set.hpp"

namespace steelyard::priors::detail {

/// How far the probabilities of odds against the rest may sum from 1 before they are refused.
inline constexpr double coherence_tolerance = 0.02;

/// Sum of o / (1 + o) over the causes [1].
double probability_sum(const std::vector<PriorCause>& causes);

/// Whether a sum of probabilities is 1 within the tolerance.
bool coheres(double sum) noexcept;

/// The nearest coherent set in the same proportions as YAML to paste over `causes`: every probability divided
/// by their sum, as odds of three significant digits, on one line. Ranges that no longer hold the new odds
/// are left out; basis, source and note are kept.
std::string nearest_coherent_yaml(const std::vector<PriorCause>& causes);

}  // namespace steelyard::priors::detail
