// SPDX-License-Identifier: Apache-2.0
#pragma once
// Sensitivities of cases, computed once for each pattern.

#include <list>
#include <memory>
#include <mutex>
#include <string>
#include <unordered_map>

#include "steelyard/cli/sensitivity.hpp"

namespace steelyard::cli {

class PatternSensitivities {
  public:
    PatternSensitivities(const likelihoods::TableSet& tables, const priors::PriorSet& priors,
                         SensitivityOptions options);

    /// As sensitivity_of(), by any thread. @param weighing  a case that was weighed
    Sensitivity of(const Weighing& weighing);

  private:
    struct Entry {
        std::once_flag once;
        Sensitivity sensitivity;
    };
    static constexpr std::size_t most = 256;

    std::shared_ptr<Entry> entry_of(const std::string& key);

    const likelihoods::TableSet& tables_;
    const priors::PriorSet& priors_;
    SensitivityOptions options_;
    std::mutex mutex_;
    std::unordered_map<std::string, std::shared_ptr<Entry>> entries_;
    std::list<std::string> by_age_;
};

}  // namespace steelyard::cli
