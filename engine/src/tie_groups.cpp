// SPDX-License-Identifier: Apache-2.0
#include "tie_groups.hpp"

#include <algorithm>
#include <cmath>
#include <cstddef>
#include <numeric>

namespace steelyard::engine {

TieGroups tie_groups(const Eigen::Ref<const Eigen::ArrayXd>& value) {
    TieGroups groups;
    groups.order.resize(static_cast<std::size_t>(value.size()));
    std::iota(groups.order.begin(), groups.order.end(), Eigen::Index{0});
    std::stable_sort(groups.order.begin(), groups.order.end(),
                     [&](Eigen::Index a, Eigen::Index b) { return value(a) < value(b); });
    double first = 0.0;
    for (std::size_t at = 0; at < groups.order.size(); ++at) {
        const double here = value(groups.order[at]);
        const bool equal = at > 0 && here - first <= 1e-11 * std::max(1.0, std::abs(first));
        if (!equal) {
            if (at > 0) {
                groups.ends.push_back(static_cast<Eigen::Index>(at));
            }
            first = here;
        }
    }
    if (!groups.order.empty()) {
        groups.ends.push_back(value.size());
    }
    return groups;
}

}  // namespace steelyard::engine
