// SPDX-License-Identifier: Apache-2.0
#include "steelyard/document/digest.hpp"

#include <gtest/gtest.h>

namespace {

using steelyard::document::digest;

// Expected values by GNU coreutils 9.1, independent of the library used: printf 'NAME\0LENGTH\0TEXT...' |
// sha256sum.
TEST(Digest, IsTheSha256OfNamesLengthsAndTexts) {
    // sha256sum of no input; also the value of the empty message in FIPS 180-4's published examples
    EXPECT_EQ(digest({}), "sha256:e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855");
    // printf 'a.yaml\0003\000abc' | sha256sum
    EXPECT_EQ(digest({{"a.yaml", "abc"}}),
              "sha256:14f1d03c878c67a345492f0f1e7b07e3dbdbc5931bd38d88bd4d6f9d0119eccb");
    // printf 'a.yaml\0003\000abcb.yaml\0000\000' | sha256sum
    EXPECT_EQ(digest({{"a.yaml", "abc"}, {"b.yaml", ""}}),
              "sha256:9ff1cbe3d83eec62e54fbd298cafba9d6818123bab3ec028e1bccac2ca5b2e46");
}

TEST(Digest, DoesNotDependOnTheOrderOfFiles) {
    EXPECT_EQ(digest({{"b", "2"}, {"a", "1"}}), digest({{"a", "1"}, {"b", "2"}}));
}

TEST(Digest, ChangesWithANameATextOrABorderBetweenThem) {
    const std::string one = digest({{"a", "bc"}});
    EXPECT_NE(one, digest({{"ab", "c"}}));
    EXPECT_NE(one, digest({{"a", "bd"}}));
    EXPECT_NE(one, digest({{"a", "b"}, {"c", ""}}));
    EXPECT_NE(digest({{"a", "b"}, {"c", "d"}}), digest({{"a", std::string("bc\0001\000d", 6)}}));
}

}  // namespace
