// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/one_against_rest.hpp"

#include <limits>

#include "exact_sum.hpp"
#include "guards.hpp"
#include "steelyard/engine/domain_error.hpp"

namespace steelyard::engine {
namespace {

constexpr double mix_tolerance = 1e-6;

void check_ratio(std::string_view function, const Eigen::Ref<const Eigen::ArrayXXd>& ratio,
                 const Eigen::Ref<const Eigen::ArrayXd>& study_mix) {
    check_mix(function, "study_mix", study_mix, ratio.cols());
    check_all_positive(function, "ratio", ratio, std::numeric_limits<double>::infinity(), "finite and > 0");
}

}  // namespace

void check_mix(std::string_view function, std::string_view argument,
               const Eigen::Ref<const Eigen::ArrayXd>& mix, Eigen::Index causes) {
    check_size_at_least(function, argument, mix.size(), 2);
    check_size(function, argument, mix.size(), causes);
    for (Eigen::Index cause = 0; cause < mix.size(); ++cause) {
        if (!(mix(cause) > 0.0 && mix(cause) < 1.0)) {
            throw DomainError(function, argument, cause, std::nullopt, mix(cause), "> 0 and < 1");
        }
    }
    check_simplex(function, argument, mix, mix_tolerance);
}

Eigen::ArrayXXd ratio_to_rest(const Eigen::Ref<const Eigen::ArrayXXd>& probability,
                              const Eigen::Ref<const Eigen::ArrayXd>& mix) {
    check_mix("ratio_to_rest", "mix", mix, probability.cols());
    check_all_positive("ratio_to_rest", "probability", probability, 1.0, "> 0 and <= 1");
    Eigen::ArrayXXd ratio(probability.rows(), probability.cols());
    for (Eigen::Index cause = 0; cause < probability.cols(); ++cause) {
        for (Eigen::Index band = 0; band < probability.rows(); ++band) {
            ExactSum rest;  // over the others themselves: the whole minus one would cancel
            for (Eigen::Index other = 0; other < probability.cols(); ++other) {
                if (other != cause) {
                    rest.add_product(mix(other), probability(band, other));
                }
            }
            ratio(band, cause) = probability(band, cause) * (1.0 - mix(cause)) / rest.value();
        }
    }
    return ratio;
}

Eigen::ArrayXXd shape_from_rest(const Eigen::Ref<const Eigen::ArrayXXd>& ratio,
                                const Eigen::Ref<const Eigen::ArrayXd>& study_mix) {
    check_ratio("shape_from_rest", ratio, study_mix);
    Eigen::ArrayXXd shape(ratio.rows(), ratio.cols());
    for (Eigen::Index cause = 0; cause < ratio.cols(); ++cause) {
        const double w = study_mix(cause);
        shape.col(cause) = ratio.col(cause) / (1.0 - w + w * ratio.col(cause));
    }
    return shape;
}

Eigen::ArrayXXd log_slope_from_rest(const Eigen::Ref<const Eigen::ArrayXXd>& ratio,
                                    const Eigen::Ref<const Eigen::ArrayXd>& study_mix) {
    check_ratio("log_slope_from_rest", ratio, study_mix);
    Eigen::ArrayXXd slope(ratio.rows(), ratio.cols());
    for (Eigen::Index cause = 0; cause < ratio.cols(); ++cause) {
        const double w = study_mix(cause);
        slope.col(cause) = (1.0 - w) / (1.0 - w + w * ratio.col(cause));
    }
    return slope;
}

Eigen::ArrayXd band_sum(const Eigen::Ref<const Eigen::ArrayXXd>& ratio,
                        const Eigen::Ref<const Eigen::ArrayXd>& study_mix) {
    check_ratio("band_sum", ratio, study_mix);
    return (shape_from_rest(ratio, study_mix).matrix() * study_mix.matrix()).array();
}

Eigen::ArrayXd pair_ratio(const Eigen::Ref<const Eigen::ArrayXXd>& probability, CauseIndex a, CauseIndex b) {
    check_index("pair_ratio", "a", a.value, probability.cols());
    check_index("pair_ratio", "b", b.value, probability.cols());
    check_all_positive("pair_ratio", "probability", probability, 1.0, "> 0 and <= 1");
    return probability.col(a.value) / probability.col(b.value);
}

}  // namespace steelyard::engine
