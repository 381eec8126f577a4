// SPDX-License-Identifier: Apache-2.0
#pragma once
// Evidence tables shown to people and programs: shared by `tables show` and `tables check`.

#include <nlohmann/json.hpp>
#include <string>
#include <vector>

#include "steelyard/likelihoods/table_set.hpp"

namespace steelyard::cli {

/// The ratio P(band | cause) / P(band | against) with the 95 % interval of the tables' uncertainty.
struct BandRatio {
    std::string band;
    double value = 1.0, low = 1.0, high = 1.0;
};
std::vector<BandRatio> band_ratios(const likelihoods::TableSet& set, const likelihoods::EvidenceTable& table,
                                   const std::string& cause, const std::string& against);

/// `glomerular filtration rate from renal failure; all others from low aldosterone`.
std::string takes_words(const likelihoods::TableSet& set, const likelihoods::Cause& composite);

/// @param cause, against  both empty: band probabilities; otherwise the ratio of the two
std::string tables_text(const likelihoods::TableSet& set,
                        const std::vector<const likelihoods::EvidenceTable*>& tables,
                        const std::string& cause, const std::string& against, bool colour);
nlohmann::ordered_json tables_json(const likelihoods::TableSet& set,
                                   const std::vector<const likelihoods::EvidenceTable*>& tables,
                                   const std::string& cause, const std::string& against);

}  // namespace steelyard::cli
