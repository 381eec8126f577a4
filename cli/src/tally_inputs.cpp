// SPDX-License-Identifier: Apache-2.0
#include "tally_inputs.hpp"

#include <fmt/format.h>

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

}  // namespace

std::optional<Tally> tally_of_inputs(const std::vector<std::string>& paths,
                                     const likelihoods::TableSet& tables, const TallyWanted& wanted,
                                     document::Diagnostics& faults) {
    std::optional<Tally> all;
    std::string first;
    for (const std::string& path : paths) {
        const std::size_t before = faults.size();
        std::optional<Tally> tally = load_tally(path, faults);
        if (!tally) {
            continue;
        }
        check_tally(*tally, path, tables, wanted, faults);
        if (faults.size() > before) {
            continue;
        }
        if (!all) {
            all = std::move(tally);
            first = path;
            continue;
        }
        try {
            all->merge(*tally);
        } catch (const TallyError& error) {
            faults.add({path, 0, 0}, document::Code::tally_mismatch,
                       fmt::format("cannot be added to {}: {}", visible(first), error.what()),
                       "audit them one by one");
        }
    }
    return faults.empty() ? std::move(all) : std::nullopt;
}

}  // namespace steelyard::cli
