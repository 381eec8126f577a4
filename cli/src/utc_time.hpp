// SPDX-License-Identifier: Apache-2.0
#pragma once
// Times as a casebook keeps them: UTC, ISO 8601, to the second.

#include <optional>
#include <string>
#include <string_view>

namespace steelyard::cli {

/// `2026-12-01T09:30:00Z` of now.
std::string utc_now();
/// Whole days from one such time to another, rounded down; empty when one is no such time.
std::optional<int> days_between(std::string_view from, std::string_view to);

}  // namespace steelyard::cli
