// SPDX-License-Identifier: Apache-2.0
// Two open data sets that have nothing to do with acidosis, one of two causes and one of three, weighed by
// the built program: every posterior as worked out elsewhere. Nothing in the program knows what it weighs.
#include "open_data.hpp"

#include <gtest/gtest.h>

#include <array>
#include <cmath>
#include <map>

#include "reference_table.hpp"
#include "run_program.hpp"
#include "steelyard/cli/commands.hpp"
#include "steelyard/engine/audit.hpp"

namespace steelyard::test {
namespace {

const std::string folder = STEELYARD_TEST_DIR "/data/tables/";

std::vector<std::string> weigh(const std::string& cases, std::vector<std::string> sets) {
    std::vector<std::string> words = {"weigh", cases, "--as", "csv", "--threads", "1"};
    words.insert(words.end(), sets.begin(), sets.end());
    return words;
}

/// The number at the end of a case's name: its row in the data, from 0.
std::string row_number(const std::string& name) {
    return name.substr(name.rfind('-') + 1);
}

/// Compares with figures of e1071, where there are any of this row.
void match_published(const ReferenceTable& table, const OpenData& data,
                     const std::vector<std::string>& result) {
    for (std::size_t k = 0; k < data.causes.size(); ++k) {
        const std::string quantity =
            "posterior[row " + row_number(result[0]) + "; " + std::to_string(k) + "]";
        if (table.has(data.id, quantity)) {
            EXPECT_TRUE(table.matches(data.id, quantity, std::stod(result[k + 1])));
        }
    }
}

std::vector<std::string> published_posteriors_not_compared(const ReferenceTable& table,
                                                           const std::string& id) {
    std::vector<std::string> names;
    for (const std::string& name : table.unused()) {
        if (name.starts_with(id + " posterior")) {
            names.push_back(name);
        }
    }
    return names;
}

void expect_every_posterior(const OpenData& data, std::size_t cases) {
    const Outcome outcome = run(weigh(data.cases_file(), data.sets()));
    EXPECT_EQ(outcome.code, 0) << outcome.err;
    const auto results = plain_cells_in(outcome.out);
    const auto expected = data.expected();
    const auto rows = plain_cells_of(data.cases_file());
    ASSERT_EQ(results.size(), cases + 1);
    ASSERT_EQ(expected.size(), cases + 1);
    ASSERT_EQ(rows.size(), cases + 1);
    for (std::size_t k = 0; k < data.causes.size(); ++k) {
        EXPECT_EQ(results[0][k + 1], data.causes[k]);
    }
    const ReferenceTable published("open_data.csv");
    for (std::size_t row = 1; row <= cases; ++row) {
        EXPECT_EQ(results[row][0], rows[row][0]);
        EXPECT_EQ(rows[row].back(), data.causes[std::stoul(expected[row][0])]);
        for (std::size_t k = 0; k < data.causes.size(); ++k) {
            EXPECT_TRUE(near_rel(std::stod(expected[row][k + 1]), std::stod(results[row][k + 1]), 1e-12))
                << results[row][0] << " " << data.causes[k];
        }
        match_published(published, data, results[row]);
    }
    EXPECT_EQ(published_posteriors_not_compared(published, data.id), std::vector<std::string>());
}

TEST(OpenData, EveryPosteriorOfTheUrinesIsAsWorkedOutElsewhere) {
    expect_every_posterior(urine, 79);
}

TEST(OpenData, EveryPosteriorOfTheUrinesUnderOtherPriorsIsAsWorkedOutElsewhere) {
    expect_every_posterior(urine_nine_to_one, 79);
}

TEST(OpenData, EveryPosteriorOfTheWinesIsAsWorkedOutElsewhere) {
    expect_every_posterior(wine, 59);
}

/// Tables and priors of the urines without one of them, as files.
class WithoutOne {
  public:
    static constexpr std::size_t findings = 6;

    WithoutOne()
        : rows_(plain_cells_of(urine.cases_file())), set_(text_of(folder + "urine_crystals/set.yaml")) {
        for (std::size_t row = 1; row < rows_.size(); ++row) {
            count(row, 1);
        }
    }
    std::size_t cases() const { return rows_.size() - 1; }
    const std::vector<std::string>& row(std::size_t row) const { return rows_[row]; }

    /// Writes tables, priors and the one case, and gives the words that weigh it.
    std::vector<std::string> leave_out(std::size_t row, const WorkDir& dir) {
        count(row, -1);
        dir.write("tables/set.yaml", set_);
        for (std::size_t f = 0; f < findings; ++f) {
            dir.write("tables/" + rows_[0][f + 1] + ".yaml", table(f));
        }
        std::string priors =
            "format: steelyard.prior-set/1\ntitle: Without one\ngiven_as: weights\ncauses:\n";
        for (std::size_t k = 0; k < 2; ++k) {
            priors +=
                "  " + urine.causes[k] + ": {weight: " + std::to_string(causes_[k]) + ", basis: memory}\n";
        }
        dir.write("priors.yaml", priors);
        std::string text;
        for (const std::size_t line : {std::size_t{0}, row}) {
            for (std::size_t cell = 0; cell < rows_[line].size(); ++cell) {
                text += (cell == 0 ? "" : ",") + rows_[line][cell];
            }
            text += "\n";
        }
        count(row, 1);
        return weigh(dir.write("case.csv", text),
                     {"--tables", dir.file("tables"), "--priors", dir.file("priors.yaml")});
    }

  private:
    static std::size_t level_of(const std::string& word) {
        return word == "low" ? 0 : word == "middle" ? 1 : 2;
    }
    void count(std::size_t row, int step) {
        const std::vector<std::string>& cells = rows_[row];
        const std::size_t cause = cells.back() == urine.causes[1] ? 1 : 0;
        causes_[cause] += step;
        for (std::size_t f = 0; f < findings; ++f) {
            if (!cells[f + 1].empty()) {
                counts_[f][cause][level_of(cells[f + 1])] += step;
            }
        }
    }
    std::string table(std::size_t f) const {
        std::string text = "format: steelyard.evidence-table/1\nfinding: " + rows_[0][f + 1] +
                           "\ntitle: Test" + "\nlevels: [low, middle, high]\nleast: 1e-9\nrows:\n";
        for (std::size_t k = 0; k < 2; ++k) {
            const std::array<int, 3>& counts = counts_[f][k];
            const int all = counts[0] + counts[1] + counts[2] + 3;
            text += "  " + urine.causes[k] + ": {share: [";
            for (std::size_t level = 0; level < 3; ++level) {
                std::ostringstream share;
                share.precision(17);
                share << static_cast<double>(counts[level] + 1) / all;
                text += (level == 0 ? "" : ", ") + share.str();
            }
            text += "], worth: " + std::to_string(all) + ", basis: memory}\n";
        }
        return text;
    }

    std::vector<std::vector<std::string>> rows_;
    std::string set_;
    std::array<int, 2> causes_{};
    std::array<std::array<std::array<int, 3>, 2>, findings> counts_{};
};

TEST(OpenData, EveryUrineLeftOutOfItsTablesAndPriorsIsAsWorkedOutElsewhere) {
    WithoutOne without;
    const OpenData left_out = {"URINE_LOO", "", "", "", "audit_urine_loo.csv", urine.causes};
    const auto expected = left_out.expected();
    ASSERT_EQ(expected.size(), without.cases() + 1);
    const ReferenceTable published("open_data.csv");
    const auto cases = static_cast<Eigen::Index>(without.cases());
    engine::AuditSample sample{Eigen::ArrayXXd(cases, 2), Eigen::ArrayXXd::Zero(cases, 2)};
    const WorkDir dir;
    for (std::size_t row = 1; row <= without.cases(); ++row) {
        // Within this process: 79 programs would be slow to start.
        std::vector<std::string> words = without.leave_out(row, dir);
        std::vector<const char*> argv = {"steelyard"};
        for (const std::string& word : words) {
            argv.push_back(word.c_str());
        }
        std::ostringstream out;
        std::ostringstream err;
        ASSERT_EQ(cli::run_program(static_cast<int>(argv.size()), argv.data(), out, err), 0) << err.str();
        const auto results = plain_cells_in(out.str());
        ASSERT_EQ(results.size(), 2U);
        for (std::size_t k = 0; k < 2; ++k) {
            EXPECT_TRUE(near_rel(std::stod(expected[row][k + 1]), std::stod(results[1][k + 1]), 1e-12))
                << results[1][0];
            sample.log_forecast(static_cast<Eigen::Index>(row) - 1, static_cast<Eigen::Index>(k)) =
                std::log(std::stod(results[1][k + 1]));
        }
        sample.count(static_cast<Eigen::Index>(row) - 1, std::stoi(expected[row][0])) = 1.0;
        match_published(published, left_out, results[1]);
    }
    EXPECT_EQ(published_posteriors_not_compared(published, left_out.id), std::vector<std::string>());

    // No command audits cases that each have tables of their own; the engine does.
    const engine::AuditFigures figures = engine::audit(sample, {.replicates = 0});
    const engine::CauseFigures& crystals = figures.cause[1];
    const ReferenceTable table("audit_end_to_end.csv");
    EXPECT_TRUE(table.matches(left_out.id, "log_score_nats", figures.scores.log_score));
    EXPECT_TRUE(table.matches(left_out.id, "brier_sum_over_classes", figures.scores.brier));
    EXPECT_TRUE(table.matches(left_out.id, "top1_count", std::round(figures.calls.top[0].value * 79.0)));
    EXPECT_TRUE(table.matches(left_out.id, "auc", crystals.area->value));
    EXPECT_TRUE(published.matches(left_out.id, "auc_delong_lower", crystals.area->interval->low));
    EXPECT_TRUE(published.matches(left_out.id, "auc_delong_upper", crystals.area->interval->high));
    EXPECT_TRUE(table.matches(left_out.id, "cox_slope", crystals.calibration.cox->slope));
    EXPECT_TRUE(table.matches(left_out.id, "spiegelhalter_z", crystals.spiegelhalter->z));
}

}  // namespace
}  // namespace steelyard::test
