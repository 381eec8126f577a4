// SPDX-License-Identifier: Apache-2.0
#pragma once
// Text for people: escaped, wrapped to a width, coloured only where colour is wanted.

#include <string>
#include <string_view>

namespace steelyard::cli {

/// The width reports are laid out for.
inline constexpr std::size_t page_width = 80;

/// Text from outside made harmless on a terminal: control characters, escape sequences and direction marks
/// become visible escapes (`\x1b`, `\u202e`).
std::string visible(std::string_view text);

/// Number of code points: what a column of plain text takes up.
std::size_t text_width(std::string_view text);

/// Pads on the right (or left) with spaces to a width in code points; longer text is returned as it is.
std::string padded(std::string_view text, std::size_t width);
std::string padded_left(std::string_view text, std::size_t width);

/// Breaks at spaces so that no line exceeds `width`; the first line begins with `first`, the others with
/// `rest`. A single longer word is broken where it must be. Ends with a newline.
std::string wrapped(std::string_view text, std::string_view first, std::string_view rest,
                    std::size_t width = page_width);

enum class Colour { automatic, always, never };

/// Whether to colour what goes to this file descriptor: a terminal, and neither NO_COLOR nor TERM=dumb set.
bool wants_colour(Colour choice, int file_descriptor);

/// Emphasis for terminals; the text itself when colour is off.
std::string emphasised(std::string_view text, bool colour);
std::string alarming(std::string_view text, bool colour);

}  // namespace steelyard::cli
