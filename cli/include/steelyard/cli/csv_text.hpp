// SPDX-License-Identifier: Apache-2.0
#pragma once
// Text as a field of a CSV file (RFC 4180).

#include <string>
#include <string_view>

namespace steelyard::cli {

/// A field, quoted where it must be. Text from outside that a spreadsheet would take for a formula (it begins
/// with = + - @, a tab or a carriage return) gets an apostrophe in front, so that it stays text. Control
/// characters other than a line break are shown as visible escapes.
std::string csv_field(std::string_view text);

}  // namespace steelyard::cli
