// SPDX-License-Identifier: Apache-2.0
#pragma once
// Cases drawn from tables and priors: a cause by its prior, a band of each finding by the cause's row, and a
// panel that reads into these bands. docs/method.md, "Simulated cases".

#include <cstdint>
#include <string>
#include <vector>

#include "steelyard/likelihoods/made_panel.hpp"
#include "steelyard/priors/prior_set.hpp"

namespace steelyard::cli {

struct SimulationOptions {
    std::uint64_t seed = 1;
    double missing = 0.0;               ///< chance that a finding is left out, whatever its band
    std::vector<std::string> findings;  ///< the only ones drawn; empty for all
    bool alternatives = false;          ///< of alternatives draw any one instead of the preferred one
};

class Simulation {
  public:
    /// @param priors  names only causes of the tables
    /// @throws UsageError  a finding is not of the set, or no case can show a band
    Simulation(const likelihoods::TableSet& tables, const priors::PriorSet& priors,
               const SimulationOptions& options);

    /// Case number `index`, from 0: the same whatever other cases are made, and on whichever thread.
    /// @param reader  of the tables, to check the case more quickly; each thread has its own
    likelihoods::MadePanel one(std::uint64_t index, likelihoods::PointReader* reader = nullptr) const;

    const likelihoods::PanelMaker& maker() const noexcept { return maker_; }

  private:
    /// Sums of a distribution, for drawing from it.
    using Cumulative = std::vector<double>;

    likelihoods::BandsToShow bands_of(std::uint64_t index, std::size_t cause) const;

    const likelihoods::TableSet& tables_;
    SimulationOptions options_;
    std::vector<std::string> causes_;
    Cumulative prior_;
    std::vector<std::vector<Cumulative>> rows_;  ///< per table and cause
    std::vector<bool> listed_;                   ///< per table: asked for
    /// Of each list of alternatives the tables that may be drawn, in order of preference; the first alone by
    /// default.
    std::vector<std::vector<std::size_t>> alternatives_;
    likelihoods::PanelMaker maker_;
};

/// Simulated cases as text. A panel is written with the entries in their order.
std::string simulated_csv_header(const std::vector<likelihoods::PanelEntry>& entries);
void add_simulated_csv(const likelihoods::Panel& panel, const std::vector<likelihoods::PanelEntry>& entries,
                       std::string& text);
void add_simulated_yaml(const likelihoods::Panel& panel, const std::vector<likelihoods::PanelEntry>& entries,
                        std::string& text);
void add_simulated_ndjson(const likelihoods::Panel& panel,
                          const std::vector<likelihoods::PanelEntry>& entries, std::string& text);

}  // namespace steelyard::cli
