// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/row_forms.hpp"

#include <Eigen/QR>
#include <cmath>
#include <limits>
#include <optional>
#include <string_view>
#include <utility>

#include "guards.hpp"
#include "steelyard/engine/boost_policy.hpp"
#include "steelyard/engine/domain_error.hpp"
#include "steelyard/engine/log_math.hpp"
#include "steelyard/engine/one_against_rest.hpp"
#include "student_t.hpp"

namespace steelyard::engine {
namespace {

constexpr double infinity = std::numeric_limits<double>::infinity();
constexpr double least_share = 1e-6;          // a smaller one claims more than a million patients could show
constexpr double least_probability = 1e-300;  // below this a band counts as a hard zero
constexpr double fewest_patients = 1e-6;
constexpr double most_patients = 1e12;  // more than there are people; keeps sums and quotients exact enough
constexpr double share_tolerance = 0.005;
constexpr double simplex_tolerance = 1e-6;
constexpr double rank_threshold = 1e-9;

/// No band may be impossible. @throws DomainError naming the band
void check_no_zero(std::string_view function, const Eigen::ArrayXd& probability) {
    for (Eigen::Index band = 0; band < probability.size(); ++band) {
        if (!(probability(band) >= least_probability)) {
            throw DomainError(function, "band probability", band, std::nullopt, probability(band),
                              ">= 1e-300");
        }
    }
}

/// A row of band probabilities given by the caller: > 0, at most 1, sums to 1.
void check_row(std::string_view function, std::string_view argument,
               const Eigen::Ref<const Eigen::ArrayXd>& row) {
    check_all_positive(function, argument, row, 1.0, "> 0 and <= 1");
    check_simplex(function, argument, row, simplex_tolerance);
}

CompiledRow dirichlet_row(std::string_view function, Eigen::ArrayXd alpha) {
    CompiledRow row;
    row.probability = alpha / compensated_sum(alpha);
    check_no_zero(function, row.probability);
    row.law = DirichletLaw{std::move(alpha)};
    return row;
}

void check_edges(Scale scale, const Eigen::Ref<const Eigen::ArrayXd>& edges) {
    check_size_at_least("summary_row", "edges", edges.size(), 1);
    if (scale == Scale::log) {
        check_all_positive("summary_row", "edges", edges, infinity, "finite and > 0 on the log scale");
    } else {
        check_all_between("summary_row", "edges", edges, -infinity, infinity);
    }
    for (Eigen::Index i = 1; i < edges.size(); ++i) {
        if (!(edges(i) > edges(i - 1))) {
            throw DomainError("summary_row", "edges", i, std::nullopt, edges(i),
                              "greater than the edge before it");
        }
    }
}

}  // namespace

CompiledRow counts_row(const Eigen::Ref<const Eigen::ArrayXd>& counts, double start) {
    check_size_at_least("counts_row", "counts", counts.size(), 2);
    check_all_between("counts_row", "counts", counts, 0.0, most_patients);
    check_between("counts_row", "start", start, fewest_patients, most_patients);
    return dirichlet_row("counts_row", counts + start);
}

CompiledRow share_row(const Eigen::Ref<const Eigen::ArrayXd>& share, double worth) {
    check_size_at_least("share_row", "share", share.size(), 2);
    check_all_between("share_row", "share", share, least_share, 1.0 - least_share);
    check_simplex("share_row", "share", share, share_tolerance);
    check_between("share_row", "worth", worth, fewest_patients, most_patients);
    return dirichlet_row("share_row", share * (worth / compensated_sum(share)));
}

CompiledRow summary_row(double mean, double sd, double n, Scale scale,
                        const Eigen::Ref<const Eigen::ArrayXd>& edges) {
    check_between("summary_row", "mean", mean, -infinity, infinity);
    check_positive("summary_row", "sd", sd);
    check_between("summary_row", "n", n, 2.0, most_patients);
    check_edges(scale, edges);

    // Long double throughout: a tail far out is so steep that rounding t to a double would cost digits.
    const long double patients = n;
    const long double predictive_scale = static_cast<long double>(sd) * std::sqrt(1.0L + 1.0L / patients);
    const auto standardised = [&](double edge) {
        const long double x = scale == Scale::log ? std::log(static_cast<long double>(edge)) : edge;
        return (x - mean) / predictive_scale;
    };
    const Eigen::Index bands = edges.size() + 1;
    CompiledRow row;
    row.probability.resize(bands);
    with_boost("summary_row", "n", n, [&] {
        long double low = -std::numeric_limits<long double>::infinity();
        for (Eigen::Index band = 0; band < bands; ++band) {
            const bool last = band == bands - 1;
            const long double high =
                last ? std::numeric_limits<long double>::infinity() : standardised(edges(band));
            row.probability(band) = static_cast<double>(student_t_between(low, high, patients - 1.0L));
            low = high;
        }
    });
    check_no_zero("summary_row", row.probability);
    row.law = SummaryLaw{mean, sd, n, scale, edges};
    return row;
}

RatioRow ratio_row(const Eigen::Ref<const Eigen::ArrayXd>& ratio,
                   const Eigen::Ref<const Eigen::ArrayXd>& log_sd,
                   const Eigen::Ref<const Eigen::ArrayXd>& reference, double tolerance) {
    check_size_at_least("ratio_row", "ratio", ratio.size(), 2);
    check_size("ratio_row", "log_sd", log_sd.size(), ratio.size());
    check_size("ratio_row", "reference", reference.size(), ratio.size());
    check_all_positive("ratio_row", "ratio", ratio, infinity, "finite and > 0");
    check_all_between("ratio_row", "log_sd", log_sd, 0.0, infinity);
    check_row("ratio_row", "reference", reference);
    check_between("ratio_row", "tolerance", tolerance, 0.0, 1.0);

    const Eigen::ArrayXd product = ratio * reference;
    const double sum = compensated_sum(product);
    RatioRow result;
    result.miss = sum - 1.0;
    if (!(std::abs(result.miss) <= tolerance)) {
        throw DomainError("ratio_row", "sum of ratio * reference", std::nullopt, std::nullopt, sum,
                          "1 within the tolerance");
    }
    result.row.probability = product / sum;
    check_no_zero("ratio_row", result.row.probability);
    result.row.law = RatioLaw{ratio.log(), log_sd};
    return result;
}

RestSolution solve_ratio_to_rest(const Eigen::Ref<const Eigen::ArrayXXd>& ratio,
                                 const Eigen::Ref<const Eigen::ArrayXd>& study_mix) {
    check_size_at_least("solve_ratio_to_rest", "ratio rows", ratio.rows(), 2);
    check_size_at_least("solve_ratio_to_rest", "ratio columns", ratio.cols(), 2);
    check_mix("solve_ratio_to_rest", "study_mix", study_mix, ratio.cols());
    for (Eigen::Index cause = 0; cause < ratio.cols(); ++cause) {
        for (Eigen::Index band = 0; band < ratio.rows(); ++band) {
            if (!(std::isfinite(ratio(band, cause)) && ratio(band, cause) > 0.0)) {
                throw DomainError("solve_ratio_to_rest", "ratio", band, cause, ratio(band, cause),
                                  "finite and > 0");
            }
        }
    }

    const Eigen::ArrayXXd shape = shape_from_rest(ratio, study_mix);
    RestSolution result;
    result.band_sum = (shape.matrix() * study_mix.matrix()).array();
    result.incoherence = (result.band_sum - 1.0).abs();

    // shape^T m = 1, one equation a cause; solved for the departure from equal bands, so that what the
    // equations leave open stays there.
    const Eigen::VectorXd equal =
        Eigen::VectorXd::Constant(ratio.rows(), 1.0 / static_cast<double>(ratio.rows()));
    Eigen::CompleteOrthogonalDecomposition<Eigen::MatrixXd> equations;
    equations.setThreshold(rank_threshold);
    equations.compute(shape.matrix().transpose());
    const Eigen::VectorXd gap = Eigen::VectorXd::Ones(ratio.cols()) - shape.matrix().transpose() * equal;
    result.study_share = (equal + equations.solve(gap)).array();
    result.scale_is_unique = equations.rank() == ratio.rows();
    for (Eigen::Index band = 0; band < ratio.rows(); ++band) {
        if (!(result.study_share(band) > 0.0)) {
            throw DomainError("solve_ratio_to_rest", "share of the study in band", band, std::nullopt,
                              result.study_share(band), "> 0: no study can have given these ratios");
        }
    }

    result.probability = shape.colwise() * result.study_share;
    result.column_miss.resize(ratio.cols());
    for (Eigen::Index cause = 0; cause < ratio.cols(); ++cause) {
        const double sum = compensated_sum(result.probability.col(cause));
        result.column_miss(cause) = sum - 1.0;
        result.probability.col(cause) /= sum;
        check_no_zero("solve_ratio_to_rest", result.probability.col(cause));
    }
    return result;
}

BoundedRow keep_at_least(const Eigen::Ref<const Eigen::ArrayXd>& probability, double least) {
    check_size_at_least("keep_at_least", "probability", probability.size(), 2);
    check_simplex("keep_at_least", "probability", probability, simplex_tolerance);
    check_between("keep_at_least", "least", least, 0.0, 0.2);
    BoundedRow result;
    result.acted = (probability < least).any();
    result.probability = probability;
    if (result.acted) {
        const Eigen::ArrayXd raised = probability.max(least);
        result.probability = raised / compensated_sum(raised);
    }
    return result;
}

}  // namespace steelyard::engine
