// SPDX-License-Identifier: Apache-2.0
#pragma once
// A tally as a file, `steelyard.tally/1`: a head and one line for each cell, in one order only, so that equal
// tallies are equal files. docs/formats.md describes it.

#include <cstddef>
#include <functional>
#include <iosfwd>
#include <optional>
#include <string>
#include <string_view>

#include "steelyard/cli/tally.hpp"
#include "steelyard/document/diagnostic.hpp"

namespace steelyard::cli {

/// Puts up to `most` bytes at `to` and tells how many; 0 at the end.
using ReadBytes = std::function<std::size_t(char* to, std::size_t most)>;
ReadBytes bytes_of(std::istream& in);

/// Whether a text that begins like this is meant as a tally, of whatever version.
bool looks_like_tally(std::string_view beginning) noexcept;

/// Hands the file over piece by piece.
void write_tally(const Tally& tally, const std::function<void(std::string_view)>& write);
std::string tally_text(const Tally& tally);
/// Writes the file whole or not at all. @throws OutputError
void save_tally(const Tally& tally, const std::string& path);

/// Reads a tally strictly. Faults have the place file:line:column; after any there is no tally.
std::optional<Tally> read_tally(const ReadBytes& bytes, const std::string& file,
                                document::Diagnostics& faults);
std::optional<Tally> read_tally(std::string_view text, const std::string& file,
                                document::Diagnostics& faults);
/// The same from a file, or from standard input for `-`.
std::optional<Tally> load_tally(const std::string& path, document::Diagnostics& faults);

}  // namespace steelyard::cli
