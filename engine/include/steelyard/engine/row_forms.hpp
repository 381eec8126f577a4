// SPDX-License-Identifier: Apache-2.0
#pragma once
// Rows of evidence in the forms in which it is published, compiled to P(band | cause) with the law of its
// uncertainty. Every form gives band probabilities that are > 0 and sum to 1; a band whose probability would
// be under 1e-300 is refused, since nothing seen later could make good a zero. docs/method.md, "Rows".

#include <Eigen/Core>
#include <optional>
#include <variant>
#include <vector>

namespace steelyard::engine {

enum class Scale { linear, log };

/// Band probabilities ~ Dirichlet(alpha).
struct DirichletLaw {
    Eigen::ArrayXd alpha;  ///< shape (B); > 0
};

/// A normal (or log-normal) quantity with mean and variance from their normal / scaled-inverse-chi-square
/// posterior.
struct SummaryLaw {
    double mean = 0.0;  ///< on the scale
    double sd = 1.0;    ///< on the scale
    double n = 2.0;
    Scale scale = Scale::linear;
    Eigen::ArrayXd edges;  ///< shape (B - 1), on the linear scale
    /// [1], in [0, 0.2]; above 0 when keep_at_least() acted on the row: each share then stands for
    /// max(share, least) over the sum of the raised row.
    double least = 0.0;
};

/// Ratios against a reference row: probability = ratio * reference, ln ratio ~ normal(., sd).
struct RatioLaw {
    Eigen::ArrayXd log_ratio;  ///< shape (B)
    Eigen::ArrayXd log_sd;     ///< shape (B); 0 where no interval was given
};

using RowLaw = std::variant<DirichletLaw, SummaryLaw, RatioLaw>;

struct CompiledRow {
    Eigen::ArrayXd probability;  ///< shape (B); each in (0, 1]; sums to 1 within B * 2^-52
    RowLaw law;
};

/// Patients counted per band: the posterior mean of a Dirichlet that starts at `start` in each band
/// (Jeffreys: 1/2): (count + start) / (sum of counts + B start).
/// @param counts  patients [1]; shape (B), B >= 2; each in [0, 1e12], need not be whole
/// @param start   [1], in [1e-6, 1e12]   @throws DomainError
CompiledRow counts_row(const Eigen::Ref<const Eigen::ArrayXd>& counts, double start = 0.5);

/// Proportions and how many patients they are worth: Dirichlet with mean `share` and total `worth`.
/// @param share  [1]; shape (B), B >= 2; each in [1e-6, 1 - 1e-6], since a share nearer 0 or 1 claims what no
/// study can
///               show; sums to 1 within 0.005 (then normalised)
/// @param worth  patients [1], in [1e-6, 1e12]   @throws DomainError
CompiledRow share_row(const Eigen::Ref<const Eigen::ArrayXd>& share, double worth);

/// A published mean and standard deviation of n patients: the Student-t predictive with n - 1 degrees of
/// freedom and scale sd * sqrt(1 + 1/n), integrated over the bands (Gelman et al., Bayesian Data Analysis,
/// the normal model with its noninformative prior; from memory). On the log scale mean and sd are of the
/// natural logarithm. Differences of tail areas are taken on the side where they are small, so far bands keep
/// their relative accuracy (1e-12 for n up to 300 and bands 30 scales away, at least 1e-6 of a scale wide).
/// @param mean   [the finding's unit, or its ln], finite   @param sd  [same], finite, > 0
/// @param n      patients [1], in [2, 1e12], need not be whole
/// @param edges  [the finding's unit]; shape (B - 1), B >= 2; increasing, finite; > 0 on the log scale
/// @throws DomainError
CompiledRow summary_row(double mean, double sd, double n, Scale scale,
                        const Eigen::Ref<const Eigen::ArrayXd>& edges);

struct RatioRow {
    CompiledRow row;
    double miss = 0.0;  ///< sum of ratio * reference minus 1, before normalising
};
/// Published ratios against another cause's row. The products must sum to 1 within `tolerance`; they are then
/// normalised.
/// @param ratio      [1]; shape (B), B >= 2; finite, > 0   @param log_sd  [nats]; shape (B), finite, >= 0,
/// standard
///                   deviation of ln ratio
/// @param reference  P(band | the other cause) [1]; shape (B); > 0, sums to 1 within 1e-6
/// @param tolerance  [1], in [0, 1]   @throws DomainError
RatioRow ratio_row(const Eigen::Ref<const Eigen::ArrayXd>& ratio,
                   const Eigen::Ref<const Eigen::ArrayXd>& log_sd,
                   const Eigen::Ref<const Eigen::ArrayXd>& reference, double tolerance);

/// One-against-rest ratios of every cause with the mix of the study that measured them, solved for per-cause
/// rows.
struct RestSolution {
    Eigen::ArrayXXd probability;  ///< shape (B, K); columns sum to 1
    Eigen::ArrayXd
        band_sum;  ///< S per band: sum over causes of w R / (1 - w + w R); coherent ratios have S = 1
    Eigen::ArrayXd incoherence;   ///< |S - 1| per band
    Eigen::ArrayXd column_miss;   ///< sum of each solved column minus 1, before normalising
    Eigen::ArrayXd study_share;   ///< m per band: P(band) in the study, all causes together; shape (B); > 0
    bool scale_is_unique = true;  ///< false when the ratios leave m open (more bands than independent rows)
};
/// p_c / m = R_c / (1 - w_c + w_c R_c) per band; the bands' scales m by least squares so that columns sum to
/// 1 (docs/method.md, "Rows"). Where that leaves m open, the m nearest to equal bands is taken: posteriors do
/// not depend on it, since m is common to all causes of a band.
/// @param ratio  [1]; shape (B, K), B >= 2, K >= 2; finite, > 0
/// @param study_mix  [1]; shape (K); each in (0, 1), sums to 1 within 1e-6
/// @throws DomainError  also when a solved m is not > 0: then no study can have given these ratios
RestSolution solve_ratio_to_rest(const Eigen::Ref<const Eigen::ArrayXXd>& ratio,
                                 const Eigen::Ref<const Eigen::ArrayXd>& study_mix);

/// Raises every band of a row to at least `least`, then normalises, so that a raised band ends a little below
/// `least`; `acted` tells whether a band was raised.
struct BoundedRow {
    Eigen::ArrayXd probability;  ///< the row itself, untouched, when no band was raised
    bool acted = false;
};
/// @param probability  [1]; shape (B), B >= 2; >= 0, sums to 1 within 1e-6   @param least  [1], in [0, 0.2]
/// @throws DomainError
BoundedRow keep_at_least(const Eigen::Ref<const Eigen::ArrayXd>& probability, double least);

}  // namespace steelyard::engine
