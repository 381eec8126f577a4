// SPDX-License-Identifier: Apache-2.0
#pragma once
// Naming a set of files by its content, so that a report can say exactly which tables and priors it came
// from.

#include <string>
#include <string_view>
#include <utility>
#include <vector>

namespace steelyard::document {

/// A file of a set: its name inside the set and its text.
using NamedText = std::pair<std::string, std::string>;

/// `sha256:` and 64 hexadecimal digits (SHA-256, FIPS 180-4) over the files sorted by name. Each enters as
/// its name, a zero byte, its length in decimal digits, a zero byte and its bytes, so that a folder and its
/// copy built into the program have the same digest.
std::string digest(std::vector<NamedText> files);

}  // namespace steelyard::document
