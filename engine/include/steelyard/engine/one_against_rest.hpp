// SPDX-License-Identifier: Apache-2.0
#pragma once
// Likelihood ratios of one cause against the mix of all others, and what they tell about per-cause rows. For
// display and for reading published ratios only: with more than two causes such ratios must not be
// multiplied, because the mix of the rest changes with every finding. docs/method.md, "Rows".

#include <Eigen/Core>
#include <string_view>

#include "steelyard/engine/index.hpp"

namespace steelyard::engine {

/// A mix of causes: each in (0, 1), sums to 1 within 1e-6, one entry a cause. @throws DomainError
void check_mix(std::string_view function, std::string_view argument,
               const Eigen::Ref<const Eigen::ArrayXd>& mix, Eigen::Index causes);

/// R(b, c) = p(b, c) / sum over j other than c of w_j p(b, j) / (1 - w_c).
/// @param probability  P(band | cause) [1]; shape (B, K), K >= 2; > 0, <= 1
/// @param mix          [1]; shape (K); each in (0, 1), sums to 1 within 1e-6
/// @returns            [1]; shape (B, K); > 0   @throws DomainError
[[nodiscard]] Eigen::ArrayXXd ratio_to_rest(const Eigen::Ref<const Eigen::ArrayXXd>& probability,
                                            const Eigen::Ref<const Eigen::ArrayXd>& mix);

/// p(b, c) / m(b) = R / (1 - w + w R): the rows up to one factor a band, m(b) = P(band) in the study. This
/// factor is common to all causes, so the shape is all that a posterior needs.
/// @param ratio  one against rest [1]; shape (B, K), K >= 2; finite, > 0   @param study_mix  as `mix` above
[[nodiscard]] Eigen::ArrayXXd shape_from_rest(const Eigen::Ref<const Eigen::ArrayXXd>& ratio,
                                              const Eigen::Ref<const Eigen::ArrayXd>& study_mix);

/// d ln(p(b, c) / m(b)) / d ln R = (1 - w) / (1 - w + w R): how much of an uncertainty of ln R is one of the
/// row. The more of band b the cause holds already, the less its row moves.
/// @param ratio, study_mix  as above   @returns  [1]; shape (B, K); in (0, 1)   @throws DomainError
[[nodiscard]] Eigen::ArrayXXd log_slope_from_rest(const Eigen::Ref<const Eigen::ArrayXXd>& ratio,
                                                  const Eigen::Ref<const Eigen::ArrayXd>& study_mix);

/// S per band = sum over causes of w R / (1 - w + w R). The ratios describe one study only where S = 1.
/// @returns  [1]; shape (B)
[[nodiscard]] Eigen::ArrayXd band_sum(const Eigen::Ref<const Eigen::ArrayXXd>& ratio,
                                      const Eigen::Ref<const Eigen::ArrayXd>& study_mix);

/// P(band | a) / P(band | b) per band: the ratios that may be multiplied across independent findings.
/// @param probability  as above   @param a, b  causes, each in [0, K)   @returns  [1]; shape (B)
[[nodiscard]] Eigen::ArrayXd pair_ratio(const Eigen::Ref<const Eigen::ArrayXXd>& probability, CauseIndex a,
                                        CauseIndex b);

}  // namespace steelyard::engine
