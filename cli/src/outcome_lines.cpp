// SPDX-License-Identifier: Apache-2.0
#include "outcome_lines.hpp"

#include <fmt/format.h>

#include <map>
#include <optional>

#include "steelyard/cli/terminal.hpp"

namespace steelyard::cli {
namespace {

using document::Code;
using document::SourcePosition;

struct Field {
    std::string text;
    int line = 1, column = 1;
};

/// Splits a text into records of fields and keeps count of lines and columns.
class Records {
  public:
    Records(std::string_view text, const std::string& file, document::Diagnostics& faults)
        : text_(text), file_(file), faults_(faults) {}

    /// The next record; empty at the end of the text, or after a quote that never closes.
    std::optional<std::vector<Field>> next() {
        if (at_ >= text_.size()) {
            return std::nullopt;
        }
        std::vector<Field> fields;
        do {
            fields.push_back(field());
        } while (take(','));
        if (unclosed_) {
            return std::nullopt;
        }
        if (take('\r') && at_ < text_.size() && text_[at_] != '\n') {
            fault("a carriage return stands alone");
            at_ = text_.size();
        } else if (!take('\n') && at_ < text_.size()) {
            fault("text follows a closing quote");
            at_ = text_.size();
        }
        return fields;
    }

  private:
    bool take(char wanted) {
        if (at_ >= text_.size() || text_[at_] != wanted) {
            return false;
        }
        ++at_;
        if (wanted == '\n') {
            ++line_;
            line_start_ = at_;
        }
        return true;
    }

    int column() const { return static_cast<int>(at_ - line_start_) + 1; }

    void fault(const std::string& message) {
        faults_.add(
            {file_, line_, column()}, Code::syntax, message,
            "write fields that hold a comma, a quote or a line break in quotes, quotes inside them twice");
    }

    Field field() {
        Field field{"", line_, column()};
        if (!take('"')) {
            while (at_ < text_.size() && text_[at_] != ',' && text_[at_] != '\n' && text_[at_] != '\r') {
                if (text_[at_] == '"') {
                    fault("a quote stands in a field without quotes around it");
                }
                field.text += text_[at_++];
            }
            return field;
        }
        while (at_ < text_.size()) {
            if (take('"')) {
                if (!take('"')) {
                    return field;
                }
                field.text += '"';
            } else {
                const char c = text_[at_];
                field.text += c;
                take(c);
            }
        }
        faults_.add({file_, field.line, field.column}, Code::syntax, "the quote is never closed");
        unclosed_ = true;
        return field;
    }

    std::string_view text_;
    const std::string& file_;
    document::Diagnostics& faults_;
    std::size_t at_ = 0, line_start_ = 0;
    int line_ = 1;
    bool unclosed_ = false;
};

/// Which column holds what.
struct Columns {
    std::size_t case_id = 0, final_cause = 0, count = 0;
};

std::optional<Columns> read_header(const std::vector<Field>& header, const std::string& file,
                                   document::Diagnostics& faults) {
    Columns columns;
    columns.count = header.size();
    std::map<std::string, std::size_t, std::less<>> places;
    const std::size_t before = faults.size();
    for (std::size_t i = 0; i < header.size(); ++i) {
        const SourcePosition at{file, header[i].line, header[i].column};
        if (header[i].text != "case" && header[i].text != "final_cause") {
            faults.add(at, Code::unknown_key,
                       fmt::format("the column {} does not belong here", visible(header[i].text)),
                       "the columns are case and final_cause, with a comma between them");
        } else if (!places.emplace(header[i].text, i).second) {
            faults.add(at, Code::duplicate_key, fmt::format("the column {} is given twice", header[i].text));
        }
    }
    for (const std::string_view wanted : {"case", "final_cause"}) {
        if (!places.contains(wanted)) {
            faults.add({file, 1, 1}, Code::missing_key, fmt::format("there is no column {}", wanted),
                       "the first line must be case,final_cause");
        }
    }
    if (faults.size() != before) {
        return std::nullopt;
    }
    columns.case_id = places.find("case")->second;
    columns.final_cause = places.find("final_cause")->second;
    return columns;
}

}  // namespace

std::vector<OutcomeLine> read_outcome_lines(std::string_view text, const std::string& file,
                                            document::Diagnostics& faults) {
    faults.remember_text(file, text);
    constexpr std::string_view byte_order_mark = "\xEF\xBB\xBF";
    if (text.starts_with(byte_order_mark)) {
        text.remove_prefix(byte_order_mark.size());
    }
    std::vector<OutcomeLine> lines;
    Records records(text, file, faults);
    const auto header = records.next();
    if (!header) {
        faults.add({file, 0, 0}, Code::empty_document, "the file is empty",
                   "the first line must be case,final_cause");
        return lines;
    }
    const auto columns = read_header(*header, file, faults);
    std::map<std::string, SourcePosition, std::less<>> seen;
    while (const auto record = columns ? records.next() : std::nullopt) {
        const SourcePosition start{file, record->front().line, record->front().column};
        if (record->size() == 1 && record->front().text.empty()) {
            continue;
        }
        if (record->size() != columns->count) {
            faults.add(start, Code::syntax,
                       fmt::format("the line has {} field{}, its header has {}", record->size(),
                                   record->size() == 1 ? "" : "s", columns->count));
            continue;
        }
        const auto position = [&](const Field& field) {
            return SourcePosition{file, field.line, field.column};
        };
        const Field& id = (*record)[columns->case_id];
        const Field& cause = (*record)[columns->final_cause];
        if (id.text.empty() || cause.text.empty()) {
            faults.add(position(id.text.empty() ? id : cause), Code::empty_value,
                       fmt::format("{} is empty", id.text.empty() ? "case" : "final_cause"),
                       "leave the whole line out when the final cause is not known yet");
            continue;
        }
        const auto [first, is_new] = seen.emplace(id.text, position(id));
        if (!is_new) {
            faults.add(position(id), Code::conflicting_values,
                       fmt::format("the case {} was given before, at {}", visible(id.text),
                                   document::to_string(first->second)),
                       "give each case one line");
            continue;
        }
        lines.push_back({id.text, cause.text, position(id), position(cause)});
    }
    return lines;
}

}  // namespace steelyard::cli
