// SPDX-License-Identifier: Apache-2.0
#pragma once
// surprise() for many patterns of the same findings: the law of ln P(pattern | cause) is worked out once for
// each cause and then looked up. docs/method.md, "Fit".

#include <Eigen/Core>
#include <cstdint>
#include <functional>
#include <vector>

#include "steelyard/engine/fit.hpp"

namespace steelyard::engine {

struct SurpriseLawLimits {
    std::uint64_t most_outcomes = 1U << 12U;  ///< of all findings together; beyond it patterns are drawn
    std::uint64_t draws = 4096;               ///< of patterns from each cause; in [1, 1e9]
};

/// ln P(band drawn | cause) of one table, draw by draw: what drawn patterns are added up from.
/// @param table    P(band | cause); shape (B, K), columns summing to 1 within 1e-9
/// @param uniform  the table's own number for a draw, in (0, 1)   @param draws  in [1, 1e9]
/// @returns        shape (draws, K) [nats]   @throws DomainError
[[nodiscard]] Eigen::ArrayXXd drawn_log_shares(const Eigen::Ref<const Eigen::ArrayXXd>& table,
                                               const std::function<double(std::uint64_t draw)>& uniform,
                                               std::uint64_t draws);

/// For each cause, the chance of a pattern at least as unusual as a given one (Box 1980, from memory): exact
/// while all outcomes can be listed, else (1 + as unusual) / (1 + draws) over the same draws for all
/// patterns, so that the standard error at 1 % of 4096 draws is 0.16 %.
class SurpriseLaw {
  public:
    /// @param bands    tables P(band | cause) of shape (B_f, K), columns summing to 1 within 1e-9; F >= 1
    /// @param uniform  called only beyond the limit   @throws DomainError  as surprise()
    /// Cost O(K outcomes log outcomes), or O(draws F (K B + one uniform)); memory K times outcomes or draws.
    explicit SurpriseLaw(const std::vector<Eigen::ArrayXXd>& bands, const UniformOfDraw& uniform = {},
                         const SurpriseLawLimits& limits = {});

    /// The same from draws of its tables made before, so that many sets of findings can share them.
    /// @param log_shares  drawn_log_shares() of each finding, all of one shape; at least one
    static SurpriseLaw of_draws(const std::vector<const Eigen::ArrayXXd*>& log_shares);

    /// @param loglik  ln P(pattern | cause) of a pattern of these findings, unweighed; shape (K) [nats]
    /// @returns       shape (K); in (0, 1]; 0 for a cause under which the pattern cannot be
    /// @throws DomainError  shape, NaN or an entry above 0
    [[nodiscard]] Eigen::ArrayXd probability(const Eigen::Ref<const Eigen::ArrayXd>& loglik) const;
    bool exact() const noexcept { return exact_; }

  private:
    SurpriseLaw() = default;

    /// ln P of outcomes, the least first, and the probability of all outcomes up to each (of draws: none).
    struct Law {
        Eigen::ArrayXd log_probability, up_to;
    };
    std::vector<Law> laws_;
    bool exact_ = true;
};

}  // namespace steelyard::engine
