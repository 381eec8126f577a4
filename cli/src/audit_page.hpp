// SPDX-License-Identifier: Apache-2.0
#pragma once
// Small words that the parts of an audit's text share.

#include <cstdint>
#include <optional>
#include <string>

#include "report_page.hpp"
#include "steelyard/cli/audit.hpp"

namespace steelyard::cli {

/// `1 patient`, `412 patients`, `1,000,000 patients`.
std::string patients_of(std::uint64_t count);
/// `1,000,000`.
std::string grouped(std::uint64_t count);
std::string capital(std::string text);
/// A cause's title without its bracket.
std::string short_name(const AuditedCause& cause);
/// Mean posterior of the leading cause.
double mean_leader(const engine::AuditFigures& figures);
/// `78 % (71 to 84)`; `-` when there is none.
std::string percent_with_interval(const std::optional<engine::IntervalEstimate>& estimate);
/// `0.79 (0.70 to 0.89)`; `-` when there is none.
std::string number_with_interval(double value, const std::optional<engine::BootstrapInterval>& interval,
                                 int decimals);
std::string number_with_interval(const std::optional<engine::IntervalEstimate>& estimate, int decimals);

}  // namespace steelyard::cli
