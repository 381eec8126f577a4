// SPDX-License-Identifier: Apache-2.0
#include "utc_time.hpp"

#include <fmt/chrono.h>
#include <fmt/format.h>

#include <charconv>
#include <chrono>
#include <ctime>

namespace steelyard::cli {
namespace {

/// The day of a time as utc_now() writes it.
std::optional<std::chrono::sys_seconds> time_from(std::string_view text) {
    constexpr std::string_view form = "0000-00-00T00:00:00Z";
    if (text.size() != form.size()) {
        return std::nullopt;
    }
    for (std::size_t i = 0; i < form.size(); ++i) {
        const bool digit = text[i] >= '0' && text[i] <= '9';
        if (form[i] == '0' ? !digit : text[i] != form[i]) {
            return std::nullopt;
        }
    }
    const auto number = [&](std::size_t at, std::size_t length) {
        int value = 0;
        std::from_chars(text.data() + at, text.data() + at + length, value);
        return value;
    };
    const std::chrono::year_month_day day(std::chrono::year(number(0, 4)),
                                          std::chrono::month(static_cast<unsigned>(number(5, 2))),
                                          std::chrono::day(static_cast<unsigned>(number(8, 2))));
    if (!day.ok()) {
        return std::nullopt;
    }
    return std::chrono::sys_days(day) + std::chrono::hours(number(11, 2)) +
           std::chrono::minutes(number(14, 2)) + std::chrono::seconds(number(17, 2));
}

}  // namespace

std::string utc_now() {
    return fmt::format("{:%Y-%m-%dT%H:%M:%SZ}", fmt::gmtime(std::time(nullptr)));
}

std::optional<int> days_between(std::string_view from, std::string_view to) {
    const auto begin = time_from(from);
    const auto end = time_from(to);
    if (!begin || !end) {
        return std::nullopt;
    }
    return static_cast<int>(std::chrono::floor<std::chrono::days>(*end - *begin).count());
}

}  // namespace steelyard::cli
