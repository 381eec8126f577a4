// SPDX-License-Identifier: Apache-2.0
#include "placements.hpp"

#include <cstddef>

#include "tie_groups.hpp"

namespace steelyard::engine {

Placements placements(const Eigen::Ref<const Eigen::ArrayXd>& value,
                      const Eigen::Ref<const Eigen::ArrayXd>& cases,
                      const Eigen::Ref<const Eigen::ArrayXd>& others) {
    const double all_cases = cases.sum();
    const double all_others = others.sum();
    Placements result;
    result.of_case.resize(value.size());
    result.of_other.resize(value.size());
    const TieGroups ties = tie_groups(value);
    double cases_below = 0.0;
    double others_below = 0.0;
    std::size_t at = 0;
    for (const Eigen::Index end : ties.ends) {
        const std::size_t first = at;
        double cases_here = 0.0;
        double others_here = 0.0;
        for (; at < static_cast<std::size_t>(end); ++at) {
            cases_here += cases(ties.order[at]);
            others_here += others(ties.order[at]);
        }
        for (std::size_t i = first; i < at; ++i) {
            result.of_case(ties.order[i]) = (others_below + 0.5 * others_here) / all_others;
            result.of_other(ties.order[i]) = (all_cases - cases_below - 0.5 * cases_here) / all_cases;
        }
        cases_below += cases_here;
        others_below += others_here;
    }
    result.area = (cases * result.of_case).sum() / all_cases;
    return result;
}

double sample_covariance(const Eigen::Ref<const Eigen::ArrayXd>& x, const Eigen::Ref<const Eigen::ArrayXd>& y,
                         const Eigen::Ref<const Eigen::ArrayXd>& patients) {
    const double n = patients.sum();
    const double mean_x = (patients * x).sum() / n;
    const double mean_y = (patients * y).sum() / n;
    return (patients * (x - mean_x) * (y - mean_y)).sum() / (n - 1.0);
}

}  // namespace steelyard::engine
