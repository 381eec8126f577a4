// SPDX-License-Identifier: Apache-2.0
#include "simulation.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <stdexcept>

#include "open_inputs.hpp"
#include "steelyard/cli/terminal.hpp"
#include "steelyard/engine/counter_random.hpp"

namespace steelyard::cli {
namespace {

using likelihoods::EvidenceTable;
using likelihoods::TableSet;

// Streams of the random numbers, docs/method.md, "Draws".
constexpr std::uint32_t cause_stream = 0xb0000000U;
constexpr std::uint32_t band_stream = 0xb0000001U;
constexpr std::uint32_t missing_stream = 0xb0000002U;
constexpr std::uint32_t alternative_stream = 0xb0000003U;
constexpr std::uint32_t value_stream = 0xb0000004U;

/// The numbers of one case in one stream: each case has room for a whole number of blocks.
std::vector<double> numbers_of(std::uint64_t seed, std::uint32_t stream, std::uint64_t index,
                               std::size_t count) {
    const std::uint64_t room = (count + 3) / 4 * 4;
    std::vector<double> numbers(count);
    engine::fill_uniform(seed, stream, index * room, numbers);
    return numbers;
}

std::vector<double> sums_of(const Eigen::ArrayXd& probabilities) {
    std::vector<double> sums;
    double sum = 0.0;
    for (const double p : probabilities) {
        sums.push_back(sum += p);
    }
    return sums;
}

std::size_t drawn_from(const std::vector<double>& sums, double uniform) {
    const auto place = std::upper_bound(sums.begin(), sums.end(), uniform * sums.back());
    return std::min(static_cast<std::size_t>(place - sums.begin()), sums.size() - 1);
}

std::vector<bool> listed(const TableSet& tables, const std::vector<std::string>& findings) {
    std::vector<bool> flags(tables.tables.size(), findings.empty());
    std::vector<std::string> known;
    for (const EvidenceTable& table : tables.tables) {
        known.push_back(table.finding);
    }
    for (const std::string& finding : findings) {
        const auto place = std::find(known.begin(), known.end(), finding);
        if (place == known.end()) {
            throw UsageError(fmt::format("--findings {}: the tables have no such finding{}", visible(finding),
                                         suggestion(finding, known)));
        }
        flags[static_cast<std::size_t>(place - known.begin())] = true;
    }
    return flags;
}

std::vector<std::vector<std::size_t>> alternatives_among(const TableSet& tables,
                                                         const std::vector<bool>& flags, bool all) {
    std::vector<std::vector<std::size_t>> lists;
    for (const likelihoods::OneOf& one_of : tables.one_of) {
        std::vector<std::size_t> list;
        for (const std::string& finding : one_of.findings) {
            for (std::size_t t = 0; t < tables.tables.size(); ++t) {
                if (flags[t] && tables.tables[t].finding == finding && (all || list.empty())) {
                    list.push_back(t);
                }
            }
        }
        lists.push_back(std::move(list));
    }
    return lists;
}

/// The tables of which cases may show something: those listed, less the alternatives passed over.
std::vector<bool> ever_drawn(const TableSet& tables, const std::vector<bool>& flags,
                             const std::vector<std::vector<std::size_t>>& alternatives) {
    std::vector<bool> drawn = flags;
    for (std::size_t i = 0; i < alternatives.size(); ++i) {
        for (std::size_t t = 0; t < tables.tables.size(); ++t) {
            const auto& names = tables.one_of[i].findings;
            const bool member =
                std::find(names.begin(), names.end(), tables.tables[t].finding) != names.end();
            const bool may =
                std::find(alternatives[i].begin(), alternatives[i].end(), t) != alternatives[i].end();
            drawn[t] = drawn[t] && (!member || may);
        }
    }
    return drawn;
}

likelihoods::PanelMaker maker_for(const TableSet& tables, std::vector<bool> drawn) {
    try {
        return {tables, std::move(drawn)};
    } catch (const std::invalid_argument& error) {
        throw UsageError(fmt::format("no case can be made for these tables: {}", error.what()));
    }
}

}  // namespace

Simulation::Simulation(const TableSet& tables, const priors::PriorSet& priors,
                       const SimulationOptions& options)
    : tables_(tables),
      options_(options),
      listed_(listed(tables, options.findings)),
      alternatives_(alternatives_among(tables, listed_, options.alternatives)),
      maker_(maker_for(tables, ever_drawn(tables, listed_, alternatives_))) {
    listed_ = ever_drawn(tables, listed_, alternatives_);
    // In the order of the tables, so that the order of a prior file changes no draw.
    for (const likelihoods::Cause& cause : tables_.causes) {
        if (const priors::PriorCause* prior = priors.find(cause.id)) {
            causes_.push_back(cause.id);
            prior_.push_back((prior_.empty() ? 0.0 : prior_.back()) + prior->probability);
        }
    }
    for (const EvidenceTable& table : tables_.tables) {
        const Eigen::ArrayXXd bands = likelihoods::band_probabilities(tables_, table, causes_);
        std::vector<Cumulative> rows;
        for (Eigen::Index k = 0; k < bands.cols(); ++k) {
            rows.push_back(sums_of(bands.col(k)));
        }
        rows_.push_back(std::move(rows));
    }
}

likelihoods::BandsToShow Simulation::bands_of(std::uint64_t index, std::size_t cause) const {
    const std::size_t count = tables_.tables.size();
    const std::vector<double> band = numbers_of(options_.seed, band_stream, index, count);
    const std::vector<double> missing = numbers_of(options_.seed, missing_stream, index, count);
    const std::vector<double> choice =
        numbers_of(options_.seed, alternative_stream, index, alternatives_.size());
    likelihoods::BandsToShow bands(count, likelihoods::left_out);
    for (std::size_t t = 0; t < count; ++t) {
        if (listed_[t] && missing[t] >= options_.missing) {
            bands[t] = static_cast<int>(drawn_from(rows_[t][cause], band[t]));
        }
    }
    for (std::size_t i = 0; i < alternatives_.size(); ++i) {
        const auto& list = alternatives_[i];
        const auto chosen = static_cast<std::size_t>(choice[i] * static_cast<double>(list.size()));
        for (std::size_t a = 0; a < list.size(); ++a) {
            if (a != chosen) {
                bands[list[a]] = likelihoods::left_out;
            }
        }
    }
    return bands;
}

likelihoods::MadePanel Simulation::one(std::uint64_t index, likelihoods::PointReader* reader) const {
    const std::size_t cause = drawn_from(prior_, engine::uniform(options_.seed, cause_stream, index));
    likelihoods::MadePanel made =
        maker_.make(fmt::format("larkmoor-sim-{:06}", index + 1), bands_of(index, cause),
                    numbers_of(options_.seed, value_stream, index, maker_.numbers()), reader);
    made.panel.final_cause = causes_[cause];
    return made;
}

}  // namespace steelyard::cli
