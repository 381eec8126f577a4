// SPDX-License-Identifier: Apache-2.0
#include "audit_page.hpp"

#include <fmt/format.h>

#include <cctype>
#include <cmath>

#include "steelyard/cli/numbers.hpp"

namespace steelyard::cli {

std::string grouped(std::uint64_t count) {
    std::string digits = std::to_string(count);
    for (std::size_t place = digits.size(); place > 3;) {
        place -= 3;
        digits.insert(place, 1, ',');
    }
    return digits;
}

std::string patients_of(std::uint64_t count) {
    return count == 1 ? "1 patient" : grouped(count) + " patients";
}

std::string capital(std::string text) {
    if (!text.empty()) {
        text.front() = static_cast<char>(std::toupper(static_cast<unsigned char>(text.front())));
    }
    return text;
}

std::string short_name(const AuditedCause& cause) {
    WeighedCause named;
    named.title = cause.title;
    return short_title(named);
}

double mean_leader(const engine::AuditFigures& figures) {
    double sum = 0.0;
    for (const engine::ReliabilityBin& bin : figures.leader.bins) {
        sum += bin.count * bin.mean_forecast;
    }
    return sum / figures.patients;
}

std::string percent_with_interval(const std::optional<engine::IntervalEstimate>& estimate) {
    if (!estimate) {
        return "-";
    }
    const auto whole = [](double share) { return fmt::format("{:.0f}", 100.0 * share); };
    return fmt::format("{} % ({} to {})", whole(estimate->value), whole(estimate->low),
                       whole(estimate->high));
}

std::string number_with_interval(double value, const std::optional<engine::BootstrapInterval>& interval,
                                 int decimals) {
    if (std::isnan(value)) {
        return "-";
    }
    if (!interval) {
        return fmt::format("{:.{}f}", value, decimals);
    }
    return fmt::format("{:.{}f} ({:.{}f} to {:.{}f})", value, decimals, interval->low, decimals,
                       interval->high, decimals);
}

std::string number_with_interval(const std::optional<engine::IntervalEstimate>& estimate, int decimals) {
    if (!estimate) {
        return "-";
    }
    return fmt::format("{:.{}f} ({:.{}f} to {:.{}f})", estimate->value, decimals, estimate->low, decimals,
                       estimate->high, decimals);
}

}  // namespace steelyard::cli
