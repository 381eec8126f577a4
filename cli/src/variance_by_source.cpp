// SPDX-License-Identifier: Apache-2.0
#include <algorithm>

#include "sensitivity_parts.hpp"
#include "steelyard/engine/counter_random.hpp"
#include "steelyard/engine/parallel.hpp"
#include "steelyard/engine/quasi_random.hpp"
#include "steelyard/engine/variance_shares.hpp"

namespace steelyard::cli {
namespace {

constexpr Eigen::Index points = 512;  // of each set, in each replicate; a power of 2
constexpr int replicates = 8;
constexpr std::uint32_t shift_stream = 0xd0000000U;  // apart from the streams of rows, priors and fit

/// A random word for each dimension, other ones in each replicate.
std::uint32_t shift_word(std::uint64_t seed, int replicate, Eigen::Index dimension) {
    return engine::philox_block(
        {static_cast<std::uint32_t>(dimension), shift_stream, static_cast<std::uint32_t>(replicate), 0U},
        {static_cast<std::uint32_t>(seed), static_cast<std::uint32_t>(seed >> 32U)})[0];
}

/// The points of each replicate: the same Sobol' points, shifted anew. A problem with more dimensions than
/// the sequence has gets random points, which are as right and less even.
class Points {
  public:
    Points(std::uint64_t seed, Eigen::Index dimensions) : seed_(seed), dimensions_(dimensions) {
        if (dimensions > 0 && dimensions <= engine::most_sobol_dimensions) {
            plain_ = engine::sobol_points(points, dimensions);
        }
    }

    Eigen::ArrayXXd of(int replicate) const {
        Eigen::ArrayXXd cube(points, dimensions_);
        for (Eigen::Index d = 0; d < dimensions_; ++d) {
            const std::uint32_t word = shift_word(seed_, replicate, d);
            if (plain_.cols() == 0) {
                engine::fill_uniform((static_cast<std::uint64_t>(word) << 32U) ^ seed_, shift_stream + 1U, 0,
                                     {cube.col(d).data(), static_cast<std::size_t>(points)});
                continue;
            }
            cube.col(d) = plain_.col(d).unaryExpr([word](double x) {
                // x is a whole number of 2^-32: a digital shift changes its bits, and the half keeps it off
                // 0.
                const auto bits = static_cast<std::uint32_t>(x * 0x1p32) ^ word;
                return (static_cast<double>(bits) + 0.5) * 0x1p-32;
            });
        }
        return cube;
    }

  private:
    std::uint64_t seed_;
    Eigen::Index dimensions_;
    Eigen::ArrayXXd plain_;
};

Eigen::ArrayXd leaders_posterior(const Eigen::ArrayXXd& scores, Eigen::Index leader) {
    return engine::softmax_rows(scores).col(leader);
}

}  // namespace

std::vector<VarianceSource> variance_by_source(const CaseModel& model, const UncertainCase& uncertain,
                                               const engine::UncertainPosterior& posterior,
                                               const likelihoods::Pattern& pattern, Eigen::Index leader,
                                               std::uint64_t seed, int threads) {
    const Eigen::Index sources = posterior.sources();
    Eigen::Index dimensions = 0;
    for (Eigen::Index s = 0; s < sources; ++s) {
        dimensions += posterior.coordinates(s);
    }
    std::vector<engine::VarianceShares> shares(replicates);
    const Points all_points(seed, 2 * dimensions);
    engine::run_in_parallel(replicates, threads, [&](Eigen::Index replicate) {
        // Even columns make A, odd ones B, so that both get dimensions of equal quality.
        const Eigen::ArrayXXd cube = all_points.of(static_cast<int>(replicate));
        std::vector<Eigen::ArrayXXd> of_a;
        std::vector<Eigen::ArrayXXd> of_b;
        Eigen::ArrayXXd sum_a = Eigen::ArrayXXd::Zero(points, posterior.causes());
        Eigen::ArrayXXd sum_b = sum_a;
        Eigen::Index used = 0;
        for (Eigen::Index s = 0; s < sources; ++s) {
            const Eigen::Index width = posterior.coordinates(s);
            Eigen::ArrayXXd a(points, width);
            Eigen::ArrayXXd b(points, width);
            for (Eigen::Index c = 0; c < width; ++c, ++used) {
                a.col(c) = cube.col(2 * used);
                b.col(c) = cube.col(2 * used + 1);
            }
            of_a.push_back(posterior.contribution(s, a));
            of_b.push_back(posterior.contribution(s, b));
            sum_a += of_a.back();
            sum_b += of_b.back();
        }
        Eigen::ArrayXXd mixed(points, sources);
        for (Eigen::Index s = 0; s < sources; ++s) {
            const auto i = static_cast<std::size_t>(s);
            mixed.col(s) = leaders_posterior(sum_a - of_a[i] + of_b[i], leader);
        }
        shares[static_cast<std::size_t>(replicate)] = engine::variance_shares(
            leaders_posterior(sum_a, leader), leaders_posterior(sum_b, leader), mixed);
    });
    const engine::ReplicatedShares mean = engine::replicated_shares(shares);
    std::vector<VarianceSource> list;
    if (!mean.varies) {
        return list;
    }
    for (Eigen::Index s = 0; s < sources; ++s) {
        const std::string name =
            s == sources - 1
                ? "prior"
                : model.tables()
                      .tables[pattern.findings[uncertain.findings[static_cast<std::size_t>(s)]].table]
                      .finding;
        list.push_back({name, mean.first(s), mean.first_error(s), mean.total(s), mean.total_error(s)});
    }
    std::stable_sort(list.begin(), list.end(),
                     [](const VarianceSource& a, const VarianceSource& b) { return a.total > b.total; });
    return list;
}

}  // namespace steelyard::cli
