// SPDX-License-Identifier: Apache-2.0
#pragma once
// Replicates in blocks, several threads at once, for everything that resamples a table.

#include <Eigen/Core>
#include <functional>
#include <string_view>

#include "steelyard/engine/resampling.hpp"

namespace steelyard::engine {

/// Counts as resample_counts() takes them. @throws DomainError in the name of `function`
void check_resampling(std::string_view function, const Eigen::Ref<const Eigen::ArrayXd>& count,
                      const ResamplingOptions& options);

/// Figures of a block of replicates: column r of `weights` holds the counts of one replicate, shape (M,
/// block), and column r of `figures` is to be filled, shape (figures, block). NaN where a figure is not
/// defined.
using ReplicateFigures =
    std::function<void(const Eigen::MatrixXd& weights, Eigen::Ref<Eigen::ArrayXXd> figures)>;

/// @param count  shape (M); > 0, whole   @returns shape (R, figures)
[[nodiscard]] Eigen::ArrayXXd resample(const Eigen::ArrayXd& count, const ResamplingOptions& options,
                                       Eigen::Index figures, const ReplicateFigures& evaluate);

}  // namespace steelyard::engine
