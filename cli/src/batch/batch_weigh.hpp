// SPDX-License-Identifier: Apache-2.0
#pragma once
// Weighing files of many cases: one result row for each row, in their order, whatever the number of threads.

#include <optional>
#include <string>
#include <vector>

#include "case_inputs.hpp"
#include "steelyard/cli/commands.hpp"
#include "steelyard/cli/report.hpp"

namespace steelyard::cli {

struct BatchWork {
    const likelihoods::TableSet& tables;
    const priors::PriorSet& priors;
    Provenance provenance;
    WeighOptions weigh;
    SensitivityOptions sensitivity;  ///< of JSON and text
    bool brief = false;              ///< no sensitivity
    Length length = Length::ordinary;
    std::string as;  ///< csv, json, ndjson or text
    std::string out, rejects;
    bool strict = false;
    ColumnWishes wishes;
    int threads = 1;
};

/// @param files  of rows  @returns the exit code  @throws document::LoadError, OutputError
int weigh_rows(std::vector<CaseFile> files, const BatchWork& work, const Streams& streams);

}  // namespace steelyard::cli
