// SPDX-License-Identifier: Apache-2.0
#include "record_reader.hpp"

#include <algorithm>
#include <cstring>
#include <span>
#include <string_view>
#include <utility>

namespace steelyard::cli {
namespace {

constexpr std::string_view byte_order_mark = "\xEF\xBB\xBF";

/// Walks through CSV and knows at each line feed whether it ends a record. A quote opens a quoted field only
/// where a field begins; anywhere else it is a character (and a fault of that field).
class QuoteWalk {
  public:
    /// @returns whether this character ends a record
    bool step(char c) {
        if (state_ == State::quoted) {
            state_ = c == '"' ? State::quote_in_quoted : State::quoted;
            several_lines_ = several_lines_ || c == '\n';
            return false;
        }
        if (c == '"' && state_ != State::plain) {
            state_ = State::quoted;
            return false;
        }
        if (c == '\n') {
            *this = QuoteWalk();
            return true;
        }
        // Text after a closing quote: over several lines that is a quote that was meant to close long before.
        lost_quote_ =
            lost_quote_ || (several_lines_ && state_ == State::quote_in_quoted && c != ',' && c != '\r');
        state_ = c == ',' ? State::field_start : State::plain;
        return false;
    }
    bool inside_quotes() const { return state_ == State::quoted; }
    /// Whether the record walked through holds a quote that someone forgot to close.
    bool lost_quote() const { return lost_quote_; }

  private:
    enum class State { field_start, plain, quoted, quote_in_quoted };
    State state_ = State::field_start;
    bool several_lines_ = false;
    bool lost_quote_ = false;
};

}  // namespace

RecordReader::RecordReader(std::unique_ptr<ByteSource> source, RecordForm form, std::size_t block,
                           std::size_t longest)
    : source_(std::move(source)), form_(form), block_(block), longest_(longest) {}

void RecordReader::fill(std::size_t wanted) {
    const bool at_start = !started_;
    started_ = true;
    while (!ended_ && rest_.size() < wanted) {
        const std::size_t before = rest_.size();
        rest_.resize(std::max(wanted, before + 4096));
        const std::size_t got = source_->read(std::span<char>(rest_).subspan(before));
        rest_.resize(before + got);
        ended_ = got == 0;
    }
    if (at_start && rest_.starts_with(byte_order_mark)) {
        rest_.erase(0, byte_order_mark.size());
    }
}

RecordReader::Extent RecordReader::whole_records() const {
    const std::string_view text = rest_;
    const bool has_quote = form_ == RecordForm::csv && std::memchr(text.data(), '"', text.size()) != nullptr;
    if (!has_quote) {
        const std::size_t last = text.rfind('\n');
        return {last == std::string_view::npos ? 0 : last + 1, false, false};
    }
    QuoteWalk walk;
    std::size_t end = 0;
    for (std::size_t i = 0; i < text.size(); ++i) {
        if (walk.step(text[i])) {
            end = i + 1;
        }
        if (walk.lost_quote()) {
            return {end, true, true};
        }
    }
    return {end, true, ended_ && walk.inside_quotes()};
}

std::size_t RecordReader::end_of_first_record() const {
    if (form_ == RecordForm::lines) {
        const std::size_t first = rest_.find('\n');
        return first == std::string::npos ? 0 : first + 1;
    }
    QuoteWalk walk;
    for (std::size_t i = 0; i < rest_.size(); ++i) {
        if (walk.step(rest_[i])) {
            return i + 1;
        }
    }
    return 0;
}

void RecordReader::give(Block& block, std::size_t size) {
    block.text.assign(rest_, 0, size);
    rest_.erase(0, size);
    block.first_line = line_;
    block.fault = RecordFault::none;
    line_ += static_cast<std::uint64_t>(std::count(block.text.begin(), block.text.end(), '\n'));
}

/// The record does not end where it may: what is given up is its first line, so that a lost quote costs one
/// row and not the rest of the file. A line that is too long itself is read to its end and dropped.
void RecordReader::give_up_line(Block& block) {
    constexpr std::size_t shown = 200;
    const std::size_t line_end = rest_.find('\n');
    block.first_line = line_;
    block.has_quote = true;
    block.text.assign(rest_, 0, std::min({shown, rest_.size(), line_end}));
    if (line_end != std::string::npos) {
        block.fault = RecordFault::unclosed_quote;
        rest_.erase(0, line_end + 1);
        ++line_;
        return;
    }
    block.fault = rest_.size() <= longest_ ? RecordFault::unclosed_quote : RecordFault::too_long;
    while (true) {
        const std::size_t end = rest_.find('\n');
        if (end != std::string::npos) {
            rest_.erase(0, end + 1);
            ++line_;
            return;
        }
        rest_.clear();
        if (ended_) {
            return;
        }
        fill(block_);
    }
}

bool RecordReader::first_record(Block& block) {
    std::size_t wanted = std::min<std::size_t>(block_, 4096);
    while (true) {
        fill(wanted);
        if (rest_.empty()) {
            return false;
        }
        const std::size_t end = end_of_first_record();
        if (end > 0 && end <= longest_) {
            block.has_quote = true;
            give(block, end);
            return true;
        }
        if (ended_ && rest_.size() <= longest_) {
            block.has_quote = true;
            give(block, rest_.size());
            return true;
        }
        if (rest_.size() > longest_) {
            give_up_line(block);
            return true;
        }
        wanted = 2 * wanted;
    }
}

bool RecordReader::next(Block& block) {
    std::size_t wanted = block_;
    while (true) {
        fill(wanted);
        if (rest_.empty()) {
            return false;
        }
        const Extent whole = whole_records();
        if (whole.end > 0) {
            if (whole.end > longest_ && end_of_first_record() > longest_) {
                give_up_line(block);
            } else {
                block.has_quote = whole.has_quote;
                give(block, whole.end);
            }
            return true;
        }
        if (whole.lost_quote || rest_.size() > longest_) {
            give_up_line(block);
            return true;
        }
        if (ended_) {  // the last record of a file may lack its line end
            block.has_quote = whole.has_quote;
            give(block, rest_.size());
            return true;
        }
        wanted = std::min(2 * wanted, longest_ + 1);
    }
}

}  // namespace steelyard::cli
