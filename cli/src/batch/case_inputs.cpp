// SPDX-License-Identifier: Apache-2.0
#include "case_inputs.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cstring>
#include <filesystem>
#include <string_view>
#include <utility>

#include "../open_inputs.hpp"
#include "text_checks.hpp"

namespace steelyard::cli {
namespace {

constexpr std::size_t looked_at = std::size_t{64} * 1024;

/// Bytes that were taken before, then the rest.
class WithHead final : public ByteSource {
  public:
    WithHead(std::string head, std::unique_ptr<ByteSource> rest)
        : head_(std::move(head)), rest_(std::move(rest)) {}

    std::size_t read(std::span<char> into) override {
        if (given_ < head_.size()) {
            const std::size_t count = std::min(into.size(), head_.size() - given_);
            std::memcpy(into.data(), head_.data() + given_, count);
            given_ += count;
            return count;
        }
        return rest_->read(into);
    }
    std::uint64_t taken() const override { return rest_->taken(); }

  private:
    std::string head_;
    std::unique_ptr<ByteSource> rest_;
    std::size_t given_ = 0;
};

std::optional<CaseForm> form_by_name(std::string_view name) {
    for (const std::string_view packed : {".gz", ".zst"}) {
        if (name.ends_with(packed)) {
            name.remove_suffix(packed.size());
        }
    }
    if (name.ends_with(".csv") || name.ends_with(".CSV")) {
        return CaseForm::csv;
    }
    return name.ends_with(".ndjson") || name.ends_with(".jsonl") ? std::optional(CaseForm::ndjson)
                                                                 : std::nullopt;
}

bool named_as_document(std::string_view name) {
    return name.ends_with(".yaml") || name.ends_with(".yml") || name.ends_with(".json");
}

std::optional<CaseForm> form_by_content(std::string_view text) {
    if (text.starts_with("\xEF\xBB\xBF")) {
        text.remove_prefix(3);
    }
    const std::string_view first = without_blanks(text.substr(0, text.find('\n')));
    if (first.starts_with('{')) {
        const std::size_t rest = text.find_first_not_of(" \t\r\n", std::min(text.find('\n'), text.size()));
        const bool closed = first.ends_with('}') || first.ends_with("}\r");
        return closed && rest != std::string_view::npos && text[rest] == '{' ? std::optional(CaseForm::ndjson)
                                                                             : std::nullopt;
    }
    const bool columns = first.find_first_of(",;") != std::string_view::npos;
    return columns && first.find_first_of(":{#") == std::string_view::npos && !first.starts_with("- ")
               ? std::optional(CaseForm::csv)
               : std::nullopt;
}

[[noreturn]] void unreadable(const std::string& path, const SourceError& error) {
    document::Diagnostics faults;
    faults.add({path, 0, 0}, document::Code::unreadable_file,
               fmt::format("the file cannot be read: {}", error.what()));
    throw document::LoadError(std::move(faults));
}

}  // namespace

std::vector<std::string> input_forms() {
    return {"auto", "yaml", "json", "csv", "ndjson"};
}

namespace {

/// Tells the form from the first bytes.
void look_inside(CaseFile& file) {
    std::unique_ptr<ByteSource> source;
    try {
        source = open_bytes(file.path);
    } catch (const SourceError&) {
        return;  // whoever reads it will say what is wrong
    }
    try {
        std::string head(looked_at, '\0');
        std::size_t size = 0;
        // As much as comes, but of a stream only a line: a terminal gives one at a time.
        while (size < head.size()) {
            const std::size_t got = source->read(std::span<char>(head).subspan(size));
            size += got;
            const bool line = std::memchr(head.data(), '\n', size) != nullptr;
            if (got == 0 || (file.path == "-" && line)) {
                break;
            }
        }
        head.resize(size);
        file.form = form_by_content(head);
        if (file.path == "-") {
            file.stream = std::make_unique<WithHead>(std::move(head), std::move(source));
        }
    } catch (const SourceError& error) {
        unreadable(file.path, error);
    }
}

}  // namespace

CaseFile look_at(const std::string& path, const std::string& stated_form) {
    CaseFile file{path, std::nullopt, nullptr, {}};
    if (stated_form != "auto") {
        file.form = stated_form == "csv"      ? std::optional(CaseForm::csv)
                    : stated_form == "ndjson" ? std::optional(CaseForm::ndjson)
                                              : std::nullopt;
    } else if (path != "-" && (form_by_name(path) || named_as_document(path))) {
        file.form = form_by_name(path);
    } else {
        look_inside(file);
    }
    if (path == "-" && !file.stream) {
        file.stream = open_bytes(path);
    }
    return file;
}

std::string rest_of(ByteSource& stream) {
    const std::size_t limit = document::Limits{}.bytes + 1;
    std::string text;
    while (text.size() < limit) {
        const std::size_t before = text.size();
        text.resize(std::min(limit, before + looked_at));
        const std::size_t got = stream.read(std::span<char>(text).subspan(before));
        text.resize(before + got);
        if (got == 0) {
            break;
        }
    }
    return text;
}

CaseInputs::CaseInputs(std::vector<CaseFile> files, const RowReader& reader, const ColumnWishes& wishes,
                       document::Diagnostics& faults)
    : files_(std::move(files)) {
    for (std::size_t i = 0; i < files_.size(); ++i) {
        CaseFile& file = files_[i];
        const std::uint64_t size = size_of_file(file.path);
        size_ += size;
        std::error_code error;
        const bool again = file.path != "-" && std::filesystem::is_regular_file(file.path, error);
        size_known_ = size_known_ && again;
        try {
            auto records = open(file);
            Block header;
            const bool any = file.form == CaseForm::csv ? records->first_record(header) : !again || size > 0;
            if (!any) {
                faults.add({file.path, 0, 0}, document::Code::empty_document, "the file is empty",
                           "a file of cases begins with the names of its columns");
                continue;
            }
            if (file.form == CaseForm::csv) {
                file.columns = read_header(header, file.path, reader.points(), wishes, faults);
            }
            if (!again) {
                if (kept_) {
                    throw UsageError("only one input can be a stream (standard input or a pipe)");
                }
                kept_ = std::move(records);
                kept_for_ = i;
            }
        } catch (const SourceError& source) {
            faults.add({file.path, 0, 0}, document::Code::unreadable_file,
                       fmt::format("the file cannot be read: {}", source.what()));
        }
    }
}

std::unique_ptr<RecordReader> CaseInputs::open(CaseFile& file) {
    std::unique_ptr<ByteSource> source = file.stream ? std::move(file.stream) : open_bytes(file.path);
    return std::make_unique<RecordReader>(std::move(source),
                                          file.form == CaseForm::csv ? RecordForm::csv : RecordForm::lines);
}

bool CaseInputs::next(Block& block, const CaseFile*& file) {
    while (at_ < files_.size()) {
        CaseFile& current = files_[at_];
        file = &current;
        try {
            if (!reader_ && kept_ && kept_for_ == at_) {
                reader_ = std::move(kept_);
            } else if (!reader_) {
                reader_ = open(current);
                Block header;
                if (current.form == CaseForm::csv) {
                    reader_->first_record(header);
                }
            }
            if (reader_->next(block)) {
                return true;
            }
        } catch (const SourceError& error) {
            unreadable(current.path, error);
        }
        taken_before_ += reader_->taken();
        reader_.reset();
        ++at_;
    }
    return false;
}

double CaseInputs::done() const {
    if (!size_known_ || size_ == 0) {
        return 0.0;
    }
    const std::uint64_t taken = taken_before_ + (reader_ ? reader_->taken() : 0);
    return std::min(1.0, static_cast<double>(taken) / static_cast<double>(size_));
}

}  // namespace steelyard::cli
