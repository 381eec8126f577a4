// SPDX-License-Identifier: Apache-2.0
#pragma once
// The cells of an audit's table that hold patients, as a list.

#include <Eigen/Core>

namespace steelyard::engine {

/// M cells, pattern after pattern.
struct Cells {
    Eigen::ArrayXi pattern;  ///< shape (M): row of the table
    Eigen::ArrayXi cause;    ///< shape (M): its column
    Eigen::ArrayXd count;    ///< shape (M): patients, > 0

    explicit Cells(const Eigen::ArrayXXd& table) {
        const Eigen::Index size = (table > 0.0).count();
        pattern.resize(size);
        cause.resize(size);
        count.resize(size);
        Eigen::Index at = 0;
        for (Eigen::Index g = 0; g < table.rows(); ++g) {
            for (Eigen::Index k = 0; k < table.cols(); ++k) {
                if (table(g, k) > 0.0) {
                    pattern(at) = static_cast<int>(g);
                    cause(at) = static_cast<int>(k);
                    count(at) = table(g, k);
                    ++at;
                }
            }
        }
    }

    Eigen::Index size() const { return count.size(); }
};

}  // namespace steelyard::engine
