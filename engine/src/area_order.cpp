// SPDX-License-Identifier: Apache-2.0
#include "area_order.hpp"

#include <cstddef>

#include "tie_groups.hpp"

namespace steelyard::engine {

AreaOrder::AreaOrder(const AuditSample& sample, const Cells& cells)
    : cause_of_(cells.cause), order_(static_cast<std::size_t>(sample.causes())) {
    std::vector<Eigen::Index> first_cell(static_cast<std::size_t>(sample.patterns()) + 1, 0);
    for (Eigen::Index c = 0; c < cells.size(); ++c) {
        ++first_cell[static_cast<std::size_t>(cells.pattern(c)) + 1];
    }
    for (std::size_t g = 1; g < first_cell.size(); ++g) {
        first_cell[g] += first_cell[g - 1];
    }
    for (std::size_t cause = 0; cause < order_.size(); ++cause) {
        std::vector<std::uint32_t>& order = order_[cause];
        order.reserve(static_cast<std::size_t>(cells.size()));
        const TieGroups ties = tie_groups(log_odds_against_rest(sample, static_cast<Eigen::Index>(cause)));
        std::vector<std::uint32_t> others;
        std::size_t at = 0;
        for (const Eigen::Index end : ties.ends) {
            const std::size_t before = order.size();
            others.clear();
            for (; at < static_cast<std::size_t>(end); ++at) {
                const auto pattern = static_cast<std::size_t>(ties.order[at]);
                for (Eigen::Index c = first_cell[pattern]; c < first_cell[pattern + 1]; ++c) {
                    const bool own = static_cast<std::size_t>(cells.cause(c)) == cause;
                    (own ? order : others).push_back(static_cast<std::uint32_t>(c));
                }
            }
            order.insert(order.end(), others.begin(), others.end());
            if (order.size() > before) {
                order.back() |= last_of_group;
            }
        }
    }
}

void AreaOrder::wins(const Eigen::Ref<const Eigen::ArrayXd>& weight, Eigen::ArrayXXd& wins) const {
    const auto causes = static_cast<Eigen::Index>(order_.size());
    wins.setZero(causes, causes);
    Eigen::ArrayXd below(causes);  // weight with a lower forecast, by final cause
    Eigen::ArrayXd won(causes);
    for (Eigen::Index cause = 0; cause < causes; ++cause) {
        below.setZero();
        won.setZero();
        double own = 0.0;  // weight of the cause itself in the group at hand
        bool counted = true;
        for (const std::uint32_t entry : order_[static_cast<std::size_t>(cause)]) {
            const auto cell = static_cast<Eigen::Index>(entry & ~last_of_group);
            const double here = weight(cell);
            const Eigen::Index label = cause_of_(cell);
            if (label == cause) {
                own += here;
                counted = false;
            } else {
                if (!counted) {
                    won += own * below;
                    counted = true;
                }
                won(label) += 0.5 * own * here;
                below(label) += here;
            }
            if ((entry & last_of_group) != 0) {
                if (!counted) {
                    won += own * below;
                    counted = true;
                }
                own = 0.0;
            }
        }
        won(cause) = 0.0;
        wins.row(cause) = won.transpose();
    }
}

}  // namespace steelyard::engine
