// SPDX-License-Identifier: Apache-2.0
// Audits of files of many cases by the built program: whatever the split, the same bytes.
#include <gtest/gtest.h>

#include <nlohmann/json.hpp>
#include <sstream>

#include "batch/tally_rows.hpp"
#include "run_program.hpp"

namespace steelyard::test {
namespace {

/// Made-up cases with a ward and a date beside them.
const std::vector<std::string>& made_rows() {
    static const std::vector<std::string> rows = [] {
        const Outcome made =
            run({"simulate", "-n", "400", "--findings", "serum_potassium,gfr,urine_ph", "--seed", "11"});
        EXPECT_EQ(made.code, 0) << made.err;
        std::vector<std::string> lines;
        std::istringstream in(made.out);
        for (std::string line; std::getline(in, line);) {
            const auto i = lines.size();
            lines.push_back(line + (i == 0 ? ",ward,sampled_on"
                                           : std::string(i % 3 == 0 ? ",north" : ",south") + ",2025-0" +
                                                 std::to_string(1 + i % 6) + "-15"));
        }
        return lines;
    }();
    return rows;
}

std::string file_of(std::size_t from, std::size_t to) {
    std::string text = made_rows().front() + "\n";
    for (std::size_t i = from; i < to; ++i) {
        text += made_rows()[1 + i] + "\n";
    }
    return text;
}

const std::vector<std::string> options = {"--by",         "ward", "--over", "sampled_on",
                                          "--replicates", "50",   "--as",   "json"};

Outcome audit(std::vector<std::string> files, const std::vector<std::string>& more) {
    files.insert(files.begin(), "audit");
    files.insert(files.end(), more.begin(), more.end());
    return run(files);
}

TEST(AuditOfRows, AnySplitAndAnyThreadsGiveTheSameBytes) {
    const WorkDir dir;
    const std::size_t n = made_rows().size() - 1;
    const Outcome whole = audit({dir.write("all.csv", file_of(0, n))}, options);
    ASSERT_EQ(whole.code, 0) << whole.err;
    const auto json = nlohmann::json::parse(whole.out);
    EXPECT_EQ(json["flow"]["read"], n);
    EXPECT_EQ(json["strata"].size(), 2U);
    EXPECT_EQ(json["over_time"]["months"].size(), 6U);
    for (const std::size_t parts : {2U, 7U, 16U}) {
        std::vector<std::string> files;
        for (std::size_t part = 0; part < parts; ++part) {
            const std::string name = "part-" + std::to_string(part);
            const std::string rows =
                dir.write(name + ".csv", file_of(part * n / parts, (part + 1) * n / parts));
            if (part % 2 == 0) {  // some as tallies, some as cases
                const Outcome tallied =
                    run({"audit", rows, "--by", "ward", "--over", "sampled_on", "--replicates", "20",
                         "--keep-tally", dir.file(name + ".tally"), "--out", dir.file("x")});
                ASSERT_TRUE(tallied.code == 0 || tallied.code == 4) << tallied.err;
                files.push_back(dir.file(name + ".tally"));
            } else {
                files.push_back(rows);
            }
            if (part > 3 && parts == 16U) {  // the rest of the sixteen in one
                files.push_back(dir.write("rest.csv", file_of((part + 1) * n / parts, n)));
                break;
            }
        }
        std::vector<std::string> more = options;
        more.insert(more.end(), {"--threads", std::to_string(parts % 8 + 1)});
        const Outcome split = audit(files, more);
        EXPECT_EQ(split.code, 0) << split.err;
        EXPECT_EQ(split.out, whole.out) << parts;
    }
}

TEST(AuditOfRows, RowsThatCannotBeReadAreCounted) {
    const WorkDir dir;
    const std::string file =
        dir.write("cases.csv",
                  "case,serum_potassium "
                  "[mmol/L],final_cause,on\na,3.0,clasic_distal,2025-03-01\nb,5,renal_failure,2025-13-01\n"
                  "c,5x,renal_failure,2025-02-03\nd,5,renal_failure,2025-02-03\ne,5,,2025-02\n");
    const Outcome outcome = audit(
        {file}, {"--over", "on", "--as", "json", "--replicates", "20", "--rejects", dir.file("rejects.csv")});
    EXPECT_EQ(outcome.code, 5) << outcome.err;
    const auto flow = nlohmann::json::parse(outcome.out)["flow"];
    EXPECT_EQ(flow["read"], 5);
    EXPECT_EQ(flow["set_aside"], 2);
    EXPECT_EQ(flow["weighed"], 3);
    EXPECT_EQ(flow["undiagnosed"], 1);
    EXPECT_EQ(flow["outside"], 1);
    const std::string err = in_one_line(outcome.err);
    EXPECT_NE(err.find("the final cause clasic_distal (1) is none of the tables' and counts as another one; "
                       "did you mean classic_distal?"),
              std::string::npos)
        << err;
    EXPECT_NE(err.find("error[bad-format]: on is \"2025-13-01\", which is no date"), std::string::npos)
        << err;
    EXPECT_NE(text_of(dir.file("rejects.csv")).find(",3,1,b,2025-13-01,bad-format,"), std::string::npos);
    const Outcome strict = audit({file}, {"--over", "on", "--strict", "--out", dir.file("never")});
    EXPECT_EQ(strict.code, 3);
    EXPECT_FALSE(std::filesystem::exists(dir.file("never")));
}

TEST(AuditOfRows, AColumnOfNamesIsNotKept) {
    const WorkDir dir;
    std::string text = "case,serum_potassium [mmol/L],final_cause\n";
    for (int i = 0; i < 1002; ++i) {
        text += "p" + std::to_string(i) + ",3.0,renal_failure\n";
    }
    const Outcome outcome = audit({dir.write("cases.csv", text)}, {"--by", "case"});
    EXPECT_EQ(outcome.code, 3);
    EXPECT_NE(in_one_line(outcome.err).find("cannot be tallied: "), std::string::npos) << outcome.err;
}

TEST(AuditOfRows, WrongInputsAreNamed) {
    const WorkDir dir;
    const std::string csv = dir.write("cases.csv", "case,final_cause\na,renal_failure\n");
    const std::string ndjson =
        dir.write("cases.ndjson", "{\"case\": \"a\", \"final_cause\": \"renal_failure\"}\n");
    EXPECT_EQ(audit({dir.file("none.csv")}, {}).code, 3);
    EXPECT_EQ(audit({csv}, {"--by", "ward"}).code, 3);
    const Outcome json_by = audit({ndjson}, {"--by", "ward"});
    EXPECT_EQ(json_by.code, 3);
    EXPECT_NE(in_one_line(json_by.err).find("--by and --over name columns, and NDJSON has none"),
              std::string::npos)
        << json_by.err;
    const Outcome document = audit({dir.write("case.yaml", "case: a\n")}, {});
    EXPECT_EQ(document.code, 3);
    EXPECT_NE(document.err.find("neither a file of many cases nor a tally"), std::string::npos)
        << document.err;
    EXPECT_EQ(audit({csv, ndjson}, {"--replicates", "20"}).code, 0);
}

TEST(MonthOf, TakesDatesThatExist) {
    using cli::month_of;
    EXPECT_EQ(month_of("2025-03-17"), "2025-03");
    EXPECT_EQ(month_of("2025-03"), "2025-03");
    EXPECT_EQ(month_of("2024-02-29T08:30:00Z"), "2024-02");
    EXPECT_EQ(month_of("2024-02-29 08:30"), "2024-02");
    for (const char* wrong : {"", "2025", "2025-13", "2025-00-01", "2025-02-29", "2025-04-31", "17.03.2025",
                              "2025/03/17", "2025-3-17", "2025-03-1", "2025-03-17x"}) {
        EXPECT_EQ(month_of(wrong), "") << wrong;
    }
}

}  // namespace
}  // namespace steelyard::test
