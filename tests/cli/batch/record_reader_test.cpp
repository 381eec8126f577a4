// SPDX-License-Identifier: Apache-2.0
#include "batch/record_reader.hpp"

#include <gtest/gtest.h>
#include <rapidcheck.h>

#include <algorithm>
#include <cstring>
#include <memory>
#include <vector>

#include "batch/csv_fields.hpp"

namespace steelyard::cli {
namespace {

/// Bytes from memory, a few at a time.
class GivenBytes final : public ByteSource {
  public:
    GivenBytes(std::string text, std::size_t at_once) : text_(std::move(text)), at_once_(at_once) {}
    std::size_t read(std::span<char> into) override {
        const std::size_t count = std::min({into.size(), at_once_, text_.size() - given_});
        std::memcpy(into.data(), text_.data() + given_, count);
        given_ += count;
        return count;
    }
    std::uint64_t taken() const override { return given_; }

  private:
    std::string text_;
    std::size_t at_once_, given_ = 0;
};

std::vector<Block> blocks_of(const std::string& text, RecordForm form, std::size_t block,
                             std::size_t longest = 1000, std::size_t at_once = 7) {
    RecordReader reader(std::make_unique<GivenBytes>(text, at_once), form, block, longest);
    std::vector<Block> blocks;
    for (Block one; reader.next(one);) {
        blocks.push_back(one);
    }
    return blocks;
}

using Fields = std::vector<std::string>;

/// All records as fields, read block by block.
std::vector<Fields> records_of(const std::string& text, std::size_t block, std::size_t at_once = 7) {
    std::vector<Fields> records;
    CsvFields csv;
    for (const Block& one : blocks_of(text, RecordForm::csv, block, 1000, at_once)) {
        std::string_view rest = one.text;
        while (!rest.empty()) {
            EXPECT_TRUE(csv.take(rest));
            records.emplace_back(csv.fields().begin(), csv.fields().end());
        }
    }
    return records;
}

// RFC 4180, section 2: the examples of its rules 1 to 7.
TEST(Csv, ReadsTheExamplesOfRfc4180) {
    const std::vector<Fields> two = {{"aaa", "bbb", "ccc"}, {"zzz", "yyy", "xxx"}};
    EXPECT_EQ(records_of("aaa,bbb,ccc\r\nzzz,yyy,xxx\r\n", 8), two);
    EXPECT_EQ(records_of("aaa,bbb,ccc\r\nzzz,yyy,xxx", 8), two);
    EXPECT_EQ(records_of("\"aaa\",\"bbb\",\"ccc\"\r\nzzz,yyy,xxx", 8), two);
    EXPECT_EQ(records_of("\"aaa\",\"b\r\nbb\",\"ccc\"\r\nzzz,yyy,xxx", 8),
              (std::vector<Fields>{{"aaa", "b\r\nbb", "ccc"}, {"zzz", "yyy", "xxx"}}));
    EXPECT_EQ(records_of("\"aaa\",\"b\"\"bb\",\"ccc\"", 8), (std::vector<Fields>{{"aaa", "b\"bb", "ccc"}}));
}

TEST(Csv, KeepsEmptyFieldsAndDropsAByteOrderMark) {
    EXPECT_EQ(records_of("\xEF\xBB\xBF"
                         "a,,\n,\"\",b\n",
                         3),
              (std::vector<Fields>{{"a", "", ""}, {"", "", "b"}}));
}

std::string quoted(const std::string& field) {
    std::string text = "\"";
    for (const char c : field) {
        text.append(c == '"' ? 2 : 1, c);
    }
    return text + "\"";
}

TEST(Csv, AnyFieldsComeBackWhateverTheBlocks) {
    EXPECT_TRUE(rc::check("write, cut into blocks, read", [] {
        const auto rows = *rc::gen::inRange(1, 6);
        const auto columns = *rc::gen::inRange(1, 4);
        std::vector<Fields> expected;
        std::string text;
        for (int r = 0; r < rows; ++r) {
            Fields& fields = expected.emplace_back();
            for (int c = 0; c < columns; ++c) {
                const auto field =
                    *rc::gen::container<std::string>(rc::gen::elementOf(std::string("ab,\"\n\r ")));
                const bool plain = field.find_first_of(",\"\n\r") == std::string::npos;
                text += c > 0 ? "," : "";
                text += plain && *rc::gen::arbitrary<bool>() ? field : quoted(field);
                fields.push_back(field);
            }
            text += *rc::gen::arbitrary<bool>() ? "\n" : "\r\n";
        }
        const auto block = *rc::gen::inRange<std::size_t>(1, 60);
        const auto at_once = *rc::gen::inRange<std::size_t>(1, 20);
        RC_ASSERT(records_of(text, block, at_once) == expected);
    }));
}

TEST(Csv, WrongQuotesAreTold) {
    for (const char* text : {"a\"b\n", "\"a\"b\n", "\"a\n", "a,\"b\" \n", "x\"\n"}) {
        std::string_view rest = text;
        CsvFields csv;
        EXPECT_FALSE(csv.take(rest)) << text;
        EXPECT_TRUE(rest.empty());
    }
}

TEST(RecordReader, CountsLinesWithinQuotesToo) {
    const auto blocks = blocks_of("a\n\"b\nb\"\nc\nd\n", RecordForm::csv, 4);
    std::string all;
    for (const Block& block : blocks) {
        EXPECT_EQ(block.first_line,
                  1U + static_cast<std::uint64_t>(std::count(all.begin(), all.end(), '\n')));
        all += block.text;
    }
    EXPECT_GT(blocks.size(), 1U);
    EXPECT_EQ(all, "a\n\"b\nb\"\nc\nd\n");
}

TEST(RecordReader, AQuoteNeverClosedCostsOneLine) {
    const std::string text = "a,1\nb,\"2\nc,3\nd,4\n";
    const auto blocks = blocks_of(text, RecordForm::csv, 6);
    std::vector<std::string> whole;
    std::vector<std::uint64_t> lost;
    for (const Block& block : blocks) {
        if (block.fault == RecordFault::none) {
            whole.push_back(block.text);
        } else {
            EXPECT_EQ(block.fault, RecordFault::unclosed_quote);
            EXPECT_EQ(block.text, "b,\"2");
            lost.push_back(block.first_line);
        }
    }
    EXPECT_EQ(lost, (std::vector<std::uint64_t>{2}));
    EXPECT_EQ(whole.front(), "a,1\n");
    std::string after;
    for (std::size_t i = 1; i < whole.size(); ++i) {
        after += whole[i];
    }
    EXPECT_EQ(after, "c,3\nd,4\n");
}

TEST(RecordReader, AQuoteThatClosesAtAnothersOpeningCostsOneLine) {
    const auto blocks = blocks_of("a,\"1\nb,2\nc,\"x,y\"\nd,4\n", RecordForm::csv, 100);
    ASSERT_EQ(blocks.size(), 2U);
    EXPECT_EQ(blocks[0].fault, RecordFault::unclosed_quote);
    EXPECT_EQ(blocks[0].first_line, 1U);
    EXPECT_EQ(blocks[1].text, "b,2\nc,\"x,y\"\nd,4\n");
    EXPECT_EQ(blocks[1].first_line, 2U);
}

TEST(RecordReader, ALineTooLongIsDroppedWithoutBeingKept) {
    const std::string text = "a\n" + std::string(100000, 'x') + "\nb\n";
    for (const RecordForm form : {RecordForm::csv, RecordForm::lines}) {
        RecordReader reader(std::make_unique<GivenBytes>(text, 1000), form, 64, 500);
        Block block;
        ASSERT_TRUE(reader.next(block));
        EXPECT_EQ(block.text, "a\n");
        ASSERT_TRUE(reader.next(block));
        EXPECT_EQ(block.fault, RecordFault::too_long);
        EXPECT_EQ(block.first_line, 2U);
        EXPECT_LE(block.text.size(), 200U);
        ASSERT_TRUE(reader.next(block));
        EXPECT_EQ(block.fault, RecordFault::none);
        EXPECT_EQ(block.text, "b\n");
        EXPECT_EQ(block.first_line, 3U);
        EXPECT_FALSE(reader.next(block));
    }
}

TEST(RecordReader, TheFirstRecordIsTakenAlone) {
    RecordReader reader(std::make_unique<GivenBytes>("\xEF\xBB\xBF\"a\nb\",c\n1,2\n", 2), RecordForm::csv, 4);
    Block header;
    ASSERT_TRUE(reader.first_record(header));
    EXPECT_EQ(header.text, "\"a\nb\",c\n");
    Block block;
    ASSERT_TRUE(reader.next(block));
    EXPECT_EQ(block.text, "1,2\n");
    EXPECT_EQ(block.first_line, 3U);
    RecordReader nothing(std::make_unique<GivenBytes>("", 2), RecordForm::csv, 4);
    EXPECT_FALSE(nothing.first_record(header));
}

}  // namespace
}  // namespace steelyard::cli
