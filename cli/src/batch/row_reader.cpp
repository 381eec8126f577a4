// SPDX-License-Identifier: Apache-2.0
#include "row_reader.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <charconv>
#include <cmath>

#include "steelyard/cli/read_cases.hpp"
#include "text_checks.hpp"

namespace steelyard::cli {
namespace {

using document::Code;
using document::SourcePosition;
using likelihoods::Panel;
using likelihoods::Sex;

/// A number written plainly (`-2.85`), as nearly all are; anything else is left to the general reader.
bool plain_number(std::string_view text, double& value) {
    const bool negative = text.starts_with('-');
    const std::string_view digits = text.substr(negative ? 1 : 0);
    // Up to 15 digits and their power of ten are exact in a double, so that their quotient is the number's
    // nearest double, as std::from_chars gives it.
    constexpr std::size_t most_digits = 15;
    static constexpr std::array powers = {1e0, 1e1, 1e2,  1e3,  1e4,  1e5,  1e6,  1e7,
                                          1e8, 1e9, 1e10, 1e11, 1e12, 1e13, 1e14, 1e15};
    if (digits.empty() || digits.size() > most_digits + 1) {
        return false;
    }
    std::int64_t whole = 0;
    std::size_t count = 0;
    std::size_t decimals = 0;
    bool point = false;
    for (const char c : digits) {
        if (c >= '0' && c <= '9') {
            whole = 10 * whole + (c - '0');
            ++count;
            decimals += point ? 1 : 0;
        } else if (c == '.' && !point) {
            point = true;
        } else {
            return false;
        }
    }
    if (count == 0 || count > most_digits) {
        return false;
    }
    value = static_cast<double>(negative ? -whole : whole) / powers[decimals];
    return true;
}

/// Bytes from the beginning of the line in which `at` stands, and that line's number after `line`.
SourcePosition position_of(const char* at, std::string_view record, const SourcePosition& record_start) {
    const std::string_view before(record.data(), static_cast<std::size_t>(at - record.data()));
    const auto lines = std::count(before.begin(), before.end(), '\n');
    const std::size_t last = before.rfind('\n');
    const std::size_t offset = last == std::string_view::npos ? before.size() : before.size() - last - 1;
    return {record_start.file, record_start.line + static_cast<int>(lines), static_cast<int>(offset) + 1};
}

std::string_view line_around(std::string_view record, const char* at) {
    const auto offset = static_cast<std::size_t>(at - record.data());
    const std::size_t before = record.rfind('\n', offset == 0 ? 0 : offset - 1);
    const std::size_t start = offset == 0 || before == std::string_view::npos ? 0 : before + 1;
    std::string_view line = record.substr(start, record.find('\n', offset) - start);
    if (line.ends_with('\r')) {
        line.remove_suffix(1);
    }
    return line;
}

}  // namespace

RowReader::RowReader(const likelihoods::TableSet& tables, bool whole_panels)
    : tables_(tables),
      vocabulary_(tables.vocabulary()),
      points_(tables),
      can_be_quick_(likelihoods::PointReader::can_read(tables)),
      whole_panels_(whole_panels),
      empty_(points_.empty_panel()),
      panel_(empty_) {}

void RowReader::read(const Block& block, CaseForm form, const std::string& file, const CaseColumns& columns,
                     const std::function<void(const Row&)>& use) {
    row_.where = {file, static_cast<int>(block.first_line), 1};
    const auto begin = [&] {
        row_.case_id = {};
        row_.final_cause = {};
        row_.fields = nullptr;
        row_.reading.reset();
        row_.panel.reset();
        row_.faults.clear();
        row_.values.clear();
    };
    if (block.fault != RecordFault::none) {
        begin();
        if (block.fault == RecordFault::too_long) {
            set_aside(row_.where, Code::too_large,
                      fmt::format("the row is longer than {} bytes", RecordReader::longest_record),
                      "a case is a short row: look for a missing line end", block.text);
        } else {
            set_aside(row_.where, Code::syntax, "a quote in this row is not closed where it should be",
                      "close it; a quote inside a quoted field is written twice", block.text);
        }
        use(row_);
        return;
    }
    const bool plain = is_plain_ascii(block.text);
    std::string_view rest = block.text;
    while (!rest.empty()) {
        begin();
        const std::string_view before = rest;
        bool well_formed = true;
        if (form == CaseForm::csv) {
            well_formed = csv_.take(rest, !block.has_quote);
        } else {
            rest.remove_prefix(std::min(rest.find('\n'), rest.size() - 1) + 1);
        }
        const std::string_view record = before.substr(0, before.size() - rest.size());
        if (record.find_first_not_of(" \t\r\n") != std::string_view::npos) {
            const TextFault fault = plain ? TextFault::none : text_fault(record);
            if (fault != TextFault::none) {
                set_aside(row_.where, Code::bad_encoding, std::string(text_fault_in_words(fault)),
                          "save the file as UTF-8 text", {});
            } else if (form == CaseForm::csv) {
                read_csv_row(record, columns, well_formed);
            } else {
                read_json_row(record);
            }
            use(row_);
        }
        row_.where.line +=
            block.has_quote ? static_cast<int>(std::count(record.begin(), record.end(), '\n')) : 1;
    }
}

void RowReader::set_aside(const SourcePosition& where, Code code, std::string message, std::string hint,
                          std::string_view line) {
    row_.faults.push_back({where, code, std::move(message), std::move(hint), std::string(line)});
    row_.values.emplace_back();
}

void RowReader::read_csv_row(std::string_view line, const CaseColumns& columns, bool well_formed) {
    fields_.clear();
    for (const std::string_view field : csv_.fields()) {
        fields_.push_back(without_blanks(field));
    }
    row_.fields = &fields_;
    if (!well_formed) {
        set_aside(row_.where, Code::syntax, "a field is not quoted as it should be",
                  "quotes stand around a whole field, and a quote inside them is written twice",
                  line_around(line, line.data()));
        return;
    }
    if (fields_.size() != columns.columns.size()) {
        set_aside(row_.where, Code::syntax,
                  fmt::format("the row has {} fields, but the header has {}", fields_.size(),
                              columns.columns.size()),
                  "a comma inside a field needs quotes around the field; numbers take a decimal point",
                  line_around(line, line.data()));
        return;
    }
    row_.case_id = fields_[columns.case_id];
    row_.final_cause = columns.final_cause ? fields_[*columns.final_cause] : std::string_view();
    if (whole_panels_ || !can_be_quick_ || !read_quickly(columns)) {
        read_with_words(line, columns);
    }
}

bool RowReader::read_quickly(const CaseColumns& columns) {
    if (row_.case_id.empty()) {
        return false;
    }
    panel_.value.assign(empty_.value.begin(), empty_.value.end());
    panel_.level.assign(empty_.level.begin(), empty_.level.end());
    panel_.age = likelihoods::not_known;
    panel_.sex = Sex::unknown;
    for (std::size_t i = 0; i < fields_.size(); ++i) {
        const std::string_view field = fields_[i];
        const Column& column = columns.columns[i];
        if (field.empty()) {
            continue;
        }
        switch (column.role) {
            case ColumnRole::ignored:
            case ColumnRole::case_id:
            case ColumnRole::final_cause:
                break;
            case ColumnRole::number:
            case ColumnRole::age: {
                double value = 0.0;
                if ((column.role == ColumnRole::number && column.quantity < 0) || column.factor == 0.0 ||
                    (column.role == ColumnRole::age && column.high == 0.0) || !plain_number(field, value)) {
                    return false;
                }
                value *= column.factor;
                double& kept = column.role == ColumnRole::age
                                   ? panel_.age
                                   : panel_.value[static_cast<std::size_t>(column.quantity)];
                if (!(column.low <= value && value <= column.high) || !std::isnan(kept)) {
                    return false;
                }
                kept = value;
                break;
            }
            case ColumnRole::feature: {
                const int level = points_.level_number(column.feature, field);
                if (level < 0) {
                    return false;
                }
                panel_.level[static_cast<std::size_t>(column.feature)] = static_cast<std::int16_t>(level);
                break;
            }
            case ColumnRole::sex:
                if (field != "female" && field != "male" && field != "unknown") {
                    return false;
                }
                panel_.sex = field == "female" ? Sex::female : field == "male" ? Sex::male : Sex::unknown;
                break;
            case ColumnRole::method:
                if (field != "electrode" && field != "dipstick") {
                    return false;
                }
                break;
        }
    }
    row_.reading.emplace();
    if (!points_.read(panel_, *row_.reading)) {
        row_.reading.reset();
    }
    return row_.reading.has_value();
}

void RowReader::read_with_words(std::string_view line, const CaseColumns& columns) {
    document::Diagnostics faults;
    likelihoods::PanelBuilder builder(vocabulary_, faults);
    builder.start(std::string(row_.case_id), row_.where);
    const auto where = [&](std::size_t field) { return position_of(csv_.starts()[field], line, row_.where); };
    if (row_.case_id.empty()) {
        faults.add(where(columns.case_id), Code::empty_value, "the row has no case name",
                   "give every row a name of its own in the column case");
    }
    for (std::size_t i = 0; i < fields_.size(); ++i) {
        const Column& column = columns.columns[i];
        if (!fields_[i].empty() && column.role != ColumnRole::ignored && column.role != ColumnRole::case_id) {
            builder.set(column.name, fields_[i], column.unit, where(i));
        }
    }
    if (faults.empty()) {
        keep(builder.finish());
        return;
    }
    row_.faults = faults.sorted();
    for (document::Diagnostic& fault : row_.faults) {
        const auto line_number = static_cast<std::size_t>(fault.where.line - row_.where.line);
        const char* at = line.data();
        for (std::size_t i = 0; i < line_number; ++i) {
            at = std::find(at, line.data() + line.size(), '\n') + 1;
        }
        fault.source_line = line_around(line, at);
        std::string& value = row_.values.emplace_back();
        for (std::size_t i = 0; i < fields_.size(); ++i) {
            if (where(i) == fault.where) {
                value = fields_[i];
            }
        }
    }
}

void RowReader::keep(Panel panel) {
    const likelihoods::Quantities quantities = likelihoods::derive(panel, tables_.gate.chemistry);
    row_.reading = likelihoods::batch_reading(tables_, likelihoods::read_pattern(tables_, panel, quantities),
                                              likelihoods::gate(panel, quantities, tables_.gate),
                                              likelihoods::urgent_values(quantities, tables_.urgent));
    if (whole_panels_) {
        row_.panel = std::move(panel);
    }
}

void RowReader::read_json_row(std::string_view line) {
    document::Diagnostics faults;
    std::vector<Panel> panels = read_cases(line, row_.where.file, vocabulary_, faults);
    if (faults.empty() && panels.size() != 1) {
        faults.add({row_.where.file, 1, 1}, Code::wrong_type, "the line is not one case",
                   "write one case, an object, on each line");
    }
    if (!faults.empty()) {
        row_.faults = faults.sorted();
        for (document::Diagnostic& fault : row_.faults) {
            fault.where.line = row_.where.line + std::max(fault.where.line, 1) - 1;
            fault.where.column = std::max(fault.where.column, 1);
            row_.values.emplace_back();
        }
        return;
    }
    case_id_ = panels.front().case_id;
    final_cause_ = panels.front().final_cause.value_or("");
    row_.case_id = case_id_;
    row_.final_cause = final_cause_;
    keep(std::move(panels.front()));
}

}  // namespace steelyard::cli
