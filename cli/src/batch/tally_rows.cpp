// SPDX-License-Identifier: Apache-2.0
#include "tally_rows.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <chrono>
#include <memory>
#include <ostream>
#include <utility>

#include "ordered_work.hpp"
#include "rejects.hpp"
#include "steelyard/cli/terminal.hpp"
#include "unread_columns.hpp"

namespace steelyard::cli {
namespace {

struct TallyItem {
    Block block;
    const CaseFile* file = nullptr;
    double done = 0.0;
    std::uint64_t rows = 0;
    std::vector<RejectedRow> rejected;
};

bool is_digit(char c) {
    return c >= '0' && c <= '9';
}

int number_of(std::string_view digits) {
    int number = 0;
    for (const char c : digits) {
        number = 10 * number + (c - '0');
    }
    return number;
}

/// Counts the rows of one thread.
class RowCounter {
  public:
    RowCounter(const likelihoods::TableSet& tables, const TallyHead& head)
        : reader_(tables, false), tally_(head) {}

    void read(TallyItem& item) {
        item.rejected.clear();
        item.rows = 0;
        reader_.read(item.block, item.file->form.value(), item.file->path, item.file->columns,
                     [&](const Row& row) { count(row, item); });
    }
    const Tally& tally() const noexcept { return tally_; }

  private:
    void count(const Row& row, TallyItem& item) {
        ++item.rows;
        const CaseColumns& columns = item.file->columns;
        if (!row.reading) {
            item.rejected.push_back(RejectedRow::of(row));
            tally_.add_set_aside();
            return;
        }
        std::string_view month;
        if (columns.over) {
            const std::string_view date = (*row.fields)[*columns.over];
            month = month_of(date);
            if (month.empty() && !date.empty()) {
                item.rejected.push_back(no_date(row, columns.columns[*columns.over].name, date));
                tally_.add_set_aside();
                return;
            }
        }
        stratum_.clear();
        for (std::size_t i = 0; i < columns.by.size(); ++i) {
            stratum_ += i > 0 ? " / " : "";
            stratum_ += (*row.fields)[columns.by[i]];
        }
        tally_.add(row.reading->code, row.reading->gate, row.final_cause, stratum_, month);
    }

    static RejectedRow no_date(const Row& row, const std::string& column, std::string_view date) {
        RejectedRow rejected;
        rejected.case_id = row.case_id;
        document::Diagnostic fault;
        fault.where = row.where;
        fault.code = document::Code::bad_format;
        fault.message = fmt::format("{} is \"{}\", which is no date", column, date);
        fault.hint = "write the year first: 2025-03-17";
        rejected.faults.push_back(std::move(fault));
        rejected.values.emplace_back(date);
        return rejected;
    }

    RowReader reader_;
    Tally tally_;
    std::string stratum_;
};

}  // namespace

std::string_view month_of(std::string_view date) {
    using std::chrono::day;
    using std::chrono::month;
    using std::chrono::year;
    const bool digits = date.size() >= 7 && date[4] == '-' &&
                        std::all_of(date.begin(), date.begin() + 4, is_digit) && is_digit(date[5]) &&
                        is_digit(date[6]);
    if (!digits) {
        return {};
    }
    const int y = number_of(date.substr(0, 4));
    const int m = number_of(date.substr(5, 2));
    int d = 1;
    if (date.size() > 7) {
        const bool with_day = date.size() >= 10 && date[7] == '-' && is_digit(date[8]) && is_digit(date[9]) &&
                              (date.size() == 10 || date[10] == 'T' || date[10] == ' ');
        if (!with_day) {
            return {};
        }
        d = number_of(date.substr(8, 2));
    }
    const std::chrono::year_month_day whole{year{y}, month{static_cast<unsigned>(m)},
                                            day{static_cast<unsigned>(d)}};
    return whole.ok() ? date.substr(0, 7) : std::string_view();
}

Tally tally_rows(std::vector<CaseFile> files, const likelihoods::TableSet& tables, const RowsToTally& wanted,
                 const Streams& streams) {
    document::Diagnostics faults;
    const RowReader for_headers(tables, false);
    const ColumnWishes wishes{{}, wanted.by, wanted.over};
    CaseInputs inputs(std::move(files), for_headers, wishes, faults);
    for (const CaseFile& file : inputs.files()) {
        if (file.form == CaseForm::ndjson && (!wanted.by.empty() || !wanted.over.empty())) {
            faults.add({file.path, 0, 0}, document::Code::missing_key,
                       "--by and --over name columns, and NDJSON has none",
                       "give the cases as CSV to keep strata or months");
        }
    }
    if (!faults.empty()) {
        throw document::LoadError(faults);
    }
    warn_of_unread_columns(inputs, for_headers.vocabulary(), streams.err);

    const TallyHead head = tally_head(tables, wanted.by, !wanted.over.empty());
    std::vector<std::unique_ptr<RowCounter>> counters;
    counters.reserve(static_cast<std::size_t>(wanted.threads));
    for (int i = 0; i < wanted.threads; ++i) {
        counters.push_back(std::make_unique<RowCounter>(tables, head));
    }
    Rejects rejects(wanted.rejects, wanted.strict, streams);
    RowProgress progress(streams.err, streams.terminal_err);
    std::uint64_t rows = 0;
    work_in_order<TallyItem>(
        wanted.threads,
        [&](TallyItem& item) {
            const bool more = inputs.next(item.block, item.file);
            item.done = inputs.done();
            return more;
        },
        [&](int worker, TallyItem& item) { counters[static_cast<std::size_t>(worker)]->read(item); },
        [&](TallyItem& item) {
            rejects.add(item.rejected);
            rows += item.rows;
            progress.tell(rows, item.done);
        });
    rejects.finish();
    Tally all(head);
    for (const auto& counter : counters) {
        all.merge(counter->tally());
    }
    const TallyFlow flow = all.flow();
    const BatchCounts counts{flow.weighed, flow.out_of_scope, flow.set_aside};
    streams.err << wrapped("steelyard: " + counts.in_words(), "", "  ");
    return all;
}

}  // namespace steelyard::cli
