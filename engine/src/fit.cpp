// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/fit.hpp"

#include <algorithm>
#include <cmath>
#include <limits>
#include <numbers>
#include <numeric>
#include <string_view>

#include "band_table.hpp"
#include "exact_sum.hpp"
#include "guards.hpp"
#include "steelyard/engine/domain_error.hpp"
#include "steelyard/engine/log_math.hpp"

namespace steelyard::engine {
namespace {

constexpr double infinity = std::numeric_limits<double>::infinity();
constexpr double tie = 1e-9;                   // relative, of two probabilities
constexpr double explained_tolerance = 1e-12;  // bits

/// A product of counts that stops at the largest number instead of wrapping round.
std::uint64_t times(std::uint64_t a, std::uint64_t b) {
    constexpr std::uint64_t most = std::numeric_limits<std::uint64_t>::max();
    return b != 0 && a > most / b ? most : a * b;
}

std::uint64_t band_count(const Eigen::ArrayXXd& table) {
    return static_cast<std::uint64_t>(table.rows());
}

void check_pattern(std::string_view function, const std::vector<Eigen::ArrayXXd>& bands,
                   const std::vector<BandIndex>& seen, Eigen::Index causes) {
    check_size(function, "seen", static_cast<Eigen::Index>(seen.size()),
               static_cast<Eigen::Index>(bands.size()));
    for (std::size_t f = 0; f < bands.size(); ++f) {
        check_band_table(function, "bands", bands[f], causes);
        check_index(function, "seen", seen[f].value, bands[f].rows());
    }
}

// ---- meeting in the middle ----

/// An outcome of some of the findings under one cause.
struct Outcome {
    double log_probability;
    double probability;
};
using Outcomes = std::vector<Outcome>;

bool less_probable(const Outcome& a, const Outcome& b) {
    return a.log_probability < b.log_probability;
}

/// Every outcome of the findings of one half under one cause, least probable first. Each finding multiplies
/// the list: one copy a band, every copy in order already, so merging takes the place of sorting.
class OrderedOutcomes {
  public:
    const Outcomes& of(const std::vector<const Eigen::ArrayXXd*>& half, Eigen::Index cause) {
        list_.assign(1, Outcome{0.0, 1.0});
        for (const Eigen::ArrayXXd* table : half) {
            multiply(table->col(cause));
        }
        return list_;
    }

  private:
    void multiply(const Eigen::Ref<const Eigen::ArrayXd>& row) {
        const std::size_t run = list_.size();
        next_.clear();
        for (Eigen::Index band = 0; band < row.size(); ++band) {
            if (row(band) > 0.0) {  // what cannot be adds nothing
                const double log_row = std::log(row(band));
                for (const Outcome& outcome : list_) {
                    next_.push_back({outcome.log_probability + log_row, outcome.probability * row(band)});
                }
            }
        }
        for (std::size_t sorted = run; sorted < next_.size(); sorted *= 2) {
            list_.resize(next_.size());
            for (std::size_t begin = 0; begin < next_.size(); begin += 2 * sorted) {
                merge(begin, std::min(begin + sorted, next_.size()),
                      std::min(begin + 2 * sorted, next_.size()));
            }
            list_.swap(next_);
        }
        list_.swap(next_);
    }

    /// Merges next_[begin, middle) and next_[middle, end) into list_[begin, end).
    void merge(std::size_t begin, std::size_t middle, std::size_t end) {
        const auto at = [](Outcomes& list, std::size_t place) {
            return list.begin() + static_cast<Outcomes::difference_type>(place);
        };
        std::merge(at(next_, begin), at(next_, middle), at(next_, middle), at(next_, end), at(list_, begin),
                   less_probable);
    }

    Outcomes list_, next_;
};

/// Splits findings into two halves of about equally many outcomes: the largest first, each to the half that
/// has fewer outcomes so far.
struct Halves {
    explicit Halves(const std::vector<Eigen::ArrayXXd>& bands) {
        std::vector<const Eigen::ArrayXXd*> tables;
        tables.reserve(bands.size());
        for (const Eigen::ArrayXXd& table : bands) {
            tables.push_back(&table);
        }
        std::stable_sort(tables.begin(), tables.end(),
                         [](const auto* a, const auto* b) { return a->rows() > b->rows(); });
        for (const Eigen::ArrayXXd* table : tables) {
            const bool to_first = first_outcomes <= second_outcomes;
            (to_first ? first : second).push_back(table);
            std::uint64_t& outcomes = to_first ? first_outcomes : second_outcomes;
            outcomes = times(outcomes, band_count(*table));
        }
    }
    std::vector<const Eigen::ArrayXXd*> first, second;
    std::uint64_t first_outcomes = 1, second_outcomes = 1;
};

/// The probability of all pairs of outcomes whose joint log probability is at most `limit`; both lists least
/// probable first.
double probability_up_to(const Outcomes& first, const Outcomes& second, double limit) {
    ExactSum total;
    ExactSum below;  // of the outcomes of `second` that go with the present outcome of `first`
    std::size_t cut = 0;
    for (std::size_t i = first.size(); i-- > 0;) {  // from the most probable down, so that the cut moves up
        const double room = limit - first[i].log_probability;
        for (; cut < second.size() && second[cut].log_probability <= room; ++cut) {
            below.add(second[cut].probability);
        }
        total.add_product(first[i].probability, below.value());
    }
    return std::min(total.value(), 1.0);
}

/// ln P(pattern | cause) for each cause.
Eigen::ArrayXd log_probability_of(const std::vector<Eigen::ArrayXXd>& bands,
                                  const std::vector<BandIndex>& seen) {
    Eigen::ArrayXd result = Eigen::ArrayXd::Zero(bands.front().cols());
    for (std::size_t f = 0; f < bands.size(); ++f) {
        result += bands[f].row(seen[f].value).transpose().log();
    }
    return result;
}

Surprise exact_surprise(const Halves& halves, const Eigen::ArrayXd& observed) {
    Surprise result;
    result.probability = Eigen::ArrayXd::Zero(observed.size());
    result.error = Eigen::ArrayXd::Zero(observed.size());
    OrderedOutcomes first;
    OrderedOutcomes second;
    for (Eigen::Index k = 0; k < observed.size(); ++k) {
        if (observed(k) > -infinity) {
            result.probability(k) =
                probability_up_to(first.of(halves.first, k), second.of(halves.second, k), observed(k) + tie);
        }
    }
    return result;
}

// ---- drawing patterns ----

/// One finding's table made ready for drawing: P(this band or one before it | cause) and ln P(band | cause).
struct DrawTable {
    explicit DrawTable(const Eigen::ArrayXXd& table) : up_to(table), log_probability(table.log()) {
        for (Eigen::Index band = 1; band < table.rows(); ++band) {
            up_to.row(band) += up_to.row(band - 1);
        }
    }
    double log_probability_at(double uniform, Eigen::Index cause) const {
        const Eigen::Index last = up_to.rows() - 1;
        const double point = uniform * up_to(last, cause);  // a column may miss the sum 1 by a rounding
        Eigen::Index band = 0;
        while (band < last && !(point < up_to(band, cause))) {
            ++band;
        }
        return log_probability(band, cause);
    }
    Eigen::ArrayXXd up_to, log_probability;
};

Surprise drawn_surprise(const std::vector<Eigen::ArrayXXd>& bands, const Eigen::ArrayXd& observed,
                        const UniformOfDraw& uniform, std::uint64_t draws) {
    if (!uniform) {
        throw DomainError("surprise", "uniform", std::nullopt, std::nullopt, 0.0,
                          "given for more outcomes than the limit");
    }
    const std::vector<DrawTable> tables(bands.begin(), bands.end());
    Eigen::ArrayXd as_unusual = Eigen::ArrayXd::Zero(observed.size());
    Eigen::ArrayXd drawn(observed.size());
    for (std::uint64_t draw = 0; draw < draws; ++draw) {
        drawn.setZero();
        for (std::size_t f = 0; f < tables.size(); ++f) {
            const double u = uniform(draw, static_cast<std::uint32_t>(f));
            if (!(u > 0.0 && u < 1.0)) {
                throw DomainError("surprise", "uniform", std::nullopt, std::nullopt, u, "in (0, 1)");
            }
            for (Eigen::Index k = 0; k < drawn.size(); ++k) {
                drawn(k) += tables[f].log_probability_at(u, k);
            }
        }
        as_unusual += (drawn <= observed + tie).cast<double>();
    }
    const auto count = static_cast<double>(draws);
    Surprise result;
    result.exact = false;
    result.probability = (observed > -infinity).select((1.0 + as_unusual) / (1.0 + count), 0.0);
    // No draw, or every draw, shows a chance only to within about one draw.
    result.error =
        (observed > -infinity)
            .select((result.probability * (1.0 - result.probability) / count).sqrt().max(1.0 / count), 0.0);
    return result;
}

// ---- all patterns, the cause unknown ----

/// Walks through every outcome, one finding after the other, with the joint probability of the outcome so far
/// and each cause.
class Enumeration {
  public:
    Enumeration(const Eigen::Ref<const Eigen::ArrayXd>& prior, const std::vector<Eigen::ArrayXXd>& bands,
                double limit)
        : bands_(bands), limit_(limit), joint_(prior.size(), static_cast<Eigen::Index>(bands.size()) + 1) {
        joint_.col(0) = prior;
    }

    /// The probability of all outcomes that are no more probable than the limit.
    double probability_up_to_limit() {
        extend(0);
        return std::min(total_.value(), 1.0);
    }

  private:
    void extend(std::size_t finding) {
        const Eigen::ArrayXXd& table = bands_[finding];
        const auto place = static_cast<Eigen::Index>(finding);
        for (Eigen::Index band = 0; band < table.rows(); ++band) {
            joint_.col(place + 1) = joint_.col(place) * table.row(band).transpose();
            if (finding + 1 < bands_.size()) {
                extend(finding + 1);
            } else {
                const double probability = joint_.col(place + 1).sum();
                if (probability <= limit_) {
                    total_.add(probability);
                }
            }
        }
    }

    const std::vector<Eigen::ArrayXXd>& bands_;
    double limit_;
    Eigen::ArrayXXd joint_;  // shape (K, F + 1): column f after the first f findings
    ExactSum total_;
};

/// The mean probability of a pattern, sum over patterns of P^2.
double mean_probability(const Eigen::Ref<const Eigen::ArrayXd>& prior,
                        const std::vector<Eigen::ArrayXXd>& bands) {
    Eigen::ArrayXXd meeting = (prior.matrix() * prior.matrix().transpose()).array();
    for (const Eigen::ArrayXXd& table : bands) {
        meeting *= (table.matrix().transpose() * table.matrix()).array();
    }
    return meeting.sum();
}

}  // namespace

Conflict conflict(const Eigen::Ref<const Eigen::ArrayXd>& prior,
                  const Eigen::Ref<const Eigen::ArrayXXd>& loglik) {
    check_causes("conflict", "prior", prior);
    check_size("conflict", "loglik columns", loglik.cols(), prior.size());
    for (Eigen::Index k = 0; k < loglik.cols(); ++k) {
        for (Eigen::Index f = 0; f < loglik.rows(); ++f) {
            if (!(loglik(f, k) <= 0.0)) {
                throw DomainError("conflict", "loglik", f, k, loglik(f, k), "<= 0");
            }
        }
    }
    const Eigen::ArrayXd log_prior = prior.log();
    const Eigen::ArrayXd log_all = loglik.colwise().sum().transpose();
    const double log_together = log_sum_exp(log_prior + log_all);
    if (!(log_together > -infinity)) {
        throw DomainError("conflict", "loglik", std::nullopt, std::nullopt, log_together,
                          "possible under some cause of the prior");
    }
    Conflict result;
    if (loglik.rows() > 1) {
        ExactSum apart;
        for (Eigen::Index f = 0; f < loglik.rows(); ++f) {
            apart.add(log_sum_exp(log_prior + loglik.row(f).transpose()));
        }
        result.bits = apart.minus(ExactSum(log_together)) / std::numbers::ln2;
    }
    result.gain_bits = (log_all - log_together) / std::numbers::ln2;
    for (Eigen::Index k = 0; k < prior.size(); ++k) {
        result.explained_by.push_back(result.gain_bits(k) >= result.bits - explained_tolerance);
    }
    return result;
}

Surprise surprise(const std::vector<Eigen::ArrayXXd>& bands, const std::vector<BandIndex>& seen,
                  const UniformOfDraw& uniform, const SurpriseLimits& limits) {
    check_size_at_least("surprise", "bands", static_cast<Eigen::Index>(bands.size()), 1);
    check_size_at_least("surprise", "bands columns", bands.front().cols(), 1);
    check_pattern("surprise", bands, seen, bands.front().cols());
    check_between("surprise", "draws", static_cast<double>(limits.draws), 1.0, 1e12);
    const Eigen::ArrayXd observed = log_probability_of(bands, seen);
    const Halves halves(bands);
    if (std::max(halves.first_outcomes, halves.second_outcomes) <= limits.most_outcomes) {
        return exact_surprise(halves, observed);
    }
    return drawn_surprise(bands, observed, uniform, limits.draws);
}

PredictiveCheck predictive_check(const Eigen::Ref<const Eigen::ArrayXd>& prior,
                                 const std::vector<Eigen::ArrayXXd>& bands,
                                 const std::vector<BandIndex>& seen, std::uint64_t most_outcomes) {
    check_causes("predictive_check", "prior", prior);
    check_size_at_least("predictive_check", "bands", static_cast<Eigen::Index>(bands.size()), 1);
    check_pattern("predictive_check", bands, seen, prior.size());
    Eigen::ArrayXd joint = prior;
    std::uint64_t outcomes = 1;
    for (std::size_t f = 0; f < bands.size(); ++f) {
        joint *= bands[f].row(seen[f].value).transpose();
        outcomes = times(outcomes, band_count(bands[f]));
    }
    PredictiveCheck result;
    result.probability = joint.sum();
    if (outcomes <= most_outcomes) {
        result.p_value =
            Enumeration(prior, bands, result.probability * (1.0 + tie)).probability_up_to_limit();
    }
    result.surprise_index = mean_probability(prior, bands) / result.probability;
    return result;
}

}  // namespace steelyard::engine
