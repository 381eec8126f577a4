// SPDX-License-Identifier: Apache-2.0
#pragma once
// Multinomial counts over many cells, drawn over and over with the same expected counts.

#include <Eigen/Core>
#include <cstdint>
#include <vector>

#include "binomial_sampler.hpp"

namespace steelyard::engine {

/// Counts ~ Multinomial(n, count / n), exactly.
///
/// Cells of more than 256 patients are drawn first, each from the binomial law given those before it. What
/// remains is shared by the small cells: first independent Poisson numbers with a rate a little under the
/// count, which makes their sum N fall short of what remains; given N they are multinomial, whatever N is, so
/// that a sum that is too large may be thrown away; then the missing patients one by one. Cells with equal
/// counts share one table of the Poisson law, so that most cells cost one look-up.
class MultinomialSampler {
  public:
    /// @param count  shape (M); whole, >= 0; sum > 0
    explicit MultinomialSampler(const Eigen::Ref<const Eigen::ArrayXd>& count);

    /// @param out  shape (M), overwritten
    void draw(std::uint64_t seed, std::uint32_t stream, Eigen::Ref<Eigen::VectorXd> out) const;

  private:
    /// A law on first, first + 1, ... by inversion, with a guide to where the search starts.
    struct Table {
        double first = 0.0;
        std::vector<double> reached;       // P(X <= first + i); the last is 1
        std::vector<std::uint32_t> guide;  // smallest i with reached[i] > j / size

        double draw(double u) const;
    };
    static Table poisson(double rate);

    /// Independent Poisson numbers into the small cells. @returns their sum
    double draw_independently(BinomialSampler& random, Eigen::Ref<Eigen::VectorXd> out) const;
    Eigen::Index one_small_cell(BinomialSampler& random) const;

    Eigen::ArrayXd count_;
    std::vector<Eigen::Index> large_, small_;  // cells
    Eigen::ArrayXd left_before_;  // of the large cells: patients in it, those after it and the small ones
    bool independent_first_ = false;
    std::vector<Table> tables_;           // by count
    std::vector<double> keep_;            // alias method over the small cells: chance to keep the one hit
    std::vector<std::uint32_t> instead_;  // and what to take otherwise, as a place in small_
};

}  // namespace steelyard::engine
