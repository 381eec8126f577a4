// SPDX-License-Identifier: Apache-2.0
#pragma once
// The parts of `steelyard.report/1` that tell how sure the answer is.

#include <nlohmann/json.hpp>

#include "steelyard/cli/sensitivity.hpp"

namespace steelyard::cli {

/// Adds `low`, `high`, `leads` and their errors to each entry of `causes`.
void add_intervals(const Sensitivity& sensitivity, nlohmann::ordered_json& causes);

nlohmann::ordered_json sensitivity_json(const Weighing& weighing, const Sensitivity& sensitivity);
nlohmann::ordered_json fit_json(const Weighing& weighing, const Fit& fit);
nlohmann::ordered_json next_json(const Weighing& weighing, const likelihoods::TableSet& tables,
                                 const Sensitivity& sensitivity);
/// The best two findings to make together, and the best first one with its seconds; null when there are none.
nlohmann::ordered_json next_pair_json(const Sensitivity& sensitivity);

}  // namespace steelyard::cli
