// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/uncertain_posterior.hpp"

#include <algorithm>
#include <cmath>
#include <limits>
#include <set>
#include <span>
#include <string>

#include "guards.hpp"
#include "row_sampler.hpp"
#include "steelyard/engine/counter_random.hpp"
#include "steelyard/engine/domain_error.hpp"

namespace steelyard::engine {
namespace {

constexpr double infinity = std::numeric_limits<double>::infinity();
constexpr const char* here = "UncertainPosterior";

/// Two streams a row; priors have theirs from 0xf0000000 on.
constexpr std::uint32_t largest_stream = (1U << 30U) - 1U;

[[noreturn]] void refuse(std::string_view argument, Eigen::Index index, double value,
                         std::string_view requirement) {
    throw DomainError(here, argument, index, std::nullopt, value, requirement);
}

Eigen::Index bands_of(const RowLaw& law) {
    if (const auto* dirichlet = std::get_if<DirichletLaw>(&law)) {
        return dirichlet->alpha.size();
    }
    if (const auto* summary = std::get_if<SummaryLaw>(&law)) {
        return summary->edges.size() + 1;
    }
    return std::get<RatioLaw>(law).log_sd.size();
}

void check_row(const UncertainProblem& problem, std::size_t index) {
    const UncertainRow& row = problem.rows[index];
    const auto at = static_cast<Eigen::Index>(index);
    if (row.cells.empty()) {
        refuse("cells size", at, 0.0, "at least 1");
    }
    const Eigen::Index bands = bands_of(row.law);
    for (const Eigen::Index cell : row.cells) {
        if (cell < 0 || cell >= bands) {
            refuse("cell", at, static_cast<double>(cell), "a band of its law");
        }
    }
    if (!(std::isfinite(row.log_share) && row.log_share <= 0.0)) {
        refuse("log_share", at, row.log_share, "finite and <= 0");
    }
    if (row.reference && *row.reference >= index) {
        refuse("reference", at, static_cast<double>(*row.reference), "an earlier row");
    }
    if (row.reference && !std::holds_alternative<RatioLaw>(row.law)) {
        refuse("reference", at, static_cast<double>(*row.reference),
               "absent: only ratios are against another row");
    }
    if (!(row.least >= 0.0 && row.least < 1.0)) {
        refuse("least", at, row.least, "in [0, 1)");
    }
    if (row.stream > largest_stream) {
        refuse("stream", at, static_cast<double>(row.stream), "below 2^30");
    }
}

void check_prior(const UncertainPrior& prior, Eigen::Index at) {
    if (!std::isfinite(prior.log_value)) {
        refuse("prior log_value", at, prior.log_value, "finite");
    }
    if (const auto* counted = std::get_if<CountedPrior>(&prior.law)) {
        if (!(std::isfinite(counted->shape) && counted->shape > 0.0)) {
            refuse("prior shape", at, counted->shape, "finite and > 0");
        }
    }
    if (const auto* ranged = std::get_if<RangedPrior>(&prior.law)) {
        if (!(std::isfinite(ranged->log_low) && ranged->log_low <= prior.log_value)) {
            refuse("prior log_low", at, ranged->log_low, "finite and not above the value");
        }
        if (!(std::isfinite(ranged->log_high) && ranged->log_high >= prior.log_value)) {
            refuse("prior log_high", at, ranged->log_high, "finite and not below the value");
        }
    }
}

void check_problem(const UncertainProblem& problem) {
    const auto causes = static_cast<Eigen::Index>(problem.priors.size());
    check_size_at_least(here, "priors", causes, 2);
    check_size(here, "weight", problem.weight.size(), problem.row_of.rows());
    if (problem.row_of.rows() > 0) {
        check_size(here, "row_of columns", problem.row_of.cols(), causes);
    }
    check_all_positive(here, "weight", problem.weight, 1.0, "> 0 and <= 1");
    std::set<std::uint32_t> streams;
    for (Eigen::Index k = 0; k < causes; ++k) {
        const UncertainPrior& prior = problem.priors[static_cast<std::size_t>(k)];
        check_prior(prior, k);
        if (!std::holds_alternative<KnownPrior>(prior.law) && !streams.insert(prior.stream).second) {
            refuse("prior stream", k, static_cast<double>(prior.stream), "one that no other prior has");
        }
    }
    streams.clear();
    for (std::size_t r = 0; r < problem.rows.size(); ++r) {
        check_row(problem, r);
        if (!streams.insert(problem.rows[r].stream).second) {
            refuse("stream", static_cast<Eigen::Index>(r), static_cast<double>(problem.rows[r].stream),
                   "one that no other row has");
        }
    }
    for (Eigen::Index k = 0; k < problem.row_of.cols(); ++k) {
        for (Eigen::Index f = 0; f < problem.row_of.rows(); ++f) {
            const int row = problem.row_of(f, k);
            if (row < 0 || static_cast<std::size_t>(row) >= problem.rows.size()) {
                throw DomainError(here, "row_of", f, k, row, "the index of a row");
            }
        }
    }
}

/// Streams of priors lie apart from those of rows.
constexpr std::uint32_t prior_streams = 0xf0000000U;

}  // namespace

struct UncertainPosterior::Prepared {
    UncertainProblem problem;
    std::vector<std::unique_ptr<const detail::RowSampler>> samplers;
    std::vector<detail::PriorSampler> priors;
    std::vector<std::vector<std::size_t>>
        rows_of_finding;  // each row once, references before what refers to them

    Eigen::Index coordinates(Eigen::Index source) const {
        if (source == problem.weight.size()) {
            return std::count_if(priors.begin(), priors.end(),
                                 [](const auto& prior) { return !prior.is_known(); });
        }
        Eigen::Index sum = 0;
        for (const std::size_t row : rows_of_finding[static_cast<std::size_t>(source)]) {
            sum += samplers[row]->coordinates();
        }
        return sum;
    }

    /// Adds what a source contributes to the log scores.
    void add(Eigen::Index source, const Eigen::Ref<const Eigen::ArrayXXd>& uniforms,
             Eigen::ArrayXXd& scores) const {
        if (source == problem.weight.size()) {
            add_priors(uniforms, scores);
        } else {
            add_finding(source, uniforms, scores);
        }
    }

    void add_priors(const Eigen::Ref<const Eigen::ArrayXXd>& uniforms, Eigen::ArrayXXd& scores) const {
        Eigen::Index used = 0;
        for (Eigen::Index k = 0; k < scores.cols(); ++k) {
            const detail::PriorSampler& prior = priors[static_cast<std::size_t>(k)];
            if (prior.is_known()) {
                scores.col(k) += prior.log_weight(0.5);
                continue;
            }
            for (Eigen::Index i = 0; i < scores.rows(); ++i) {
                scores(i, k) += prior.log_weight(uniforms(i, used));
            }
            ++used;
        }
    }

    void add_finding(Eigen::Index finding, const Eigen::Ref<const Eigen::ArrayXXd>& uniforms,
                     Eigen::ArrayXXd& scores) const {
        const std::vector<std::size_t>& rows = rows_of_finding[static_cast<std::size_t>(finding)];
        Eigen::ArrayXXd drawn(uniforms.rows(), static_cast<Eigen::Index>(rows.size()));
        Eigen::Index used = 0;
        for (std::size_t i = 0; i < rows.size(); ++i) {
            const detail::RowSampler& sampler = *samplers[rows[i]];
            Eigen::Index reference = -1;
            if (problem.rows[rows[i]].reference) {
                reference = static_cast<Eigen::Index>(
                    std::find(rows.begin(), rows.end(), *problem.rows[rows[i]].reference) - rows.begin());
            }
            const Eigen::ArrayXd none;
            sampler.fill(uniforms.middleCols(used, sampler.coordinates()),
                         reference < 0 ? Eigen::Ref<const Eigen::ArrayXd>(none)
                                       : Eigen::Ref<const Eigen::ArrayXd>(drawn.col(reference)),
                         drawn.col(static_cast<Eigen::Index>(i)));
            if (problem.rows[rows[i]].least > 0.0) {
                drawn.col(static_cast<Eigen::Index>(i)) =
                    drawn.col(static_cast<Eigen::Index>(i)).max(std::log(problem.rows[rows[i]].least)).eval();
            }
            used += sampler.coordinates();
        }
        for (Eigen::Index k = 0; k < scores.cols(); ++k) {
            const auto row = static_cast<std::size_t>(problem.row_of(finding, k));
            const auto column = std::find(rows.begin(), rows.end(), row) - rows.begin();
            scores.col(k) += problem.weight(finding) * drawn.col(column);
        }
    }

    /// The uniform numbers of one source for the draws of a block.
    Eigen::ArrayXXd uniforms(std::uint64_t seed, std::uint64_t first, Eigen::Index source) const {
        Eigen::ArrayXXd out(block, coordinates(source));
        const auto fill = [&](Eigen::Index column, std::uint32_t stream) {
            fill_uniform(seed, stream, first, {out.col(column).data(), static_cast<std::size_t>(block)});
        };
        if (source == problem.weight.size()) {
            Eigen::Index used = 0;
            for (std::size_t k = 0; k < priors.size(); ++k) {
                if (!priors[k].is_known()) {
                    fill(used++, prior_streams + problem.priors[k].stream);
                }
            }
            return out;
        }
        Eigen::Index column = 0;
        for (const std::size_t row : rows_of_finding[static_cast<std::size_t>(source)]) {
            for (Eigen::Index j = 0; j < samplers[row]->coordinates(); ++j) {
                fill(column++, 2 * problem.rows[row].stream + static_cast<std::uint32_t>(j));
            }
        }
        return out;
    }
};

UncertainPosterior::UncertainPosterior(const UncertainProblem& problem) {
    check_problem(problem);
    auto prepared = std::make_unique<Prepared>();
    prepared->problem = problem;
    for (const UncertainRow& row : problem.rows) {
        prepared->samplers.push_back(
            detail::row_sampler(row, row.reference ? problem.rows[*row.reference].log_share : 0.0));
    }
    for (const UncertainPrior& prior : problem.priors) {
        prepared->priors.emplace_back(prior);
    }
    for (Eigen::Index f = 0; f < problem.row_of.rows(); ++f) {
        std::set<std::size_t> rows;
        for (Eigen::Index k = 0; k < problem.row_of.cols(); ++k) {
            std::optional<std::size_t> row = static_cast<std::size_t>(problem.row_of(f, k));
            while (row) {
                rows.insert(*row);
                row = problem.rows[*row].reference;
            }
        }
        prepared->rows_of_finding.emplace_back(rows.begin(), rows.end());
    }
    prepared_ = std::move(prepared);
}

UncertainPosterior::~UncertainPosterior() = default;
UncertainPosterior::UncertainPosterior(UncertainPosterior&&) noexcept = default;
UncertainPosterior& UncertainPosterior::operator=(UncertainPosterior&&) noexcept = default;

Eigen::Index UncertainPosterior::causes() const noexcept {
    return static_cast<Eigen::Index>(prepared_->priors.size());
}

Eigen::Index UncertainPosterior::findings() const noexcept {
    return prepared_->problem.weight.size();
}

Eigen::Index UncertainPosterior::coordinates(Eigen::Index source) const {
    check_index("UncertainPosterior::coordinates", "source", source, sources());
    return prepared_->coordinates(source);
}

Eigen::ArrayXXd UncertainPosterior::contribution(Eigen::Index source,
                                                 const Eigen::Ref<const Eigen::ArrayXXd>& uniforms) const {
    constexpr const char* function = "UncertainPosterior::contribution";
    check_index(function, "source", source, sources());
    check_size(function, "uniforms columns", uniforms.cols(), prepared_->coordinates(source));
    check_all_between(function, "uniforms", uniforms, 0x1p-33, 1.0 - 0x1p-33);
    Eigen::ArrayXXd scores = Eigen::ArrayXXd::Zero(uniforms.rows(), causes());
    prepared_->add(source, uniforms, scores);
    return scores;
}

Eigen::ArrayXXd UncertainPosterior::draw(std::uint64_t seed, std::uint64_t first, Eigen::Index count) const {
    constexpr const char* function = "UncertainPosterior::draw";
    if (first % static_cast<std::uint64_t>(block) != 0) {
        throw DomainError(function, "first", std::nullopt, std::nullopt, static_cast<double>(first),
                          "a multiple of the block size");
    }
    if (count < 0 || count > block) {
        throw DomainError(function, "count", std::nullopt, std::nullopt, static_cast<double>(count),
                          "between 0 and the block size");
    }
    // A whole block is always computed: the last digits of vectorised functions depend on the place within
    // it.
    Eigen::ArrayXXd scores = Eigen::ArrayXXd::Zero(block, causes());
    for (Eigen::Index source = 0; source < sources(); ++source) {
        prepared_->add(source, prepared_->uniforms(seed, first, source), scores);
    }
    return softmax_rows(scores).topRows(count);
}

UncertainPosterior::LogInterval UncertainPosterior::row_interval(std::size_t row, double level) const {
    constexpr const char* function = "UncertainPosterior::row_interval";
    check_index(function, "row", static_cast<Eigen::Index>(row),
                static_cast<Eigen::Index>(prepared_->samplers.size()));
    if (!(level > 0.0 && level <= 1.0 - 0x1p-31)) {
        throw DomainError(function, "level", std::nullopt, std::nullopt, level, "in (0, 1 - 2^-31]");
    }
    const UncertainRow& own = prepared_->problem.rows[row];
    const detail::RowSampler& sampler = *prepared_->samplers[row];
    const double tail = (1.0 - level) / 2.0;
    const double floor = own.least > 0.0 ? std::log(own.least) : -infinity;
    Eigen::ArrayXd shares;
    if (sampler.coordinates() == 1) {
        const Eigen::ArrayXXd ends = (Eigen::ArrayXXd(2, 1) << tail, 1.0 - tail).finished();
        Eigen::ArrayXd reference;
        if (own.reference) {
            reference = Eigen::ArrayXd::Constant(2, prepared_->problem.rows[*own.reference].log_share);
        }
        shares.resize(2);
        sampler.fill(ends, reference, shares);
        return {std::max(shares(0), floor), std::max(shares(1), floor)};
    }
    // Two numbers a draw: the quantiles over an even grid of both, 48 by 48: right to 1 % of the width.
    constexpr Eigen::Index side = 48;
    Eigen::ArrayXXd grid(side * side, 2);
    for (Eigen::Index i = 0; i < side; ++i) {
        for (Eigen::Index j = 0; j < side; ++j) {
            grid(i * side + j, 0) = (static_cast<double>(i) + 0.5) / side;
            grid(i * side + j, 1) = (static_cast<double>(j) + 0.5) / side;
        }
    }
    shares.resize(side * side);
    sampler.fill(grid, Eigen::ArrayXd(), shares);
    const auto quantile = [&](double q) {
        const auto rank = static_cast<Eigen::Index>(std::lround(q * static_cast<double>(shares.size() - 1)));
        std::nth_element(shares.data(), shares.data() + rank, shares.data() + shares.size());
        return shares(rank);
    };
    const double low = std::max(quantile(tail), floor);
    return {low, std::max(quantile(1.0 - tail), floor)};
}

Eigen::ArrayXXd softmax_rows(const Eigen::Ref<const Eigen::ArrayXXd>& scores) {
    check_size_at_least("softmax_rows", "scores columns", scores.cols(), 1);
    check_all_between("softmax_rows", "scores", scores, -infinity, infinity);
    const Eigen::ArrayXd largest = scores.rowwise().maxCoeff();
    Eigen::ArrayXXd share = (scores.colwise() - largest).exp();
    const Eigen::ArrayXd sum = share.rowwise().sum();
    share.colwise() /= sum;
    return share;
}

}  // namespace steelyard::engine
