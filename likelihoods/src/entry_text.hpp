// SPDX-License-Identifier: Apache-2.0
#pragma once
// The text of one entry taken apart: comparator, number, and what follows the number.

#include <string>
#include <string_view>

#include "steelyard/document/diagnostic.hpp"

namespace steelyard::likelihoods::detail {

enum class Comparator { none, less, at_most, greater, at_least };

struct EntryText {
    Comparator comparator{};
    double number = 0.0;
    std::string_view as_read;  ///< comparator and number as written
    std::string_view unit;     ///< the rest, trimmed; may be empty
};

/// Why a text is no entry.
struct EntryFault {
    document::Code code{};
    std::string message;  ///< without the entry's name: `"2,8 mmol/L" is not a number`
    std::string hint;
};

/// Outer blanks (space, tab, no-break space) removed.
std::string_view trimmed(std::string_view text);

/// Takes a text such as `2.8 mmol/L`, `2.8mmol/L`, `<5 mmol/L` or `>= 7` apart. The number is read
/// locale-free; a decimal comma, a range, `nan` and `inf` are refused with words. @returns whether it is an
/// entry; `fault` says why not
bool read_entry_text(std::string_view text, EntryText& entry, EntryFault& fault);

}  // namespace steelyard::likelihoods::detail
