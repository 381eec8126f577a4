// SPDX-License-Identifier: Apache-2.0
#include "steelyard/document/diagnostic.hpp"

#include <gtest/gtest.h>

#include <set>

#include "support.hpp"

namespace {

using namespace steelyard::document;  // NOLINT: a test of this room

TEST(SourcePosition, IsWrittenWithLineAndColumnOrAsTheFileAlone) {
    EXPECT_EQ(to_string(SourcePosition{"tables/a.yaml", 14, 9}), "tables/a.yaml:14:9");
    EXPECT_EQ(to_string(SourcePosition{"tables/a.yaml", 0, 0}), "tables/a.yaml");
}

TEST(Code, IsWrittenAsItsNameWithHyphens) {
    EXPECT_EQ(to_string(Code::unreadable_file), "unreadable-file");
    EXPECT_EQ(to_string(Code::too_many_values), "too-many-values");
    EXPECT_EQ(to_string(Code::conflicting_keys), "conflicting-keys");
    EXPECT_EQ(to_string(Code::conflicting_values), "conflicting-values");
    EXPECT_EQ(to_string(Code::composite_without_parts), "composite-without-parts");
    EXPECT_EQ(to_string(Code::unused_source), "unused-source");
    EXPECT_EQ(to_string(Code::band_sum), "band-sum");
    EXPECT_EQ(to_string(Code::duplicate_finding), "duplicate-finding");
    EXPECT_EQ(to_string(Code::missing_file), "missing-file");
}

TEST(Code, ListsEachOnceInTheOrderOfTheEnum) {
    std::set<std::string_view> names;
    for (std::size_t i = 0; i < all_codes().size(); ++i) {
        EXPECT_EQ(static_cast<std::size_t>(all_codes()[i]), i);
        names.insert(to_string(all_codes()[i]));
    }
    EXPECT_EQ(names.size(), all_codes().size());
    EXPECT_EQ(all_codes().back(), Code::tally_mismatch);
}

TEST(Diagnostics, AreSortedByFileOfFirstMentionThenPlaceThenDiscovery) {
    Diagnostics faults;
    faults.add({"b", 2, 1}, Code::syntax, "first");
    faults.add({"a", 1, 1}, Code::syntax, "second");
    faults.add({"b", 1, 7}, Code::syntax, "third");
    faults.add({"b", 1, 7}, Code::alias, "fourth");
    faults.add({"b", 0, 0}, Code::too_large, "fifth");
    std::vector<std::string> order;
    for (const Diagnostic& fault : faults.sorted()) {
        order.push_back(fault.message);
    }
    EXPECT_EQ(order, (std::vector<std::string>{"fifth", "third", "fourth", "first", "second"}));
    EXPECT_EQ(faults.size(), 5U);
    EXPECT_FALSE(faults.empty());
}

TEST(Diagnostics, FindTheLineOfAFaultInTheRememberedText) {
    Diagnostics faults;
    faults.remember_text("f", "\xEF\xBB\xBFone\r\ntwo\n\nfour");
    faults.add({"f", 1, 1}, Code::syntax, "a");
    faults.add({"f", 2, 1}, Code::syntax, "b");
    faults.add({"f", 3, 1}, Code::syntax, "c");
    faults.add({"f", 4, 1}, Code::syntax, "d");
    faults.add({"f", 5, 1}, Code::syntax, "past the end");
    faults.add({"g", 1, 1}, Code::syntax, "another file");
    std::vector<std::string> lines;
    for (const Diagnostic& fault : faults.sorted()) {
        lines.push_back(fault.source_line);
    }
    EXPECT_EQ(lines, (std::vector<std::string>{"one", "two", "", "four", "", ""}));
}

TEST(LoadError, HoldsTheFaultsAndSaysThem) {
    Diagnostics faults;
    faults.add({"sets/even.yaml", 3, 5}, Code::bad_odds, "the odds are 0");
    const LoadError error(faults);
    EXPECT_EQ(error.faults().sorted(), faults.sorted());
    EXPECT_STREQ(error.what(), "sets/even.yaml:3:5: error[bad-odds]: the odds are 0\n");
}

}  // namespace
