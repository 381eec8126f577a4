// SPDX-License-Identifier: Apache-2.0
#pragma once
// A stream of bytes cut into blocks of whole records, so that many threads can read them while memory stays
// the same however long the stream is.

#include <cstddef>
#include <cstdint>
#include <memory>
#include <string>

#include "byte_source.hpp"

namespace steelyard::cli {

/// How records end: at every line feed (NDJSON), or at a line feed outside quotes (CSV, RFC 4180).
enum class RecordForm { lines, csv };

/// Why a stretch of bytes is no record.
enum class RecordFault {
    none,
    too_long,       ///< longer than the longest record allowed
    unclosed_quote  ///< a quote that is never closed: only the line it stands in is given up
};

struct Block {
    std::string text;  ///< whole records, each with its line end but perhaps the last of the stream
    std::uint64_t first_line = 1;           ///< of `text` in the file
    RecordFault fault = RecordFault::none;  ///< then `text` holds the beginning of that one record
    bool has_quote = false;                 ///< whether there is any quote in it
};

class RecordReader {
  public:
    static constexpr std::size_t usual_block = std::size_t{256} * 1024;
    static constexpr std::size_t longest_record = std::size_t{1} << 20;

    RecordReader(std::unique_ptr<ByteSource> source, RecordForm form, std::size_t block = usual_block,
                 std::size_t longest = longest_record);

    /// The first record alone (a header); false when the stream is empty. Only before the first next().
    bool first_record(Block& block);
    /// The next block; false at the end. @throws SourceError
    bool next(Block& block);
    std::uint64_t taken() const { return source_->taken(); }

  private:
    /// Reads until `rest_` holds at least this much, or the end.
    void fill(std::size_t wanted);
    struct Extent {
        std::size_t end = 0;  ///< of the last whole record in `rest_`; 0 when there is none
        bool has_quote = false;
        bool lost_quote = false;  ///< the record after it has a quote that is not closed where it should be
    };
    Extent whole_records() const;
    /// End of the first record; 0 when it does not end within what is there.
    std::size_t end_of_first_record() const;
    void give(Block& block, std::size_t size);
    void give_up_line(Block& block);

    std::unique_ptr<ByteSource> source_;
    RecordForm form_;
    std::size_t block_, longest_;
    std::string rest_;
    std::uint64_t line_ = 1;
    bool ended_ = false;
    bool started_ = false;
};

}  // namespace steelyard::cli
