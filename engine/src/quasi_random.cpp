// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/quasi_random.hpp"

#include <boost/random/sobol.hpp>
#include <cstddef>
#include <string_view>

#include "guards.hpp"

namespace steelyard::engine {
namespace {

constexpr double grid = 1.0 / 4294967296.0;  // 2^-32

/// Boost's 64-bit default would keep bits that the grid drops; at 32 bits the two agree on every bit kept.
using Sobol32 = boost::random::sobol_engine<std::uint32_t, 32U>;
static_assert(most_sobol_dimensions <= boost::random::default_sobol_table::max_dimension);

Eigen::ArrayXXd points(Eigen::Index n, const DigitalShift& shift, double offset) {
    constexpr std::string_view name = "sobol_points";
    check_between(name, "n", static_cast<double>(n), 1.0, static_cast<double>(most_sobol_points));
    check_between(name, "dimensions", static_cast<double>(shift.size()), 1.0,
                  static_cast<double>(most_sobol_dimensions));
    Sobol32 engine(static_cast<std::size_t>(shift.size()));
    Eigen::ArrayXXd at(n, shift.size());
    for (Eigen::Index i = 0; i < n; ++i) {
        for (Eigen::Index d = 0; d < shift.size(); ++d) {
            // Boost starts at the point after the origin.
            const std::uint32_t x = i == 0 ? 0U : engine();
            at(i, d) = (static_cast<double>(x ^ shift(d)) + offset) * grid;
        }
    }
    return at;
}

}  // namespace

Eigen::ArrayXXd sobol_points(Eigen::Index n, Eigen::Index dimensions) {
    check_between("sobol_points", "dimensions", static_cast<double>(dimensions), 1.0,
                  static_cast<double>(most_sobol_dimensions));
    return points(n, DigitalShift::Zero(dimensions), 0.0);
}

Eigen::ArrayXXd sobol_points(Eigen::Index n, const DigitalShift& shift) {
    return points(n, shift, 0.5);
}

}  // namespace steelyard::engine
