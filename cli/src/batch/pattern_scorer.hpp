// SPDX-License-Identifier: Apache-2.0
#pragma once
// Posteriors of patterns, each computed once.

#include <array>
#include <memory>
#include <mutex>
#include <string>
#include <string_view>
#include <unordered_map>
#include <vector>

#include "../case_model.hpp"
#include "steelyard/likelihoods/pattern_code.hpp"

namespace steelyard::cli {

/// What a pattern gives. The numbers are those of weigh_case() for a case with this pattern, to the bit.
struct PatternScore {
    std::vector<double> posterior;  ///< by weighed cause
    std::size_t leader = 0;
    std::vector<std::size_t> aside;  ///< tables whose finding is set aside
};

class PatternScorer {
  public:
    PatternScorer(const likelihoods::TableSet& tables, const std::vector<WeighedCause>& causes);

    const CaseModel& model() const noexcept { return model_; }
    PatternScore score(std::string_view code) const;

  private:
    const likelihoods::TableSet& tables_;
    CaseModel model_;
};

/// Texts by key, made once each, for many threads. Holds at most so many; beyond that they are made anew.
class SharedTexts {
  public:
    struct Entry {
        std::string key, text;
    };

    explicit SharedTexts(std::size_t most) : most_in_shard_(most / shards) {}

    /// @param make  gives the text of a key not met before
    /// @returns  an entry that lasts as long as this object; null when there is no room: then nothing was
    /// made
    template <class Make>
    const Entry* get(std::string_view key, std::size_t hash, const Make& make) {
        Shard& shard = shards_[(hash >> 40U) % shards];
        const std::lock_guard lock(shard.mutex);
        const auto found = shard.entries.find(key);
        if (found != shard.entries.end()) {
            return found->second.get();
        }
        if (shard.entries.size() >= most_in_shard_) {
            return nullptr;
        }
        auto entry = std::make_unique<Entry>(Entry{std::string(key), make()});
        const std::string_view kept = entry->key;
        return shard.entries.emplace(kept, std::move(entry)).first->second.get();
    }

  private:
    static constexpr std::size_t shards = 64;
    struct Shard {
        std::mutex mutex;
        std::unordered_map<std::string_view, std::unique_ptr<Entry>> entries;
    };
    std::size_t most_in_shard_;
    std::array<Shard, shards> shards_;
};

}  // namespace steelyard::cli
