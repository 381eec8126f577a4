// SPDX-License-Identifier: Apache-2.0
#pragma once
// Numbers typed as options, with the mistakes told in one way.

#include <fmt/format.h>

#include <charconv>
#include <string>

#include "open_inputs.hpp"
#include "steelyard/cli/terminal.hpp"

namespace steelyard::cli {

/// The number that is all of `text`. @param must_be  what it must be, in words   @throws UsageError
template <class Number>
Number number_in_option(const char* option, const std::string& text, Number low, Number high,
                        const std::string& must_be) {
    Number value{};
    const auto [end, error] = std::from_chars(text.data(), text.data() + text.size(), value);
    if (error != std::errc() || end != text.data() + text.size() || !(value >= low && value <= high)) {
        throw UsageError(fmt::format("{} {}: must be {}", option, visible(text), must_be));
    }
    return value;
}

}  // namespace steelyard::cli
