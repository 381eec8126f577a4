// SPDX-License-Identifier: Apache-2.0
#pragma once
// The posterior when neither the rows of evidence nor the priors are known exactly: each is drawn from its
// own law, and each draw gives one posterior. Only the band that was seen matters, so one or two uniform
// numbers a row are enough, by inversion. docs/method.md, "Draws".
//
// Rows are drawn independently of each other, but for a row given as ratios against another, which moves with
// that one, and for one row that several causes take, which is one draw. The findings' dependence weights are
// held fixed.

#include <Eigen/Core>
#include <cstdint>
#include <memory>
#include <optional>
#include <variant>
#include <vector>

#include "steelyard/engine/index.hpp"
#include "steelyard/engine/row_forms.hpp"

namespace steelyard::engine {

/// What a case reads of one row of evidence.
struct UncertainRow {
    RowLaw law;
    std::vector<Eigen::Index> cells;  ///< bands seen: one, or several whose probabilities add up; distinct
    double log_share = 0.0;           ///< ln P(cells | cause) as weighed [nats], <= 0
    std::optional<std::size_t>
        reference;  ///< RatioLaw: an earlier row of the same finding that the ratios are against
    /// Its random streams are 2 stream and 2 stream + 1; below 2^30. The same row has the same in every case.
    std::uint32_t stream = 0;
    double least = 0.0;  ///< no drawn share is smaller [1]; in [0, 1); 0 unless the row is judged
};

/// A prior weight that is known.
struct KnownPrior {};
/// A prior weight ~ Gamma(shape) about its value; with all causes so, their shares are Dirichlet(shape).
struct CountedPrior {
    double shape = 1.0;  ///< patients; > 0
};
/// A prior weight (or odds against the rest) of which `low` and `high` are the 2.5 % and 97.5 % points:
/// log-normal, with its own spread on either side of the value.
struct RangedPrior {
    double log_low = 0.0, log_high = 0.0;  ///< ln of the ends [nats]; log_low <= log_value <= log_high
    bool is_odds = false;  ///< the value and its ends are odds o, and the weight is o / (1 + o)
};
struct UncertainPrior {
    double log_value = 0.0;  ///< ln of the weight (or odds) as stated [nats]; finite
    std::variant<KnownPrior, CountedPrior, RangedPrior> law;
    std::uint32_t stream = 0;
};

/// One case: K causes, F findings.
struct UncertainProblem {
    std::vector<UncertainPrior> priors;  ///< K >= 2
    std::vector<UncertainRow> rows;      ///< a reference stands before what refers to it
    Eigen::ArrayXXi row_of;              ///< shape (F, K): which of `rows` a cause takes for a finding
    Eigen::ArrayXd weight;               ///< shape (F): dependence factor of each finding, in (0, 1]
};

/// The problem made ready for drawing.
class UncertainPosterior {
  public:
    /// @throws DomainError  shapes differ, an index or a stream points nowhere or is used twice, a law is out
    /// of its domain
    explicit UncertainPosterior(const UncertainProblem& problem);
    ~UncertainPosterior();
    UncertainPosterior(UncertainPosterior&& other) noexcept;
    UncertainPosterior& operator=(UncertainPosterior&& other) noexcept;
    UncertainPosterior(const UncertainPosterior&) = delete;
    UncertainPosterior& operator=(const UncertainPosterior&) = delete;

    Eigen::Index causes() const noexcept;
    Eigen::Index findings() const noexcept;

    /// The sources of uncertainty: the findings, 0 to F - 1, and the priors together, F.
    Eigen::Index sources() const noexcept { return findings() + 1; }
    /// How many uniform numbers a draw of this source takes.
    Eigen::Index coordinates(Eigen::Index source) const;

    /// What a source adds to the log score of each cause, for given uniform numbers.
    /// @param uniforms  shape (N, coordinates(source)); each in [2^-33, 1 - 2^-33]
    /// @returns         shape (N, K) [nats]   @throws DomainError
    Eigen::ArrayXXd contribution(Eigen::Index source,
                                 const Eigen::Ref<const Eigen::ArrayXXd>& uniforms) const;

    /// Posteriors of the draws first, first + 1, ..., count of them. A draw's value depends on the seed and
    /// on its number alone.
    /// @param first  a multiple of `block`   @param count  at most `block`
    /// @returns      shape (count, K); each row sums to 1   @throws DomainError
    Eigen::ArrayXXd draw(std::uint64_t seed, std::uint64_t first, Eigen::Index count) const;

    /// Draws are made in blocks of this many, whatever the number of threads.
    static constexpr Eigen::Index block = 1024;

    /// The interval of ln P(cells | cause) of one row alone [nats], its reference held fixed.
    /// @param row  index into `rows`   @param level  in (0, 1 - 2^-31]   @throws DomainError
    struct LogInterval {
        double low = 0.0, high = 0.0;
    };
    LogInterval row_interval(std::size_t row, double level = 0.95) const;

  private:
    struct Prepared;
    std::unique_ptr<const Prepared> prepared_;
};

/// Softmax of each row. @param scores  shape (N, K), finite   @returns  the same shape
[[nodiscard]] Eigen::ArrayXXd softmax_rows(const Eigen::Ref<const Eigen::ArrayXXd>& scores);

}  // namespace steelyard::engine
