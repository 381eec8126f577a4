// SPDX-License-Identifier: Apache-2.0
#include "rejects.hpp"

#include <fmt/format.h>

#include "steelyard/cli/csv_text.hpp"

namespace steelyard::cli {

RejectedRow RejectedRow::of(const Row& row) {
    return {std::string(row.case_id), row.faults, row.values};
}

Rejects::Rejects(const std::string& path, bool strict, const Streams& streams)
    : file_(path.empty() ? nullptr : std::make_unique<ResultWriter>(path, streams.out)),
      strict_(strict),
      streams_(streams) {
    if (file_) {
        file_->write("file,line,column,case,value,code,reason,hint\n");
    }
}

void Rejects::add(const std::vector<RejectedRow>& rows) {
    for (const RejectedRow& row : rows) {
        document::Diagnostics faults;
        for (std::size_t i = 0; i < row.faults.size(); ++i) {
            const document::Diagnostic& fault = row.faults[i];
            faults.add(fault);
            if (file_) {
                file_->write(fmt::format("{},{},{},{},{},{},{},{}\n", csv_field(fault.where.file),
                                         fault.where.line, fault.where.column, csv_field(row.case_id),
                                         csv_field(row.values[i]), document::to_string(fault.code),
                                         csv_field(fault.message), csv_field(fault.hint)));
            }
        }
        if (strict_) {
            throw document::LoadError(std::move(faults));
        }
        document::print(streams_.err, faults, streams_.colour_err);
    }
}

void Rejects::finish() {
    if (file_) {
        file_->finish();
    }
}

}  // namespace steelyard::cli
