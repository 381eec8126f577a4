// SPDX-License-Identifier: Apache-2.0
#pragma once
// Binomial numbers from one Philox stream.

#include <array>
#include <cstdint>

namespace steelyard::engine {

/// Draws one after the other from a stream; each takes as many words as it needs.
class BinomialSampler {
  public:
    BinomialSampler(std::uint64_t seed, std::uint32_t stream);

    /// Successes in `trials` trials. Under a mean of 10 by inversion; from 10 on by Hoermann's transformed
    /// rejection with squeeze (BTRS, J Stat Comput Simul 1993;46:101, from memory).
    /// @param trials  whole, >= 0   @param p  in [0, 1]
    double draw(double trials, double p);

    double uniform();  ///< in (0, 1), on a grid of 2^-53: what inverts it reaches far into the tail

  private:
    std::uint32_t word();
    double coarse();  // in (0, 1), on a grid of 2^-32: enough to propose and to accept

    double by_inversion(double trials, double p);
    double by_rejection(double trials, double p);

    std::uint64_t seed_;
    std::uint32_t stream_;
    std::uint64_t block_ = 0;
    std::array<std::uint32_t, 4> words_{};
    unsigned used_ = 4;
};

}  // namespace steelyard::engine
