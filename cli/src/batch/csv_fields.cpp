// SPDX-License-Identifier: Apache-2.0
#include "csv_fields.hpp"

#include <algorithm>

namespace steelyard::cli {

bool CsvFields::take(std::string_view& text, bool no_quotes) {
    fields_.clear();
    starts_.clear();
    unescaped_.clear();
    bool well_formed = true;
    while (true) {
        starts_.push_back(text.data());
        if (!text.empty() && text.front() == '"') {
            well_formed = take_quoted(text) && well_formed;
        } else {
            std::size_t end = 0;
            while (end < text.size() && text[end] != ',' && text[end] != '\n') {
                ++end;
            }
            std::string_view field = text.substr(0, end);
            const bool last = end == text.size() || text[end] == '\n';
            if (last && field.ends_with('\r')) {
                field.remove_suffix(1);
            }
            well_formed = well_formed && (no_quotes || field.find('"') == std::string_view::npos);
            fields_.push_back(field);
            text.remove_prefix(end);
        }
        if (text.empty()) {
            return well_formed;
        }
        const bool last = text.front() == '\n';
        text.remove_prefix(1);
        if (last) {
            return well_formed;
        }
    }
}

bool CsvFields::take_quoted(std::string_view& text) {
    text.remove_prefix(1);
    std::size_t end = 0;
    bool doubled = false;
    while (end < text.size()) {
        if (text[end] != '"') {
            ++end;
        } else if (end + 1 < text.size() && text[end + 1] == '"') {
            doubled = true;
            end += 2;
        } else {
            break;
        }
    }
    std::string_view field = text.substr(0, end);
    bool well_formed = end < text.size();
    if (doubled) {
        std::string& plain = unescaped_.emplace_back();
        for (std::size_t i = 0; i < field.size(); ++i) {
            plain += field[i];
            i += field[i] == '"' ? 1U : 0U;
        }
        field = plain;
    }
    fields_.push_back(field);
    text.remove_prefix(std::min(end + 1, text.size()));
    std::string_view after = text.substr(0, std::min(text.find_first_of(",\n"), text.size()));
    text.remove_prefix(after.size());
    if (after.ends_with('\r') && (text.empty() || text.front() == '\n')) {
        after.remove_suffix(1);
    }
    well_formed = well_formed && after.empty();
    return well_formed;
}

}  // namespace steelyard::cli
