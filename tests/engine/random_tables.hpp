// SPDX-License-Identifier: Apache-2.0
#pragma once
// Random distributions and tables of P(band | cause) for property tests. Call inside rc::check.

#include <rapidcheck.h>

#include <Eigen/Core>
#include <vector>

namespace steelyard::test {

/// A distribution over `size` places; each share at least `least` thousandths of the largest.
inline Eigen::ArrayXd random_share(Eigen::Index size, int least = 1) {
    const auto list =
        *rc::gen::container<std::vector<int>>(static_cast<std::size_t>(size), rc::gen::inRange(least, 1001));
    Eigen::ArrayXd share = Eigen::Map<const Eigen::ArrayXi>(list.data(), size).cast<double>();
    share(*rc::gen::inRange<Eigen::Index>(0, size)) += 1.0;  // not all 0
    return share / share.sum();
}

/// Shape (bands, causes); columns sum to 1.
inline Eigen::ArrayXXd random_table(Eigen::Index bands, Eigen::Index causes, int least = 1) {
    Eigen::ArrayXXd table(bands, causes);
    for (Eigen::Index k = 0; k < causes; ++k) {
        table.col(k) = random_share(bands, least);
    }
    return table;
}

inline Eigen::ArrayXd array(const std::vector<double>& values) {
    return Eigen::Map<const Eigen::ArrayXd>(values.data(), static_cast<Eigen::Index>(values.size()));
}

}  // namespace steelyard::test
