// SPDX-License-Identifier: Apache-2.0
#include "batch_weigh.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <memory>
#include <ostream>

#include "batch_counts.hpp"
#include "ordered_work.hpp"
#include "pattern_sensitivities.hpp"
#include "rejects.hpp"
#include "result_row.hpp"
#include "steelyard/cli/output.hpp"
#include "unread_columns.hpp"

namespace steelyard::cli {
namespace {

/// Texts of patterns that are kept, so that memory has a bound whatever the file holds.
constexpr std::size_t most_texts = 32768;

/// One block: what was read, and what came of it.
struct WorkItem {
    Block block;
    const CaseFile* file = nullptr;
    double done = 0.0;
    std::string text;
    std::vector<RejectedRow> rejected;
    BatchCounts counts;
};

std::string carried_fields(const Row& row, const CaseColumns& columns) {
    std::string text;
    for (const std::size_t column : columns.carry) {
        text += ',';
        if (row.fields != nullptr && column < row.fields->size()) {
            add_csv_field(text, (*row.fields)[column]);
        }
    }
    return text;
}

/// What a thread makes of the rows it reads.
class RowWeigher {
  public:
    virtual ~RowWeigher() = default;
    RowWeigher() = default;
    RowWeigher(const RowWeigher&) = delete;
    RowWeigher& operator=(const RowWeigher&) = delete;
    RowWeigher(RowWeigher&&) = delete;
    RowWeigher& operator=(RowWeigher&&) = delete;
    /// @returns whether the case was weighed
    virtual bool add(const Row& row, const CaseColumns& columns, std::string& text) = 0;
};

class CsvWeigher final : public RowWeigher {
  public:
    CsvWeigher(const ResultRows& rows, SharedTexts& texts) : rows_(rows), writer_(rows, texts) {}
    bool add(const Row& row, const CaseColumns& columns, std::string& text) override {
        writer_.add(text, row.case_id, *row.reading);
        if (!columns.carry.empty()) {
            text += carried_fields(row, columns);
        }
        text += '\n';
        return rows_.is_weighed(row.reading->gate);
    }

  private:
    const ResultRows& rows_;
    RowWriter writer_;
};

class ReportWeigher final : public RowWeigher {
  public:
    ReportWeigher(const BatchWork& work, PatternSensitivities& sensitivities, bool colour)
        : work_(work), sensitivities_(sensitivities), colour_(colour) {}
    bool add(const Row& row, const CaseColumns& columns, std::string& text) override {
        const Weighing weighing = weigh_case(work_.tables, work_.priors, *row.panel, work_.weigh);
        std::optional<Sensitivity> sensitivity;
        if (weighing.weighed && !work_.brief) {
            sensitivity = sensitivities_.of(weighing);
        }
        const Sensitivity* sure = sensitivity ? &*sensitivity : nullptr;
        if (work_.as == "text") {
            text +=
                report_text(weighing, sure, work_.tables, work_.provenance, work_.length, colour_) + "\n\n";
            return weighing.weighed;
        }
        nlohmann::ordered_json report = report_json(weighing, sure, work_.tables, work_.provenance);
        for (std::size_t i = 0; i < columns.carry.size(); ++i) {
            report["carried"][work_.wishes.carry[i]] = std::string((*row.fields)[columns.carry[i]]);
        }
        text += work_.as == "json" ? ",\n" : "";
        text += dumped(report);
        text += work_.as == "json" ? "" : "\n";
        return weighing.weighed;
    }

  private:
    const BatchWork& work_;
    PatternSensitivities& sensitivities_;
    bool colour_;
};

}  // namespace

int weigh_rows(std::vector<CaseFile> files, const BatchWork& work, const Streams& streams) {
    const bool csv = work.as == "csv";
    document::Diagnostics faults;
    RowReader for_headers(work.tables, false);
    CaseInputs inputs(std::move(files), for_headers, work.wishes, faults);
    if (!faults.empty()) {
        throw document::LoadError(faults);
    }
    warn_of_unread_columns(inputs, for_headers.vocabulary(), streams.err);

    std::vector<LeftOut> left_out;
    const std::vector<WeighedCause> causes = causes_to_weigh(work.tables, work.priors, work.weigh, left_out);
    const ResultRows rows(work.tables, causes, work.weigh.weigh_anyway);
    SharedTexts texts(most_texts);
    SensitivityOptions options = work.sensitivity;
    options.threads = 1;  // threads are busy with other rows
    PatternSensitivities sensitivities(work.tables, work.priors, options);
    const bool to_file = !work.out.empty() && work.out != "-";

    std::vector<std::unique_ptr<RowReader>> readers;
    std::vector<std::unique_ptr<RowWeigher>> weighers;
    for (int i = 0; i < work.threads; ++i) {
        readers.push_back(std::make_unique<RowReader>(work.tables, !csv));
        if (csv) {
            weighers.push_back(std::make_unique<CsvWeigher>(rows, texts));
        } else {
            weighers.push_back(
                std::make_unique<ReportWeigher>(work, sensitivities, streams.colour_out && !to_file));
        }
    }

    ResultWriter out(work.out, streams.out);
    Rejects rejects(work.rejects, work.strict, streams);
    RowProgress progress(streams.err, streams.terminal_err);
    BatchCounts counts;
    bool any_text = false;
    out.write(csv ? rows.header(work.wishes.carry) : work.as == "json" ? "[" : "");
    work_in_order<WorkItem>(
        work.threads,
        [&](WorkItem& item) {
            const bool more = out.wanted() && inputs.next(item.block, item.file);
            item.done = inputs.done();
            return more;
        },
        [&](int worker, WorkItem& item) {
            const auto at = static_cast<std::size_t>(worker);
            item.text.clear();
            item.rejected.clear();
            item.counts = {};
            readers[at]->read(item.block, item.file->form.value(), item.file->path, item.file->columns,
                              [&](const Row& row) {
                                  if (!row.reading) {
                                      item.rejected.push_back(RejectedRow::of(row));
                                      ++item.counts.set_aside;
                                  } else if (weighers[at]->add(row, item.file->columns, item.text)) {
                                      ++item.counts.weighed;
                                  } else {
                                      ++item.counts.out_of_scope;
                                  }
                              });
        },
        [&](WorkItem& item) {
            rejects.add(item.rejected);
            std::string_view text = item.text;
            if (work.as == "json" && !any_text && !text.empty()) {
                text.remove_prefix(1);  // no comma before the first
            }
            any_text = any_text || !text.empty();
            out.write(text);
            counts += item.counts;
            progress.tell(counts.read(), item.done);
        });
    out.write(work.as == "json" ? "\n]\n" : "");
    rejects.finish();
    out.finish();
    streams.err << wrapped("steelyard: " + counts.in_words(), "", "  ")
                << wrapped(std::string("Caution: ") + caution_text, "", "  ");
    if (counts.set_aside > 0) {
        return rows_set_aside;
    }
    return counts.weighed == 0 ? nothing_weighed : done;
}

}  // namespace steelyard::cli
