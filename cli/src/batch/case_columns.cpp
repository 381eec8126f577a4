// SPDX-License-Identifier: Apache-2.0
#include "case_columns.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <map>

#include "csv_fields.hpp"
#include "steelyard/cli/terminal.hpp"
#include "text_checks.hpp"

namespace steelyard::cli {
namespace {

using document::Code;
using document::Diagnostics;
using document::SourcePosition;

/// `serum_potassium [mmol/L]` as name and unit.
std::pair<std::string_view, std::string_view> name_and_unit(std::string_view title) {
    const std::size_t open = title.find('[');
    if (open == std::string_view::npos || !title.ends_with(']') || open == 0) {
        return {title, {}};
    }
    // The unit of pH is itself in brackets: `urine_ph [[pH]]`.
    return {without_blanks(title.substr(0, open)),
            without_blanks(title.substr(open + 1, title.size() - open - 2))};
}

class HeaderReader {
  public:
    HeaderReader(const std::string& file, const likelihoods::PointReader& reader, const ColumnWishes& wishes,
                 Diagnostics& faults)
        : file_(file), reader_(reader), wishes_(wishes), faults_(faults) {}

    CaseColumns run(const Block& header) {
        if (!is_text(header)) {
            return {};
        }
        std::string_view rest = header.text;
        CsvFields fields;
        if (header.fault != RecordFault::none || !fields.take(rest)) {
            faults_.add(at(0), Code::syntax, "the header is not a line of column names parted by commas",
                        "close every quote, and put quotes only around a whole field");
            return {};
        }
        begin_ = header.text.data();
        if (fields.fields().size() == 1 && fields.fields().front().find(';') != std::string_view::npos) {
            faults_.add(at(0), Code::syntax, "the columns are parted by semicolons",
                        "save the file with commas between fields and points in numbers (RFC 4180)");
            return {};
        }
        for (std::size_t i = 0; i < fields.fields().size(); ++i) {
            add(without_blanks(fields.fields()[i]),
                at(static_cast<std::size_t>(fields.starts()[i] - begin_)));
        }
        if (!seen_.contains("case")) {
            faults_.add(at(0), Code::missing_key, "no column is called case",
                        "name the column that tells the cases apart: case");
        }
        find_wishes();
        return std::move(result_);
    }

  private:
    SourcePosition at(std::size_t offset) const { return {file_, 1, static_cast<int>(offset + 1)}; }

    bool is_text(const Block& header) {
        if (const TextFault fault = text_fault(header.text); fault != TextFault::none) {
            faults_.add(at(0), Code::bad_encoding, std::string(text_fault_in_words(fault)),
                        "save the file as UTF-8 text");
            return false;
        }
        return true;
    }

    void add(std::string_view title, const SourcePosition& where) {
        const auto [name, unit] = name_and_unit(title);
        const std::size_t position = result_.columns.size();
        Column& column = result_.columns.emplace_back();
        column.name = name;
        column.unit = unit;
        if (name.empty()) {
            return;  // a column without a name, as some programs add for the row number
        }
        const auto [first, is_new] = seen_.emplace(column.name, position);
        if (!is_new) {
            faults_.add(where, Code::duplicate_key,
                        fmt::format("the column {} stands twice, first as column {}", visible(name),
                                    first->second + 1),
                        "keep one of the two");
            return;
        }
        if (const auto role = role_of(name)) {
            column.role = *role;
            if (!unit.empty()) {
                faults_.add(where, Code::bad_unit, fmt::format("{} takes no unit", visible(name)));
            }
        } else if (likelihoods::names_a_number(name)) {
            add_number(column, where);
        } else if (const int feature = reader_.feature_number(name); feature >= 0) {
            column.role = ColumnRole::feature;
            column.feature = feature;
        } else {
            result_.not_read.emplace_back(name);
        }
        if (column.role == ColumnRole::case_id) {
            result_.case_id = position;
        } else if (column.role == ColumnRole::final_cause) {
            result_.final_cause = position;
        }
    }

    static std::optional<ColumnRole> role_of(std::string_view name) {
        static const std::map<std::string_view, ColumnRole> roles = {
            {"case", ColumnRole::case_id},
            {"sex", ColumnRole::sex},
            {"urine_method", ColumnRole::method},
            {"final_cause", ColumnRole::final_cause}};
        const auto found = roles.find(name);
        return found == roles.end() ? std::nullopt : std::optional(found->second);
    }

    void add_number(Column& column, const SourcePosition& where) {
        column.role = column.name == "age" ? ColumnRole::age : ColumnRole::number;
        Diagnostics of_unit;
        const auto scale = likelihoods::entry_scale(column.name, column.unit, where, of_unit);
        if (!scale) {
            if (!column.unit.empty()) {  // without a unit in the header each cell must have its own
                for (const document::Diagnostic& fault : of_unit.sorted()) {
                    faults_.add(fault);
                }
            }
            return;
        }
        column.quantity = likelihoods::quantity_number(scale->quantity);
        column.factor = scale->factor;
        column.low = scale->low;
        column.high = scale->high;
    }

    std::optional<std::size_t> find(const std::string& option, const std::string& name) {
        const auto found = seen_.find(name);
        if (found == seen_.end()) {
            faults_.add(at(0), Code::missing_key,
                        fmt::format("there is no column {}, which {} asks for", visible(name), option),
                        "names of columns are written without their units");
            return std::nullopt;
        }
        std::erase(result_.not_read, name);
        return found->second;
    }

    void find_wishes() {
        const auto keep = [&](std::vector<std::size_t>& list, const char* option,
                              const std::vector<std::string>& names) {
            for (const std::string& name : names) {
                if (const auto position = find(option, name)) {
                    list.push_back(*position);
                }
            }
        };
        keep(result_.carry, "--carry", wishes_.carry);
        keep(result_.by, "--by", wishes_.by);
        if (!wishes_.over.empty()) {
            result_.over = find("--over", wishes_.over);
        }
    }

    const std::string& file_;
    const likelihoods::PointReader& reader_;
    const ColumnWishes& wishes_;
    Diagnostics& faults_;
    const char* begin_ = nullptr;
    std::map<std::string, std::size_t, std::less<>> seen_;
    CaseColumns result_;
};

}  // namespace

CaseColumns read_header(const Block& header, const std::string& file, const likelihoods::PointReader& reader,
                        const ColumnWishes& wishes, Diagnostics& faults) {
    return HeaderReader(file, reader, wishes, faults).run(header);
}

std::string columns_in_words(const std::vector<std::string>& names,
                             const likelihoods::FeatureVocabulary& vocabulary) {
    std::string words;
    for (const std::string& name : names) {
        const std::string hint = likelihoods::meant_by(name, vocabulary);
        words += words.empty() ? "" : ", ";
        words += visible(name) + (hint.empty() ? "" : fmt::format(" ({})", hint));
    }
    return words;
}

}  // namespace steelyard::cli
