// SPDX-License-Identifier: Apache-2.0
#include "tally_inputs.hpp"

#include <fmt/format.h>

#include <span>
#include <utility>

#include "batch/tally_rows.hpp"
#include "steelyard/cli/tally_file.hpp"
#include "steelyard/cli/terminal.hpp"

namespace steelyard::cli {
namespace {

std::string listed(const std::vector<std::string>& columns) {
    std::string list;
    for (const std::string& column : columns) {
        list += (list.empty() ? "" : ", ") + visible(column);
    }
    return list;
}

void check_tally(const Tally& tally, const std::string& path, const likelihoods::TableSet& tables,
                 const TallyWanted& wanted, document::Diagnostics& faults) {
    const auto mismatch = [&](std::string message, std::string hint) {
        faults.add({path, 0, 0}, document::Code::tally_mismatch, std::move(message), std::move(hint));
    };
    if (tally.head().reading_digest != likelihoods::reading_digest(tables)) {
        mismatch(fmt::format(
                     "its cases were read with other bands, conditions or gate limits (tables \"{}\") than "
                     "those of the tables \"{}\"",
                     visible(tally.head().tables_title), visible(tables.title)),
                 "give the tables it was read with as --tables");
    }
    if (!wanted.by.empty() && tally.head().by != wanted.by) {
        mismatch(tally.head().by.empty()
                     ? std::string("it keeps no strata")
                     : fmt::format("it is kept by {}, not by {}", listed(tally.head().by), listed(wanted.by)),
                 "make it again from the cases with --by, or leave --by out");
    }
    if (!wanted.over.empty() && !tally.head().months) {
        mismatch("it keeps no months", "make it again from the cases with --over, or leave --over out");
    }
}

/// Adds inputs to one tally, and keeps the faults of those that do not fit.
class InputSum {
  public:
    explicit InputSum(document::Diagnostics& faults) : faults_(faults) {}

    void add(Tally tally, const std::string& path) {
        if (!all_) {
            all_ = std::move(tally);
            first_ = path;
            return;
        }
        try {
            all_->merge(tally);
        } catch (const TallyError& error) {
            faults_.add({path, 0, 0}, document::Code::tally_mismatch,
                        fmt::format("cannot be added to {}: {}", visible(first_), error.what()),
                        "audit them one by one");
        }
    }
    std::optional<Tally> take() { return std::move(all_); }

  private:
    document::Diagnostics& faults_;
    std::optional<Tally> all_;
    std::string first_;
};

/// Whether a file begins like a tally; also when it is empty or cannot be read, since its reader says so.
bool may_be_tally(const std::string& path) {
    try {
        const std::unique_ptr<ByteSource> bytes = open_bytes(path);
        std::string beginning(256, '\0');
        std::size_t size = 0;
        for (std::size_t got = 1; got > 0 && size < beginning.size(); size += got) {
            got = bytes->read(std::span<char>(beginning).subspan(size));
        }
        beginning.resize(size);
        return size == 0 || looks_like_tally(beginning);
    } catch (const SourceError&) {
        return true;
    }
}

std::optional<Tally> tally_of(CaseFile& file, document::Diagnostics& faults) {
    if (!file.stream && may_be_tally(file.path)) {
        return load_tally(file.path, faults);
    }
    if (!file.stream) {
        faults.add({file.path, 0, 0}, document::Code::bad_tally,
                   "this is neither a file of many cases nor a tally",
                   "give cases as CSV or NDJSON, each with its final_cause, or what --keep-tally wrote");
        return std::nullopt;
    }
    const ReadBytes bytes = [&file](char* to, std::size_t most) {
        return file.stream->read(std::span<char>(to, most));
    };
    return read_tally(bytes, file.path, faults);
}

/// The rows of files of cases, counted; a column with too many values is a fault of the first of them.
std::optional<Tally> tally_of_rows(std::vector<CaseFile> files, const likelihoods::TableSet& tables,
                                   const TallyWanted& wanted, const Streams& streams,
                                   document::Diagnostics& faults) {
    const std::string first = files.front().path;
    try {
        return tally_rows(std::move(files), tables,
                          {wanted.by, wanted.over, wanted.rejects, wanted.strict, wanted.threads}, streams);
    } catch (const TallyError& error) {
        faults.add({first, 0, 0}, document::Code::tally_mismatch,
                   fmt::format("cannot be tallied: {}", error.what()),
                   "look at the columns named by --by and --over, and at final_cause");
        return std::nullopt;
    }
}

}  // namespace

std::optional<TallyOfInputs> tally_of_inputs(const std::vector<std::string>& paths,
                                             const likelihoods::TableSet& tables, const TallyWanted& wanted,
                                             const Streams& streams, document::Diagnostics& faults) {
    InputSum sum(faults);
    std::vector<CaseFile> rows;
    for (const std::string& path : paths) {
        CaseFile file = look_at(path, wanted.from);
        if (file.form) {
            rows.push_back(std::move(file));
            continue;
        }
        const std::size_t before = faults.size();
        std::optional<Tally> tally = tally_of(file, faults);
        if (tally) {
            check_tally(*tally, path, tables, wanted, faults);
        }
        if (tally && faults.size() == before) {
            sum.add(std::move(*tally), path);
        }
    }
    std::uint64_t set_aside = 0;
    if (!rows.empty() && faults.empty()) {
        const std::string first = rows.front().path;
        if (std::optional<Tally> tally = tally_of_rows(std::move(rows), tables, wanted, streams, faults)) {
            set_aside = tally->flow().set_aside;
            sum.add(std::move(*tally), first);
        }
    }
    std::optional<Tally> all = sum.take();
    if (!faults.empty() || !all) {
        return std::nullopt;
    }
    return TallyOfInputs{std::move(*all), set_aside};
}

}  // namespace steelyard::cli
