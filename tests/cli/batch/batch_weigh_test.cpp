// SPDX-License-Identifier: Apache-2.0
// Files of many cases, weighed by the built program.
#include <gtest/gtest.h>
#include <rapidcheck.h>
#include <signal.h>
#include <zlib.h>
#include <zstd.h>

#include <algorithm>
#include <chrono>
#include <nlohmann/json.hpp>
#include <random>
#include <thread>

#include "larkmoor_cases.hpp"
#include "run_program.hpp"

namespace steelyard::test {
namespace {

const std::string columns =
    "case,sex,age [a],serum_sodium [mmol/L],serum_potassium [mmol/L],serum_chloride [mmol/L],"
    "serum_bicarbonate [mmol/L],serum_albumin [g/L],serum_creatinine [umol/L],urine_ph,urine_sodium "
    "[mmol/L],urine_potassium [mmol/L],urine_chloride [mmol/L],nephrocalcinosis,ward";

/// Rows of panels that vary; the same for the same seed.
std::string rows_of_panels(int count, unsigned seed = 1) {
    std::mt19937 random(seed);
    const auto between = [&](int low, int high) {
        return low + static_cast<int>(random() % static_cast<unsigned>(high - low + 1));
    };
    std::string text;
    for (int i = 0; i < count; ++i) {
        const int sodium = between(132, 144);
        const int bicarbonate = between(8, 23);
        text += "larkmoor-" + std::to_string(i) + "," + (between(0, 1) == 0 ? "female" : "male") + "," +
                std::to_string(between(17, 90)) + "," + std::to_string(sodium) + "," +
                (between(0, 9) == 0 ? "<3.1"
                                    : std::to_string(between(2, 7)) + "." + std::to_string(between(0, 9))) +
                "," + std::to_string(sodium - bicarbonate - between(6, 16)) + "," +
                std::to_string(bicarbonate) + "," + std::to_string(between(20, 48)) + "," +
                std::to_string(between(50, 500)) + "," +
                (between(0, 4) == 0 ? "" : std::to_string(between(5, 7)) + ".5") + "," +
                std::to_string(between(5, 120)) + "," + std::to_string(between(10, 70)) + "," +
                std::to_string(between(10, 140)) + "," +
                (between(0, 2) == 0   ? "present"
                 : between(0, 1) == 0 ? "absent"
                                      : "") +
                ",\"W, " + std::to_string(between(1, 3)) + "\"\n";
    }
    return text;
}

std::vector<std::string> lines_of(const std::string& text) {
    std::vector<std::string> lines;
    std::istringstream in(text);
    for (std::string line; std::getline(in, line);) {
        lines.push_back(line);
    }
    return lines;
}

std::string gzip(const std::string& text) {
    z_stream stream{};
    deflateInit2(&stream, 6, Z_DEFLATED, 16 + MAX_WBITS, 8, Z_DEFAULT_STRATEGY);
    std::string packed(deflateBound(&stream, text.size()) + 64, '\0');
    std::string input = text;
    stream.next_in = reinterpret_cast<Bytef*>(input.data());
    stream.avail_in = static_cast<uInt>(input.size());
    stream.next_out = reinterpret_cast<Bytef*>(packed.data());
    stream.avail_out = static_cast<uInt>(packed.size());
    deflate(&stream, Z_FINISH);
    packed.resize(stream.total_out);
    deflateEnd(&stream);
    return packed;
}

std::string zstd(const std::string& text) {
    std::string packed(ZSTD_compressBound(text.size()), '\0');
    packed.resize(ZSTD_compress(packed.data(), packed.size(), text.data(), text.size(), 1));
    return packed;
}

TEST(BatchWeigh, GivesOneRowForEachCaseInTheirOrder) {
    const WorkDir dir;
    const std::string file = dir.write("cases.csv", columns + "\n" + rows_of_panels(50));
    const Outcome outcome = run({"weigh", file});
    EXPECT_EQ(outcome.code, 0) << outcome.err;
    const auto lines = lines_of(outcome.out);
    ASSERT_EQ(lines.size(), 51U);
    EXPECT_EQ(lines[0],
              "case,proximal,classic_distal,voltage_distal,low_aldosterone,renal_failure,extrarenal,leader,"
              "gate,set_aside,urgent");
    for (std::size_t i = 1; i < lines.size(); ++i) {
        EXPECT_TRUE(lines[i].starts_with("larkmoor-" + std::to_string(i - 1) + ",")) << lines[i];
    }
    EXPECT_NE(outcome.err.find("50 rows read: "), std::string::npos);
    EXPECT_NE(outcome.err.find("Caution: "), std::string::npos);
}

// The quick way of files of rows against the report of the same case, to the last bit.
TEST(BatchWeigh, GivesThePosteriorsOfTheReports) {
    const WorkDir dir;
    const std::string file = dir.write("cases.csv", columns + "\n" + rows_of_panels(100, 5));
    const Outcome rows = run({"weigh", file});
    const Outcome reports = run({"weigh", file, "--as", "ndjson", "--brief"});
    ASSERT_EQ(rows.code, 0) << rows.err;
    ASSERT_EQ(reports.code, 0) << reports.err;
    const auto lines = lines_of(rows.out);
    const auto objects = lines_of(reports.out);
    ASSERT_EQ(lines.size(), objects.size() + 1);
    int weighed = 0;
    for (std::size_t i = 0; i < objects.size(); ++i) {
        const auto report = nlohmann::json::parse(objects[i]);
        std::vector<std::string> cells;
        std::istringstream split(lines[i + 1]);
        for (std::string cell; std::getline(split, cell, ',');) {
            cells.push_back(cell);
        }
        cells.resize(11);
        EXPECT_EQ(cells[0], report["case"]);
        EXPECT_EQ(cells[8], report["gate"]["status"]);
        double highest = -1.0;
        std::string leader;
        for (std::size_t k = 0; k < report["causes"].size(); ++k) {
            const double posterior = report["causes"][k]["posterior"];
            EXPECT_EQ(std::stod(cells[k + 1]), posterior) << lines[i + 1];
            if (posterior > highest) {
                highest = posterior;
                leader = report["causes"][k]["id"];
            }
            ++weighed;
        }
        EXPECT_EQ(cells[7], leader);
        std::string urgent;
        for (const auto& value : report["urgent"]) {
            urgent += (urgent.empty() ? "" : ";") + value["quantity"].get<std::string>() + " " +
                      value["side"].get<std::string>();
        }
        EXPECT_EQ(cells[10], urgent);
    }
    EXPECT_GT(weighed, 200);
}

TEST(BatchWeigh, TheLarkmoorCasesGiveTheSameRowsAsDocumentsAndAsNdjson) {
    std::vector<std::string> arguments = {"weigh", "--as", "csv"};
    std::string lines;
    for (const std::string& path : larkmoor_cases()) {
        arguments.push_back(path);
    }
    const Outcome documents = run(arguments);
    ASSERT_EQ(documents.code, 0) << documents.err;
    EXPECT_EQ(lines_of(documents.out).size(), larkmoor_cases().size() + 1);
    const std::string script =
        "import sys, yaml, json\n"
        "for p in sys.argv[1:]:\n"
        "    print(json.dumps(yaml.load(open(p), Loader=yaml.BaseLoader)))\n";
    const WorkDir dir;
    std::string command = "/usr/bin/python3 -c '" + script + "'";
    for (const std::string& path : larkmoor_cases()) {
        command += " " + path;
    }
    ASSERT_EQ(std::system((command + " > " + dir.file("cases.ndjson")).c_str()), 0);  // NOLINT(cert-env33-c)
    const Outcome ndjson = run({"weigh", dir.file("cases.ndjson")});
    EXPECT_EQ(ndjson.code, 0) << ndjson.err;
    EXPECT_EQ(ndjson.out, documents.out);
}

TEST(BatchWeigh, ThreadsPackingAndPartsChangeNothing) {
    const WorkDir dir;
    const std::string rows = rows_of_panels(4000, 9);  // several blocks
    const std::string text = columns + "\n" + rows;
    const std::string file = dir.write("cases.csv", text);
    const Outcome one = run({"weigh", file, "--threads", "1", "--carry", "ward"});
    ASSERT_EQ(one.code, 0) << one.err;
    EXPECT_EQ(run({"weigh", file, "--threads", "3", "--carry", "ward"}).out, one.out);
    EXPECT_EQ(run({"weigh", dir.write("cases.csv.zst", zstd(text)), "--carry", "ward"}).out, one.out);
    EXPECT_EQ(run({"weigh", dir.write("members.gz", gzip(text.substr(0, 1000)) + gzip(text.substr(1000))),
                   "--carry", "ward"})
                  .out,
              one.out);
    EXPECT_EQ(run({"weigh", "-", "--carry", "ward"}, gzip(text)).out, one.out);
    const std::size_t half = rows.find('\n', rows.size() / 2) + 1;
    EXPECT_EQ(run({"weigh", dir.write("a.csv", columns + "\n" + rows.substr(0, half)),
                   dir.write("b.csv", columns + "\r\n" + rows.substr(half)), "--carry", "ward"})
                  .out,
              one.out);
}

TEST(BatchWeigh, AnyOrderOfColumnsAndUnits) {
    const WorkDir dir;
    const Outcome plain =
        run({"weigh", "-"},
            "case,serum_potassium [mmol/L],serum_creatinine [umol/L],sex,age [a]\nx,2.8,88.42,male,50\n");
    const Outcome other =
        run({"weigh", "-"},
            "age [a],serum_creatinine [mg/dL],case,sex,serum_potassium\n50,1.000,x,male,2.8 mmol/L\n");
    EXPECT_EQ(plain.code, 0) << plain.err;
    EXPECT_EQ(other.code, 0) << other.err;
    EXPECT_EQ(plain.out, other.out);
}

TEST(BatchWeigh, RowsThatCannotBeReadAreNamedCountedAndKept) {
    const WorkDir dir;
    const std::string file = dir.write(
        "cases.csv",
        "case,serum_potassium "
        "[mmol/L],nephrocalcinosis,sex\na,3.0,present,male\nb,\"3,0\",absent,male\nc,30,maybe,male\nd,3\n"
        ",3,,\ne,3,,x\n\nf,,,\n");
    const Outcome outcome = run({"weigh", file, "--rejects", dir.file("rejects.csv")});
    EXPECT_EQ(outcome.code, 5);
    EXPECT_EQ(lines_of(outcome.out).size(), 3U) << outcome.out;  // header, a, f
    EXPECT_NE(outcome.err.find("7 rows read: 2 weighed, 0 out of scope, 5 set aside"), std::string::npos)
        << outcome.err;
    EXPECT_EQ(
        text_of(dir.file("rejects.csv")),
        "file,line,column,case,value,code,reason,hint\n" + file +
            ",3,3,b,\"3,0\",not-a-number,\"serum_potassium: \"\"3,0\"\" has a comma in its number\",\"the "
            "decimal sign is a point, and thousands are not parted: 3.0\"\n" +
            file +
            ",4,3,c,30,implausible-value,\"serum_potassium is 30 mmol/L, outside the plausible range 1 to "
            "12 mmol/L\",check the unit and the decimal point\n" +
            file +
            ",4,6,c,maybe,bad-level,\"nephrocalcinosis is \"\"maybe\"\", but must be present or absent\",\n" +
            file +
            ",5,1,,,syntax,\"the row has 2 fields, but the header has 4\",a comma inside a field needs "
            "quotes "
            "around the field; numbers take a decimal point\n" +
            file +
            ",6,1,,,empty-value,the row has no case name,give every row a name of its own in the column "
            "case\n" +
            file + ",7,6,e,x,bad-choice,\"sex is \"\"x\"\", but must be female, male or unknown\",\n");
    for (const char* place :
         {":3:3: error[not-a-number]", ":4:3: error[implausible-value]", ":4:6: error[bad-level]",
          ":5:1: error[syntax]", ":6:1: error[empty-value]", ":7:6: error[bad-choice]"}) {
        EXPECT_NE(outcome.err.find(file + place), std::string::npos) << place;
    }
}

TEST(BatchWeigh, StrictStopsAtTheFirstAndWritesNothing) {
    const WorkDir dir;
    const std::string file = dir.write("cases.csv", "case,serum_potassium [mmol/L]\na,3\nb,x\nc,y\n");
    const Outcome outcome =
        run({"weigh", file, "--strict", "--out", dir.file("out.csv"), "--rejects", dir.file("rejects.csv")});
    EXPECT_EQ(outcome.code, 3);
    EXPECT_NE(outcome.err.find(":3:3: error[not-a-number]"), std::string::npos);
    EXPECT_EQ(outcome.err.find(":4:"), std::string::npos);
    EXPECT_FALSE(std::filesystem::exists(dir.file("out.csv")));
    EXPECT_FALSE(std::filesystem::exists(dir.file("rejects.csv")));
}

struct BadFile {
    const char* name;
    std::string text;
    int code;
    const char* says;
};

class BadRows : public ::testing::TestWithParam<BadFile> {};

TEST_P(BadRows, AreAClearOutcome) {
    const BadFile& bad = GetParam();
    const WorkDir dir;
    const Outcome outcome = run({"weigh", dir.write("cases.csv", bad.text), "--out", dir.file("out.csv")});
    EXPECT_EQ(outcome.code, bad.code) << outcome.err;
    EXPECT_NE(in_one_line(outcome.err).find(bad.says), std::string::npos) << outcome.err;
    EXPECT_EQ(std::filesystem::exists(dir.file("out.csv")), bad.code != 3);
}

INSTANTIATE_TEST_SUITE_P(
    , BadRows,
    ::testing::Values(
        BadFile{"empty", "", 3, "error[empty-document]: the file is empty"},
        BadFile{"header_only", "case,serum_potassium [mmol/L]\n", 4, "0 rows read"},
        BadFile{"no_case_column", "id,serum_potassium [mmol/L]\na,3\n", 3,
                ":1:1: error[missing-key]: no column is called case"},
        BadFile{"column_twice", "case,serum_potassium [mmol/L],serum_potassium [meq/L]\n", 3,
                ":1:31: error[duplicate-key]"},
        BadFile{"wrong_unit", "case,serum_potassium [kPa]\na,3\n", 3,
                ":1:6: error[bad-unit]: serum_potassium cannot be in kPa"},
        BadFile{"unit_of_a_word", "case,sex [1]\na,male\n", 3, ":1:6: error[bad-unit]: sex takes no unit"},
        BadFile{"semicolons", "case;serum_potassium [mmol/L]\na;2,8\n", 3, "parted by semicolons"},
        BadFile{"utf16",
                std::string("\xFF\xFE"
                            "c\0a\0s\0e\0",
                            10),
                3, "error[bad-encoding]: the text is in UTF-16"},
        BadFile{"nul", std::string("case,serum_potassium [mmol/L]\na\0b,3\nc,3\n", 41), 5,
                ":2:1: error[bad-encoding]: there is a NUL byte"},
        BadFile{"not_utf8", "case,serum_potassium [mmol/L]\na\xC3,3\nc,3\n", 5,
                ":2:1: error[bad-encoding]: these bytes are not UTF-8"},
        BadFile{"ragged", "case,serum_potassium [mmol/L]\na,3,4\nc,3\n", 5,
                ":2:1: error[syntax]: the row has 3 fields, but the header has 2"},
        BadFile{"lost_quote", "case,serum_potassium [mmol/L]\na,\"3\nc,3\n", 5,
                ":2:1: error[syntax]: a quote in this row is not closed"},
        BadFile{"long_line", "case,serum_potassium [mmol/L]\n" + std::string(3'000'000, 'x') + "\nc,3\n", 5,
                ":2:1: error[too-large]: the row is longer than 1048576 bytes"},
        BadFile{"unknown_column", "case,serum_potasium [mmol/L],serum_potassium [mmol/L]\na,3,3\n", 0,
                "not read: serum_potasium (did you mean serum_potassium?)"},
        BadFile{"same_quantity_twice", "case,serum_urea [mmol/L],serum_urea_nitrogen [mmol/L]\na,3,3\nb,3,\n",
                5, "serum_urea_nitrogen and serum_urea"}),
    [](const ::testing::TestParamInfo<BadFile>& one) { return one.param.name; });

TEST(BatchWeigh, DamagedPackedFilesAreNamed) {
    const WorkDir dir;
    const std::string packed = gzip(columns + "\n" + rows_of_panels(2000));
    const Outcome cut = run({"weigh", dir.write("cut.csv.gz", packed.substr(0, packed.size() / 2)), "--out",
                             dir.file("out.csv")});
    EXPECT_EQ(cut.code, 3);
    EXPECT_NE(cut.err.find("the gzip data end in the middle"), std::string::npos) << cut.err;
    EXPECT_FALSE(std::filesystem::exists(dir.file("out.csv")));
    std::string spoiled = packed;
    spoiled[spoiled.size() / 2] = static_cast<char>(~spoiled[spoiled.size() / 2]);
    EXPECT_EQ(run({"weigh", dir.write("bad.csv.gz", spoiled), "--out", dir.file("out.csv")}).code, 3);
    const std::string frame = zstd(columns + "\n" + rows_of_panels(2000));
    const Outcome zst =
        run({"weigh", dir.write("cut.zst", frame.substr(0, frame.size() / 2)), "--out", dir.file("out.csv")});
    EXPECT_EQ(zst.code, 3);
    EXPECT_NE(zst.err.find("the zstd data end in the middle"), std::string::npos) << zst.err;
}

TEST(BatchWeigh, MixedKindsAndOptionsOfTheOtherKindAreRefused) {
    const WorkDir dir;
    const std::string file = dir.write("cases.csv", "case\na\n");
    const std::string document = larkmoor_cases().front();
    for (const std::vector<std::string>& arguments : {std::vector<std::string>{"weigh", file, document},
                                                      {"weigh", document, "--strict"},
                                                      {"weigh", document, "--carry", "x"},
                                                      {"weigh", document, "--rejects", "x"},
                                                      {"weigh", file, "--until", "0.9"}}) {
        EXPECT_EQ(run(arguments).code, 2) << arguments.back();
    }
    EXPECT_EQ(run({"weigh", file, "--carry", "ward"}).code, 3);
}

TEST(BatchWeigh, ADecimalCommaOfTheLocaleChangesNothing) {
    const std::string text = columns + "\n" + rows_of_panels(20);
    EXPECT_EQ(run({"weigh", "-"}, text, {"LC_ALL=de_DE.UTF-8", "LANG=de_DE.UTF-8"}).out,
              run({"weigh", "-"}, text).out);
}

TEST(BatchWeigh, CaseNamesStayText) {
    const Outcome outcome =
        run({"weigh", "-", "--carry", "note"}, "case,note\n=cmd(),\"a \"\"b\"\"\"\n\"a,b\",@x\n");
    const auto lines = lines_of(outcome.out);
    ASSERT_EQ(lines.size(), 3U);
    EXPECT_TRUE(lines[1].starts_with("'=cmd(),"));
    EXPECT_TRUE(lines[1].ends_with(",\"a \"\"b\"\"\""));
    EXPECT_TRUE(lines[2].starts_with("\"a,b\","));
    EXPECT_TRUE(lines[2].ends_with(",'@x"));
}

/// The program under way on many rows, in a folder of its own, stopped by a signal after a moment.
int stopped_by(int signal_number, int after_us, const std::string& input, const std::string& output) {
    std::vector<std::string> words = {STEELYARD_PROGRAM, "weigh", input, "--out", output};
    std::vector<char*> argv;
    for (std::string& word : words) {
        argv.push_back(word.data());
    }
    argv.push_back(nullptr);
    posix_spawn_file_actions_t actions{};
    posix_spawn_file_actions_init(&actions);
    posix_spawn_file_actions_addopen(&actions, 2, "/dev/null", O_WRONLY, 0);
    pid_t child = 0;
    EXPECT_EQ(posix_spawn(&child, STEELYARD_PROGRAM, &actions, nullptr, argv.data(), environ), 0);
    posix_spawn_file_actions_destroy(&actions);
    std::this_thread::sleep_for(std::chrono::microseconds(after_us));
    kill(child, signal_number);
    int status = 0;
    waitpid(child, &status, 0);
    return status;
}

TEST(BatchWeigh, StoppedAtAnyMomentItLeavesTheOldFileOrTheNewOne) {
    const WorkDir dir;
    const std::string input = dir.write("cases.csv", columns + "\n" + rows_of_panels(3000, 3));
    const std::string output = dir.file("result/out.csv");
    std::filesystem::create_directory(dir.path() / "result");
    const std::string whole = run({"weigh", input}).out;
    std::mt19937 random(20261201);
    int cut_short = 0;
    for (int i = 0; i < 200; ++i) {
        std::filesystem::remove(output);
        if (i % 2 == 0) {
            dir.write("result/out.csv", "old\n");
        }
        const int status =
            stopped_by(i % 10 == 9 ? SIGINT : SIGKILL, static_cast<int>(random() % 150000), input, output);
        cut_short += WIFSIGNALED(status) ? 1 : 0;
        const bool there = std::filesystem::exists(output);
        const std::string text = there ? text_of(output) : "";
        EXPECT_TRUE(text == whole || (i % 2 == 0 ? text == "old\n" : !there)) << text.substr(0, 100);
        for (const auto& entry : std::filesystem::directory_iterator(dir.path() / "result")) {
            // Between its naming and its moving a whole file may stand beside; never a part of one.
            EXPECT_TRUE(entry.path() == output || text_of(entry.path()) == whole) << entry.path();
            std::filesystem::remove(entry.path());
        }
    }
    EXPECT_GT(cut_short, 20);
}

}  // namespace
}  // namespace steelyard::test
