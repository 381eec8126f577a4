// SPDX-License-Identifier: Apache-2.0
#include "pattern_sensitivities.hpp"

#include <utility>

#include "steelyard/likelihoods/pattern_code.hpp"

namespace steelyard::cli {
namespace {

/// All that the draws, ranges and next tests of a case depend on: its pattern, and which of the findings it
/// lacks would not be read if they were known.
std::string key_of(const likelihoods::TableSet& tables, const likelihoods::Pattern& pattern) {
    std::string key = likelihoods::code_of(tables, pattern);
    for (const likelihoods::FindingReading& reading : pattern.findings) {
        key += reading.barred.empty() ? '.' : 'b';
    }
    return key;
}

}  // namespace

PatternSensitivities::PatternSensitivities(const likelihoods::TableSet& tables,
                                           const priors::PriorSet& priors, SensitivityOptions options)
    : tables_(tables), priors_(priors), options_(std::move(options)) {}

std::shared_ptr<PatternSensitivities::Entry> PatternSensitivities::entry_of(const std::string& key) {
    const std::lock_guard lock(mutex_);
    auto& entry = entries_[key];
    if (!entry) {
        entry = std::make_shared<Entry>();
        by_age_.push_back(key);
        if (by_age_.size() > most) {  // whoever still uses the oldest holds it
            entries_.erase(by_age_.front());
            by_age_.pop_front();
            return entries_.at(key);
        }
    }
    return entry;
}

Sensitivity PatternSensitivities::of(const Weighing& weighing) {
    const std::shared_ptr<Entry> entry = entry_of(key_of(tables_, weighing.pattern));
    std::call_once(entry->once,
                   [&] { entry->sensitivity = sensitivity_of(tables_, priors_, weighing, options_); });
    Sensitivity result = entry->sensitivity;
    result.edges = value_edges_of(tables_, weighing);
    return result;
}

}  // namespace steelyard::cli
