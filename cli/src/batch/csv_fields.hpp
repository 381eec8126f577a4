// SPDX-License-Identifier: Apache-2.0
#pragma once
// One record of a CSV file as fields (RFC 4180).

#include <deque>
#include <string>
#include <string_view>
#include <vector>

namespace steelyard::cli {

/// Takes records apart, one after another; the fields last until the next.
class CsvFields {
  public:
    /// Takes the first record off `text`, its line end included.
    /// @param no_quotes  there is no quote in it: fields need not be searched for one
    /// @returns false  when a field is quoted wrongly: text before or after its quotes, or no closing one
    bool take(std::string_view& text, bool no_quotes = false);

    const std::vector<std::string_view>& fields() const noexcept { return fields_; }
    /// Where each field begins in the text (at its quote, where it is quoted).
    const std::vector<const char*>& starts() const noexcept { return starts_; }

  private:
    bool take_quoted(std::string_view& text);

    std::vector<std::string_view> fields_;
    std::vector<const char*> starts_;
    std::deque<std::string> unescaped_;  ///< fields in which quotes were doubled
};

}  // namespace steelyard::cli
