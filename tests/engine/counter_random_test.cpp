// SPDX-License-Identifier: Apache-2.0
// Random numbers as a function of seed, stream and draw number. The known answers are those of Random123's
// own file tests/kat_vectors (Salmon et al. 2011), carried in tests/reference/counter_random.csv.
#include "steelyard/engine/counter_random.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <fstream>
#include <sstream>
#include <string>
#include <vector>

#include "expect_domain_error.hpp"
#include "reference_inputs.hpp"

namespace steelyard::test {
namespace {

struct Line {
    std::string which, quantity, value;
};

std::vector<Line> lines() {
    std::ifstream in = open_reference("counter_random.csv");
    std::vector<Line> result;
    std::string text;
    std::getline(in, text);
    while (std::getline(in, text)) {
        std::stringstream cells(text);
        Line line;
        std::getline(cells, line.which, ',');
        std::getline(cells, line.quantity, ',');
        std::getline(cells, line.value, ',');
        result.push_back(line);
    }
    return result;
}

std::vector<std::uint32_t> words(const std::string& text, int base = 16) {
    std::stringstream in(text);
    std::vector<std::uint32_t> result;
    for (std::string word; in >> word;) {
        result.push_back(static_cast<std::uint32_t>(std::stoul(word, nullptr, base)));
    }
    return result;
}

std::string between(const std::string& text, const std::string& from, const std::string& to) {
    const std::size_t start = text.find(from) + from.size();
    return text.substr(start, to.empty() ? std::string::npos : text.find(to, start) - start);
}

TEST(CounterRandom, PublishedKnownAnswers) {
    int compared = 0;
    for (const Line& line : lines()) {
        if (line.which != "kat") {
            continue;
        }
        const std::vector<std::uint32_t> counter = words(between(line.quantity, "ctr=", " key="));
        const std::vector<std::uint32_t> key = words(between(line.quantity, "key=", ""));
        const std::vector<std::uint32_t> wanted = words(line.value);
        ASSERT_EQ(counter.size(), 4U);
        ASSERT_EQ(key.size(), 2U);
        const std::array<std::uint32_t, 4> got =
            engine::philox_block({counter[0], counter[1], counter[2], counter[3]}, {key[0], key[1]});
        EXPECT_EQ(std::vector<std::uint32_t>(got.begin(), got.end()), wanted) << line.quantity;
        ++compared;
    }
    EXPECT_EQ(compared, 3);
}

/// The stream of the reference: key deadbeef 00000001 (low word first), stream 7, blocks 0 to 2.
TEST(CounterRandom, StreamAndMapping) {
    constexpr std::uint64_t seed = 0x00000001deadbeefULL;
    std::vector<double> drawn(12);
    engine::fill_uniform(seed, 7, 0, drawn);
    int compared = 0;
    for (const Line& line : lines()) {
        if (line.which != "STREAM1") {
            continue;
        }
        if (line.quantity.starts_with("words")) {
            const std::vector<std::uint32_t> counter = words(between(line.quantity, "ctr=", "]"), 10);
            const std::array<std::uint32_t, 4> got =
                engine::philox_block({counter[0], counter[1], counter[2], counter[3]}, {0xdeadbeefU, 1U});
            EXPECT_EQ(std::vector<std::uint32_t>(got.begin(), got.end()), words(line.value)) << line.quantity;
        } else {
            const auto block = std::stoul(between(line.quantity, "block ", " "));
            const auto word = std::stoul(between(line.quantity, "word ", "]"));
            EXPECT_EQ(drawn[4 * block + word], std::stod(line.value)) << line.quantity;
            EXPECT_EQ(engine::uniform(seed, 7, 4 * block + word), std::stod(line.value)) << line.quantity;
        }
        ++compared;
    }
    EXPECT_EQ(compared, 15);
}

TEST(CounterRandom, ADrawDoesNotDependOnWhereFillingBegan) {
    EXPECT_TRUE(rc::check([](std::uint64_t seed, std::uint32_t stream) {
        const std::uint64_t first = 4 * *rc::gen::inRange<std::uint64_t>(0, 1ULL << 60U);
        const auto count = *rc::gen::inRange<std::size_t>(0, 40);
        std::vector<double> drawn(count);
        engine::fill_uniform(seed, stream, first, drawn);
        for (std::size_t i = 0; i < count; ++i) {
            RC_ASSERT(drawn[i] == engine::uniform(seed, stream, first + i));
            RC_ASSERT(drawn[i] > 0.0);
            RC_ASSERT(drawn[i] < 1.0);
        }
    }));
}

TEST(CounterRandom, FirstMustBeAMultipleOfFour) {
    std::vector<double> out(4);
    expect_domain_error([&] { engine::fill_uniform(1, 1, 2, out); }, "fill_uniform", "first", {}, 2.0,
                        "a multiple of 4");
}

}  // namespace
}  // namespace steelyard::test
