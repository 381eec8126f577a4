// SPDX-License-Identifier: Apache-2.0
#pragma once
// Cells in the order of each cause's forecast, prepared once so that areas under curves cost one pass for
// each weighting of the cells.

#include <Eigen/Core>
#include <cstdint>
#include <vector>

#include "cells.hpp"
#include "steelyard/engine/audit_sample.hpp"

namespace steelyard::engine {

class AreaOrder {
  public:
    AreaOrder(const AuditSample& sample, const Cells& cells);

    /// Row i, column j: sum over cases of i and cases of j of [forecast of i higher for the case of i] +
    /// [equal] / 2, each pair weighted by both cells' weights. The diagonal is 0.
    /// @param weight  shape (M)   @param wins  shape (K, K), overwritten
    void wins(const Eigen::Ref<const Eigen::ArrayXd>& weight, Eigen::ArrayXXd& wins) const;

  private:
    static constexpr std::uint32_t last_of_group = 1U << 31U;

    Eigen::ArrayXi cause_of_;  // shape (M)
    // Per cause: cells by increasing forecast, in each group of equal forecasts those of the cause itself
    // first; the top bit marks the last cell of a group.
    std::vector<std::vector<std::uint32_t>> order_;
};

}  // namespace steelyard::engine
