// SPDX-License-Identifier: Apache-2.0
#pragma once
// Random numbers as a function of a seed, a stream and a draw number, so that no draw depends on which thread
// made it or on how many were made before. Philox4x32-10 of Random123 (Salmon et al., Parallel random
// numbers: as easy as 1, 2, 3, SC11, 2011). docs/method.md, "Draws".

#include <array>
#include <cstdint>
#include <span>

namespace steelyard::engine {

/// One block of Philox4x32-10. @param counter, key  any words
[[nodiscard]] std::array<std::uint32_t, 4> philox_block(const std::array<std::uint32_t, 4>& counter,
                                                        const std::array<std::uint32_t, 2>& key);

/// Uniform numbers of one stream for the draws first, first + 1, ...: word (draw mod 4) of the block with
/// counter {low half of draw / 4, stream, high half of draw / 4, 0} and the seed as key (low half first),
/// mapped by (w + 1/2) 2^-32.
/// @param first  number of the first draw; a multiple of 4
/// @param out    filled; each in [2^-33, 1 - 2^-33]: never 0 or 1
/// @throws DomainError  first is no multiple of 4
void fill_uniform(std::uint64_t seed, std::uint32_t stream, std::uint64_t first, std::span<double> out);

/// The same for a single draw.
[[nodiscard]] double uniform(std::uint64_t seed, std::uint32_t stream, std::uint64_t draw);

}  // namespace steelyard::engine
