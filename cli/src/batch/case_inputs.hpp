// SPDX-License-Identifier: Apache-2.0
#pragma once
// Files of many cases, one after another, as blocks of rows.

#include <cstdint>
#include <memory>
#include <optional>
#include <string>
#include <vector>

#include "case_columns.hpp"
#include "row_reader.hpp"
#include "steelyard/document/node.hpp"

namespace steelyard::cli {

/// What a command line says of how cases are written: `auto`, `yaml`, `json`, `csv` or `ndjson`.
std::vector<std::string> input_forms();

/// One input of a command: how its cases are written, and, of standard input, the stream itself, since it
/// can be opened only once.
struct CaseFile {
    std::string path;
    std::optional<CaseForm> form;        ///< empty for a YAML or JSON document
    std::unique_ptr<ByteSource> stream;  ///< of standard input
    CaseColumns columns;                 ///< of CSV
};

/// Whether a file holds many cases in rows is told from its name (.csv, .ndjson, .jsonl, also with .gz or
/// .zst after it); for standard input and other names from the first bytes.
CaseFile look_at(const std::string& path, const std::string& stated_form);

/// All of a stream, at most one byte more than the limit of documents. @throws SourceError
std::string rest_of(ByteSource& stream);

class CaseInputs {
  public:
    /// Reads the header of every file. Faults of any are added; nothing is to be read then.
    /// @param files  of rows, none of them a document
    CaseInputs(std::vector<CaseFile> files, const RowReader& reader, const ColumnWishes& wishes,
               document::Diagnostics& faults);

    const std::vector<CaseFile>& files() const noexcept { return files_; }
    /// The next block and its file; false at the end of the last.
    /// @throws document::LoadError  a file that cannot be read to its end
    bool next(Block& block, const CaseFile*& file);
    /// The share of the bytes that have been taken; 0 when the size is not known.
    double done() const;

  private:
    static std::unique_ptr<RecordReader> open(CaseFile& file);

    std::vector<CaseFile> files_;
    std::size_t at_ = 0;
    std::unique_ptr<RecordReader> reader_;
    std::unique_ptr<RecordReader> kept_;  ///< of the one file that cannot be opened twice
    std::size_t kept_for_ = 0;
    std::uint64_t size_ = 0, taken_before_ = 0;
    bool size_known_ = true;
};

}  // namespace steelyard::cli
