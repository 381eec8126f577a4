// SPDX-License-Identifier: Apache-2.0
// Any bytes as a prior set: only LoadError may escape, and a set that loads keeps what its type promises.
#include <cmath>
#include <cstddef>
#include <cstdint>
#include <cstdlib>
#include <string>
#include <string_view>
#include <vector>

#include "steelyard/document/diagnostic.hpp"
#include "steelyard/priors/prior_set.hpp"
#include "steelyard/priors/prior_set_markdown.hpp"

namespace {

void require(bool holds) {
    if (!holds) {
        std::abort();
    }
}

void check_promises(const steelyard::priors::PriorSet& set) {
    const auto causes = static_cast<double>(set.causes.size());
    require(set.causes.size() >= 2);
    double sum = 0.0;
    for (const auto& cause : set.causes) {
        require(cause.probability > 0.0 && cause.probability <= 1.0);
        require(!cause.range_low || (*cause.range_low <= cause.given && cause.given <= *cause.range_high));
        sum += cause.probability;
    }
    require(std::abs(sum - 1.0) <= causes * 1e-15);
    require(set.log_prior().isFinite().all());
    require(!steelyard::priors::priors_markdown(set).empty());
    if (set.causes.size() > 2) {
        const auto rest = steelyard::priors::without(set, {set.causes.front().id});
        require(rest.causes.size() + 1 == set.causes.size());
        require(rest.log_prior().isFinite().all());
    }
}

}  // namespace

extern "C" int LLVMFuzzerTestOneInput(const std::uint8_t* data, std::size_t size) {
    // A length of 0 may come with a null pointer.
    const std::string text(data, data + size);
    try {
        check_promises(steelyard::priors::read_prior_set(text, "fuzz.yaml"));
    } catch (const steelyard::document::LoadError& error) {
        require(!error.faults().empty());
    }
    return 0;
}
