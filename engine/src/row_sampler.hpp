// SPDX-License-Identifier: Apache-2.0
#pragma once
// One row of evidence, or one prior weight, as a function of uniform numbers.

#include <Eigen/Core>
#include <memory>
#include <vector>

#include "quantile_table.hpp"
#include "steelyard/engine/uncertain_posterior.hpp"

namespace steelyard::engine::detail {

/// ln P(cells | cause) [nats] as a function of one or two uniform numbers.
class RowSampler {
  public:
    virtual ~RowSampler() = default;
    /// How many uniform numbers it takes.
    virtual Eigen::Index coordinates() const noexcept { return 1; }
    /// @param uniforms   shape (N, coordinates())
    /// @param reference  shape (N): the draws of the row that ratios are against; empty for other laws
    /// @param out        shape (N); each <= 0
    virtual void fill(const Eigen::Ref<const Eigen::ArrayXXd>& uniforms,
                      const Eigen::Ref<const Eigen::ArrayXd>& reference,
                      Eigen::Ref<Eigen::ArrayXd> out) const = 0;
};

/// @param reference_log_share  ln of the share of the row that ratios are against, as weighed; unused
/// otherwise
std::unique_ptr<const RowSampler> row_sampler(const UncertainRow& row, double reference_log_share);

/// ln of a prior weight [nats] as a function of one uniform number.
class PriorSampler {
  public:
    explicit PriorSampler(const UncertainPrior& prior);
    bool is_known() const noexcept { return known_; }
    double log_weight(double u) const noexcept;

  private:
    bool known_ = false;
    bool is_odds_ = false;
    double log_value_ = 0.0;
    double below_ = 0.0, above_ = 0.0;  // log standard deviations on either side of the value
    const QuantileTable* deviates_ = nullptr;
    QuantileTable own_;  // of a counted prior
};

}  // namespace steelyard::engine::detail
