// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/row_ratio.hpp"

#include <algorithm>
#include <boost/math/special_functions/beta.hpp>
#include <boost/math/special_functions/digamma.hpp>
#include <boost/math/special_functions/gamma.hpp>
#include <boost/math/special_functions/trigamma.hpp>
#include <cmath>
#include <limits>
#include <optional>
#include <string_view>
#include <variant>
#include <vector>

#include "guards.hpp"
#include "monotone_root.hpp"
#include "normal_tail.hpp"
#include "steelyard/engine/beta_ratio.hpp"
#include "steelyard/engine/boost_policy.hpp"
#include "steelyard/engine/domain_error.hpp"

namespace steelyard::engine {
namespace {

constexpr Eigen::Index points = 257;
/// Shares below this are counted as this; no table reports a smaller one.
constexpr double least_share = 1e-300;

/// The table is good to three digits, so the functions behind it need not be taken in extended precision.
using Quick = boost_policies::normalise<BoostPolicy, boost_policies::promote_double<false>>::type;

double digamma(double x) {
    return boost::math::digamma(x, Quick());
}
double trigamma(double x) {
    return boost::math::trigamma(x, Quick());
}

struct Grid {
    double start = 0.0;
    double step = 0.0;
    Eigen::ArrayXd cdf;
};

template <class Cdf>
Grid tabulate(double low, double high, const Cdf& cdf) {
    Grid grid{low, (high - low) / static_cast<double>(points - 1), Eigen::ArrayXd(points)};
    double reached = 0.0;
    for (Eigen::Index i = 0; i < points; ++i) {
        reached = std::clamp(cdf(low + grid.step * static_cast<double>(i)), reached, 1.0);
        grid.cdf(i) = reached;
    }
    // What little lies outside the range is put on its ends.
    grid.cdf(0) = 0.0;
    grid.cdf(points - 1) = 1.0;
    return grid;
}

Grid point_mass(double at) {
    return {at, 0.0, Eigen::ArrayXd::Ones(1)};
}

Grid dirichlet_grid(const DirichletLaw& law, Eigen::Index band) {
    const auto [a, b] = band_margin(law.alpha, band);
    const double mean = digamma(a) - digamma(a + b);
    const double variance = trigamma(a) - trigamma(a + b);
    const double sd = std::sqrt(std::max(variance, 0.0));
    // ln p has an exponential tail of rate a to the left and ends at 0.
    const double low = mean - std::max(9.0 * sd, 12.0 / a);
    const double high = std::min(0.0, mean + 7.0 * sd);
    const double log_constant = boost::math::lgamma(a + b, Quick()) - boost::math::lgamma(a + 1.0, Quick()) -
                                boost::math::lgamma(b, Quick());
    return tabulate(low, high, [&, a = a, b = b](double x) {
        if (x >= 0.0) {
            return 1.0;
        }
        if (x < -600.0) {  // e^x leaves the range of a double: the leading term p^a / (a B(a, b))
            return std::exp(a * x + log_constant);
        }
        return x < -0.7 ? boost::math::ibeta(a, b, std::exp(x), Quick())
                        : boost::math::ibetac(b, a, -std::expm1(x), Quick());
    });
}

struct Cell {
    double low = 0.0, high = 0.0, mass = 0.0;
};

/// The law of ln P(band) over mean and variance: for each of some variances the mean runs through a grid, and
/// the mass between two grid points is spread evenly over the ln P between them.
std::vector<Cell> summary_cells(const SummaryLaw& law, Eigen::Index band) {
    constexpr double infinity = std::numeric_limits<double>::infinity();
    constexpr int variances = 41;
    constexpr int means = 73;
    constexpr double reach = 4.5;  // standard errors of the mean
    const auto on_scale = [&](double edge) { return law.scale == Scale::log ? std::log(edge) : edge; };
    const double lower = band == 0 ? -infinity : on_scale(law.edges(band - 1));
    const double upper = band == law.edges.size() ? infinity : on_scale(law.edges(band));
    const double freedom = law.n - 1.0;
    // u = ln(chi-square / v): mean psi(v/2) - ln(v/2), variance psi'(v/2), left tail of rate v/2; its log
    // density is v/2 (u - e^u) up to a constant.
    const double middle = digamma(freedom / 2.0) - std::log(freedom / 2.0);
    const double spread = std::sqrt(trigamma(freedom / 2.0));
    const double from = middle - std::max(9.0 * spread, 24.0 / freedom);
    const double to = middle + 6.0 * spread;
    const double floor = std::max(law.least, least_share);
    std::vector<Cell> cells;
    cells.reserve(static_cast<std::size_t>(variances) * (means - 1));
    double total = 0.0;
    for (int i = 0; i < variances; ++i) {
        const double u = from + (to - from) * i / (variances - 1);
        const double weight = std::exp(freedom / 2.0 * (u - std::expm1(u)));
        if (weight < 1e-9) {
            continue;
        }
        const double sigma = law.sd * std::exp(-0.5 * u);
        double previous_z = -reach;
        double previous = 0.0;
        for (int j = 0; j < means; ++j) {
            const double z = -reach + 2.0 * reach * j / (means - 1);
            const double mean = law.mean + sigma * z / std::sqrt(law.n);
            const double share = detail::normal_mass((lower - mean) / sigma, (upper - mean) / sigma);
            const double log_share = std::log(std::max(share, floor));
            if (j > 0) {
                const double mass = weight * detail::normal_mass(previous_z, z);
                cells.push_back({std::min(previous, log_share), std::max(previous, log_share), mass});
                total += mass;
            }
            previous_z = z;
            previous = log_share;
        }
    }
    for (Cell& cell : cells) {
        cell.mass /= total;
    }
    return cells;
}

Grid summary_grid(const SummaryLaw& law, Eigen::Index band) {
    std::vector<Cell> cells = summary_cells(law, band);
    std::sort(cells.begin(), cells.end(), [](const Cell& a, const Cell& b) { return a.low < b.low; });
    double low = cells.front().low;
    double below = 0.0;
    for (const Cell& cell :
         cells) {  // leave the lowest hundred-thousandth out of the range, not out of the sum
        low = cell.low;
        below += cell.mass;
        if (below > 1e-5) {
            break;
        }
    }
    double high = low;
    for (const Cell& cell : cells) {
        high = std::max(high, cell.high);
    }
    const double step = (high - low) / static_cast<double>(points - 1);
    if (!(step > 0.0)) {
        return point_mass(low);
    }
    // Each cell adds a ramp; what is complete by a grid point is carried on from there.
    Eigen::ArrayXd ramp = Eigen::ArrayXd::Zero(points);
    Eigen::ArrayXd complete = Eigen::ArrayXd::Zero(points + 1);
    for (const Cell& cell : cells) {
        const double first = std::ceil((cell.low - low) / step);
        auto i = static_cast<Eigen::Index>(std::max(first, 0.0));
        for (; i < points; ++i) {
            const double x = low + step * static_cast<double>(i);
            if (x >= cell.high) {
                break;
            }
            ramp(i) += cell.mass * (x - cell.low) / (cell.high - cell.low);
        }
        complete(std::min(i, points)) += cell.mass;
    }
    double carried = 0.0;
    Eigen::Index next = 0;
    return tabulate(low, high, [&](double) {
        carried += complete(next);
        return carried + ramp(next++);
    });
}

constexpr std::string_view name = "LogShareLaw";

double checked_share(const CompiledRow& row, Eigen::Index band) {
    check_index(name, "band", band, row.probability.size());
    const double share = row.probability(band);
    if (!(share > 0.0 && share <= 1.0)) {
        throw DomainError(name, "row.probability", band, std::nullopt, share, "above 0 and at most 1");
    }
    return share;
}

}  // namespace

LogShareLaw LogShareLaw::fixed(double share) {
    LogShareLaw law;
    if (!(share > 0.0 && share <= 1.0)) {
        throw DomainError("LogShareLaw::fixed", "share", std::nullopt, std::nullopt, share,
                          "above 0 and at most 1");
    }
    law.share_ = share;
    law.start_ = std::log(share);
    law.cdf_ = Eigen::ArrayXd::Ones(1);
    return law;
}

LogShareLaw::LogShareLaw(const CompiledRow& row, Eigen::Index band, const CompiledRow* reference)
    : share_(checked_share(row, band)) {
    Grid grid;
    if (const auto* dirichlet = std::get_if<DirichletLaw>(&row.law)) {
        check_size(name, "row.law.alpha", dirichlet->alpha.size(), row.probability.size());
        grid = with_boost(name, "row.law.alpha", dirichlet->alpha(band),
                          [&] { return dirichlet_grid(*dirichlet, band); });
    } else if (const auto* summary = std::get_if<SummaryLaw>(&row.law)) {
        check_size(name, "row.law.edges", summary->edges.size(), row.probability.size() - 1);
        check_positive(name, "row.law.sd", summary->sd);
        check_between(name, "row.law.n", summary->n, 2.0, std::numeric_limits<double>::infinity());
        check_between(name, "row.law.least", summary->least, 0.0, 0.2);
        grid = with_boost(name, "row.law.n", summary->n, [&] { return summary_grid(*summary, band); });
        if (summary->least > 0.0) {
            // The raised bands are the row's smallest: `least` over the sum by which the row was normalised.
            grid.start += std::log(row.probability.minCoeff() / summary->least);
        }
    } else if (const auto* ratio = std::get_if<RatioLaw>(&row.law)) {
        check_size(name, "row.law.log_sd", ratio->log_sd.size(), row.probability.size());
        const double sd = ratio->log_sd(band);
        check_between(name, "row.law.log_sd", sd, 0.0, std::numeric_limits<double>::infinity());
        const double centre = std::log(share_);
        LogShareLaw other = fixed(share_);
        if (reference != nullptr) {
            if (std::holds_alternative<RatioLaw>(reference->law)) {
                throw DomainError(name, "reference", std::nullopt, std::nullopt,
                                  static_cast<double>(reference->law.index()), "a row with a law of its own");
            }
            other = LogShareLaw(*reference, band);
        }
        // ln p = ln ratio + ln reference, centred so that the shares in use belong together.
        const double shift = centre - std::log(other.share_);
        if (sd == 0.0) {
            grid = {other.start_ + shift, other.step_, other.cdf_};
        } else {
            const double low = other.start_ + shift;
            const double high = low + other.step_ * static_cast<double>(other.cdf_.size() - 1);
            grid = tabulate(low - 6.0 * sd, high + 6.0 * sd, [&](double x) {
                if (other.step_ == 0.0) {
                    return detail::upper_tail((low - x) / sd);
                }
                double sum = 0.0;
                for (Eigen::Index i = 1; i < other.cdf_.size(); ++i) {
                    const double middle = low + other.step_ * (static_cast<double>(i) - 0.5);
                    sum += (other.cdf_(i) - other.cdf_(i - 1)) * detail::upper_tail((middle - x) / sd);
                }
                return sum;
            });
        }
    }
    start_ = grid.start;
    step_ = grid.step;
    cdf_ = grid.cdf;
    if (step_ > 0.0) {
        double first = 0.0;
        double second = 0.0;
        for (Eigen::Index i = 1; i < cdf_.size(); ++i) {
            const double distance = step_ * (static_cast<double>(i) - 0.5);
            const double mass = cdf_(i) - cdf_(i - 1);
            first += mass * distance;
            second += mass * distance * distance;
        }
        sd_ = std::sqrt(std::max(second - first * first, 0.0));
    }
}

double LogShareLaw::cdf(double x) const {
    if (step_ == 0.0) {
        return x >= start_ ? 1.0 : 0.0;
    }
    const double place = (x - start_) / step_;
    if (!(place > 0.0)) {
        return 0.0;
    }
    if (place >= static_cast<double>(cdf_.size() - 1)) {
        return 1.0;
    }
    const auto cell = static_cast<Eigen::Index>(place);
    return cdf_(cell) + (place - static_cast<double>(cell)) * (cdf_(cell + 1) - cdf_(cell));
}

double LogShareLaw::quantile(double q) const {
    if (!(q > 0.0 && q < 1.0)) {
        throw DomainError("LogShareLaw::quantile", "q", std::nullopt, std::nullopt, q, "above 0 and below 1");
    }
    if (step_ == 0.0) {
        return start_;
    }
    const double* const first = cdf_.data();
    const auto cell = std::lower_bound(first, first + cdf_.size(), q) - first;
    const double below = cdf_(cell - 1);
    return start_ + step_ * (static_cast<double>(cell - 1) + (q - below) / (cdf_(cell) - below));
}

double log_ratio_quantile(const LogShareLaw& a, const LogShareLaw& b, double q) {
    if (!(q > 0.0 && q < 1.0)) {
        throw DomainError("log_ratio_quantile", "q", std::nullopt, std::nullopt, q, "above 0 and below 1");
    }
    if (a.step_ == 0.0) {
        return a.start_ - b.quantile(1.0 - q);
    }
    if (b.step_ == 0.0) {
        return a.quantile(q) - b.start_;
    }
    const bool a_is_wider = a.sd_ >= b.sd_;
    const LogShareLaw& narrow = a_is_wider ? b : a;
    // P(A - B <= d): over the cells of the narrower law, the exact distribution of the wider one.
    const auto remaining = [&](double d) {
        double sum = 0.0;
        for (Eigen::Index i = 1; i < narrow.cdf_.size(); ++i) {
            const double mass = narrow.cdf_(i) - narrow.cdf_(i - 1);
            const double middle = narrow.start_ + narrow.step_ * (static_cast<double>(i) - 0.5);
            sum += mass * (a_is_wider ? a.cdf(middle + d) : 1.0 - b.cdf(middle - d));
        }
        return q - sum;
    };
    const auto last = [](const LogShareLaw& law) {
        return law.start_ + law.step_ * static_cast<double>(law.cdf_.size() - 1);
    };
    return detail::root_between(remaining, a.start_ - last(b), last(a) - b.start_);
}

IntervalEstimate row_ratio_interval(const LogShareLaw& a, const LogShareLaw& b, double level) {
    if (!(level > 0.0 && level < 1.0)) {
        throw DomainError("row_ratio_interval", "level", std::nullopt, std::nullopt, level,
                          "above 0 and below 1");
    }
    const double tail = (1.0 - level) / 2.0;
    const double value = a.share() / b.share();
    const double low = std::exp(log_ratio_quantile(a, b, tail));
    const double high = std::exp(log_ratio_quantile(a, b, 1.0 - tail));
    return {value, std::min(low, value), std::max(high, value)};
}

IntervalEstimate row_ratio_interval(const CompiledRow& a, const CompiledRow& b, Eigen::Index band,
                                    double level) {
    check_size("row_ratio_interval", "b", b.probability.size(), a.probability.size());
    return row_ratio_interval(LogShareLaw(a, band), LogShareLaw(b, band), level);
}

}  // namespace steelyard::engine
