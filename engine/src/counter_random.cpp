// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/counter_random.hpp"

#include <Random123/philox.h>

#include <algorithm>
#include <cstddef>
#include <optional>

#include "steelyard/engine/domain_error.hpp"

namespace steelyard::engine {
namespace {

using Generator = r123::Philox4x32;

Generator::ctr_type block_of(std::uint64_t seed, std::uint32_t stream, std::uint64_t number) {
    const Generator::key_type key = {
        {static_cast<std::uint32_t>(seed), static_cast<std::uint32_t>(seed >> 32U)}};
    const Generator::ctr_type counter = {
        {static_cast<std::uint32_t>(number), stream, static_cast<std::uint32_t>(number >> 32U), 0U}};
    return Generator()(counter, key);
}

double to_uniform(std::uint32_t word) {
    return (static_cast<double>(word) + 0.5) * 0x1p-32;
}

}  // namespace

std::array<std::uint32_t, 4> philox_block(const std::array<std::uint32_t, 4>& counter,
                                          const std::array<std::uint32_t, 2>& key) {
    const Generator::ctr_type block =
        Generator()({{counter[0], counter[1], counter[2], counter[3]}}, {{key[0], key[1]}});
    return {block[0], block[1], block[2], block[3]};
}

void fill_uniform(std::uint64_t seed, std::uint32_t stream, std::uint64_t first, std::span<double> out) {
    if (first % 4 != 0) {
        throw DomainError("fill_uniform", "first", std::nullopt, std::nullopt, static_cast<double>(first),
                          "a multiple of 4");
    }
    std::uint64_t number = first / 4;
    for (std::size_t at = 0; at < out.size(); at += 4, ++number) {
        const Generator::ctr_type block = block_of(seed, stream, number);
        const std::size_t words = std::min<std::size_t>(4, out.size() - at);
        for (std::size_t word = 0; word < words; ++word) {
            out[at + word] = to_uniform(block[word]);
        }
    }
}

double uniform(std::uint64_t seed, std::uint32_t stream, std::uint64_t draw) {
    return to_uniform(block_of(seed, stream, draw / 4)[draw % 4]);
}

}  // namespace steelyard::engine
