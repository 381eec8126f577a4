// SPDX-License-Identifier: Apache-2.0
#pragma once
// Whether bytes are text at all.

#include <string_view>

namespace steelyard::cli {

enum class TextFault { none, nul, utf16, not_utf8 };

/// The first thing that makes these bytes no UTF-8 text.
TextFault text_fault(std::string_view bytes);
std::string_view text_fault_in_words(TextFault fault);

/// Whether every byte is a printable or space character of ASCII, tab, or line end: the usual case, told
/// quickly.
bool is_plain_ascii(std::string_view bytes);

/// Outer spaces and tabs removed.
std::string_view without_blanks(std::string_view text);

}  // namespace steelyard::cli
