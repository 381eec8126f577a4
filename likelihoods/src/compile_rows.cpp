// SPDX-License-Identifier: Apache-2.0
// From rows as written to band probabilities. The mathematics is the engine's; here are the order in which
// rows depend on each other, the tolerances, and the place in the file at which a fault is shown.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "given_row.hpp"
#include "steelyard/engine/domain_error.hpp"
#include "steelyard/engine/one_against_rest.hpp"

namespace steelyard::likelihoods::detail {

using document::Code;
using document::Diagnostics;

namespace {

constexpr double sum_tolerance =
    0.05;  // published ratios and shares are rounded; a larger miss is another table

Eigen::ArrayXd as_array(const std::vector<double>& values) {
    return Eigen::Map<const Eigen::ArrayXd>(values.data(), static_cast<Eigen::Index>(values.size()));
}

class RowCompiler {
  public:
    RowCompiler(std::vector<GivenRow>& given, EvidenceTable& table, Diagnostics& faults)
        : given_(given), table_(table), faults_(faults), state_(given.size(), State::waiting) {}

    void compile_all() {
        for (std::size_t i = 0; i < given_.size(); ++i) {
            compile(i);
        }
    }

    void solve_rest(const std::vector<double>& study_mix) {
        const auto bands = table_.bands();
        const auto causes = static_cast<Eigen::Index>(given_.size());
        Eigen::ArrayXXd ratio(bands, causes);
        for (Eigen::Index c = 0; c < causes; ++c) {
            const GivenRow& row = given_[static_cast<std::size_t>(c)];
            if (!row.whole) {
                return;
            }
            ratio.col(c) = as_array(row.numbers);
        }
        guarded(given_.front(), [&] {
            const engine::RestSolution solution = engine::solve_ratio_to_rest(ratio, as_array(study_mix));
            // What is published is the uncertainty of ln R; the row moves by less.
            const Eigen::ArrayXXd shape = engine::shape_from_rest(ratio, as_array(study_mix));
            const Eigen::ArrayXXd slope = engine::log_slope_from_rest(ratio, as_array(study_mix));
            table_.study_mix = as_array(study_mix);
            table_.incoherence = solution.incoherence;
            table_.scale_is_unique = solution.scale_is_unique;
            for (Eigen::Index c = 0; c < causes; ++c) {
                GivenRow& row = given_[static_cast<std::size_t>(c)];
                const double miss = solution.column_miss(c);
                if (!(std::abs(miss) <= sum_tolerance)) {
                    report_sum(row,
                               fmt::format("rows.{}: the solved band probabilities sum to", row.row.cause),
                               miss);
                    continue;
                }
                row.row.compiled.probability = solution.probability.col(c);
                row.row.compiled.law =
                    engine::RatioLaw{shape.col(c).log(), as_array(row.log_sd) * slope.col(c)};
                keep_at_least(row);
                state_[static_cast<std::size_t>(c)] = State::done;
            }
        });
    }

    void hand_over() {
        for (std::size_t i = 0; i < given_.size(); ++i) {
            if (state_[i] == State::done) {
                table_.rows.push_back(std::move(given_[i].row));
            }
        }
    }

  private:
    enum class State { waiting, in_progress, done, failed };

    /// Runs a step of the engine; a DomainError becomes a fault at the row's line.
    template <typename Step>
    void guarded(const GivenRow& row, const Step& step) {
        try {
            step();
        } catch (const engine::DomainError& error) {
            faults_.add(row.numbers_at, Code::out_of_range,
                        fmt::format("rows.{}: {} is {:.6g}, but must be {}", row.row.cause, error.argument(),
                                    error.value(), error.requirement()));
        }
    }

    void report_sum(const GivenRow& row, const std::string& what, double miss) {
        faults_.add(row.numbers_at, Code::ratio_sum,
                    fmt::format("{} {:.4f}, but must be 1 within {} (the miss is {:+.4f})", what, 1.0 + miss,
                                sum_tolerance, miss),
                    "check the ratios, or widen the table to bands for which they were published");
    }

    void compile(std::size_t i) {
        if (state_[i] != State::waiting) {
            return;
        }
        GivenRow& row = given_[i];
        if (!row.whole) {
            state_[i] = State::failed;
            return;
        }
        state_[i] = State::in_progress;
        bool compiled = false;
        guarded(row, [&] {
            switch (row.row.form) {
                case RowForm::counts:
                case RowForm::joint:
                    row.row.compiled = engine::counts_row(as_array(row.numbers));
                    compiled = true;
                    break;
                case RowForm::share:
                    row.row.compiled = engine::share_row(as_array(row.numbers), row.worth);
                    compiled = true;
                    break;
                case RowForm::summary:
                    row.row.compiled =
                        engine::summary_row(row.mean, row.sd, row.n, row.scale, as_array(table_.edges));
                    compiled = true;
                    break;
                case RowForm::ratio:
                    compiled = compile_ratio(row);
                    break;
                case RowForm::ratio_to_rest:
                    break;  // solved together
            }
            if (compiled) {
                keep_at_least(row);
            }
        });
        state_[i] = compiled ? State::done : State::failed;
    }

    /// Compiles the row referred to first. A row met again on the way closes a ring of ratios.
    bool compile_ratio(GivenRow& row) {
        const auto found = std::find_if(given_.begin(), given_.end(), [&](const GivenRow& other) {
            return other.row.cause == row.row.against;
        });
        if (found == given_.end()) {
            return false;  // its absence is reported as a missing row
        }
        const auto reference = static_cast<std::size_t>(found - given_.begin());
        if (state_[reference] == State::in_progress) {
            faults_.add(
                row.against_at, Code::ratio_chain,
                fmt::format("rows.{} refers to {}, and so back to itself", row.row.cause, row.row.against),
                "one row of a chain of ratios must be given in another form");
            return false;
        }
        compile(reference);
        if (state_[reference] != State::done) {
            return false;
        }
        const Eigen::ArrayXd ratio = as_array(row.numbers);
        const Eigen::ArrayXd& base = found->row.compiled.probability;
        const double miss = (ratio * base).sum() - 1.0;
        if (!(std::abs(miss) <= sum_tolerance)) {
            report_sum(
                row,
                fmt::format("rows.{}: ratio times the row of {} sums to", row.row.cause, row.row.against),
                miss);
            return false;
        }
        row.row.compiled = engine::ratio_row(ratio, as_array(row.log_sd), base, sum_tolerance).row;
        return true;
    }

    /// The table's `least`, on judged rows only.
    void keep_at_least(GivenRow& row) const {
        if (!document::is_judged(row.row.grounds.basis)) {
            return;
        }
        engine::CompiledRow& compiled = row.row.compiled;
        const engine::BoundedRow bounded = engine::keep_at_least(compiled.probability, table_.least);
        row.row.least_acted = bounded.acted;
        if (!bounded.acted) {
            return;
        }
        compiled.probability = bounded.probability;
        // A Dirichlet keeps its worth and moves its mean to the row as used; the law of a mean and spread is
        // told where it ends. Ratios are centred on the row as used in any case.
        if (auto* law = std::get_if<engine::DirichletLaw>(&compiled.law)) {
            law->alpha = (bounded.probability * law->alpha.sum()).eval();
        } else if (auto* summary = std::get_if<engine::SummaryLaw>(&compiled.law)) {
            summary->least = table_.least;
        }
    }

    std::vector<GivenRow>& given_;
    EvidenceTable& table_;
    Diagnostics& faults_;
    std::vector<State> state_;
};

}  // namespace

void compile_rows(std::vector<GivenRow>& given, const std::optional<std::vector<double>>& study_mix,
                  EvidenceTable& table, Diagnostics& faults) {
    if (given.empty()) {
        return;
    }
    RowCompiler compiler(given, table, faults);
    if (given.front().row.form == RowForm::ratio_to_rest) {
        if (study_mix && study_mix->size() == given.size()) {
            compiler.solve_rest(*study_mix);
        }
    } else {
        compiler.compile_all();
    }
    compiler.hand_over();
}

}  // namespace steelyard::likelihoods::detail
