// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/surprise_law.hpp"

#include <algorithm>
#include <cmath>
#include <limits>
#include <numeric>

#include "band_table.hpp"
#include "guards.hpp"

namespace steelyard::engine {
namespace {

constexpr double infinity = std::numeric_limits<double>::infinity();
constexpr double tie = 1e-9;  // relative, of two probabilities, as in surprise()

/// ln P(outcome | cause) of every outcome that can be, in no order.
Eigen::ArrayXd all_outcomes(const std::vector<Eigen::ArrayXXd>& bands, Eigen::Index cause) {
    Eigen::ArrayXd list = Eigen::ArrayXd::Zero(1);
    for (const Eigen::ArrayXXd& table : bands) {
        const Eigen::ArrayXd row = table.col(cause);
        Eigen::ArrayXd longer(list.size() * (row > 0.0).count());
        Eigen::Index at = 0;
        for (const double p : row) {
            if (p > 0.0) {
                longer.segment(at, list.size()) = list + std::log(p);
                at += list.size();
            }
        }
        list.swap(longer);
    }
    return list;
}

/// The outcomes or draws of one cause, the least probable first.
Eigen::ArrayXd sorted(Eigen::ArrayXd values) {
    std::sort(values.begin(), values.end());
    return values;
}

}  // namespace

Eigen::ArrayXXd drawn_log_shares(const Eigen::Ref<const Eigen::ArrayXXd>& table,
                                 const std::function<double(std::uint64_t draw)>& uniform,
                                 std::uint64_t draws) {
    check_between("drawn_log_shares", "draws", static_cast<double>(draws), 1.0, 1e9);
    check_band_table("drawn_log_shares", "table", table, table.cols());
    Eigen::ArrayXXd up_to = table;
    for (Eigen::Index band = 1; band < up_to.rows(); ++band) {
        up_to.row(band) += up_to.row(band - 1);
    }
    const Eigen::ArrayXXd log_share = table.log();
    Eigen::ArrayXXd result(static_cast<Eigen::Index>(draws), table.cols());
    for (Eigen::Index draw = 0; draw < result.rows(); ++draw) {
        const double u = uniform(static_cast<std::uint64_t>(draw));
        if (!(u > 0.0 && u < 1.0)) {
            throw DomainError("drawn_log_shares", "uniform", std::nullopt, std::nullopt, u, "in (0, 1)");
        }
        for (Eigen::Index k = 0; k < result.cols(); ++k) {
            Eigen::Index band = 0;
            while (band + 1 < up_to.rows() && u > up_to(band, k)) {
                ++band;
            }
            result(draw, k) = log_share(band, k);
        }
    }
    return result;
}

SurpriseLaw SurpriseLaw::of_draws(const std::vector<const Eigen::ArrayXXd*>& log_shares) {
    check_size_at_least("SurpriseLaw::of_draws", "log_shares", static_cast<Eigen::Index>(log_shares.size()),
                        1);
    Eigen::ArrayXXd sum = *log_shares.front();
    for (std::size_t f = 1; f < log_shares.size(); ++f) {
        check_size("SurpriseLaw::of_draws", "log_shares rows", log_shares[f]->rows(), sum.rows());
        check_size("SurpriseLaw::of_draws", "log_shares columns", log_shares[f]->cols(), sum.cols());
        sum += *log_shares[f];
    }
    SurpriseLaw law;
    law.exact_ = false;
    for (Eigen::Index k = 0; k < sum.cols(); ++k) {
        law.laws_.push_back({sorted(sum.col(k)), {}});
    }
    return law;
}

SurpriseLaw::SurpriseLaw(const std::vector<Eigen::ArrayXXd>& bands, const UniformOfDraw& uniform,
                         const SurpriseLawLimits& limits) {
    check_size_at_least("SurpriseLaw", "bands", static_cast<Eigen::Index>(bands.size()), 1);
    check_between("SurpriseLaw", "draws", static_cast<double>(limits.draws), 1.0, 1e9);
    double outcomes = 1.0;
    for (const Eigen::ArrayXXd& table : bands) {
        check_band_table("SurpriseLaw", "bands", table, bands.front().cols());
        outcomes *= static_cast<double>(table.rows());
    }
    if (outcomes > static_cast<double>(limits.most_outcomes)) {
        if (!uniform) {
            throw DomainError("SurpriseLaw", "uniform", std::nullopt, std::nullopt, 0.0,
                              "given for more outcomes than the limit");
        }
        std::vector<Eigen::ArrayXXd> draws;
        std::vector<const Eigen::ArrayXXd*> pointers;
        draws.reserve(bands.size());
        for (std::size_t f = 0; f < bands.size(); ++f) {
            draws.push_back(drawn_log_shares(
                bands[f], [&](std::uint64_t draw) { return uniform(draw, static_cast<std::uint32_t>(f)); },
                limits.draws));
            pointers.push_back(&draws.back());
        }
        *this = of_draws(pointers);
        return;
    }
    for (Eigen::Index k = 0; k < bands.front().cols(); ++k) {
        Law law{sorted(all_outcomes(bands, k)), {}};
        law.up_to = law.log_probability.exp();
        std::partial_sum(law.up_to.begin(), law.up_to.end(), law.up_to.begin());
        laws_.push_back(std::move(law));
    }
}

Eigen::ArrayXd SurpriseLaw::probability(const Eigen::Ref<const Eigen::ArrayXd>& loglik) const {
    check_size("SurpriseLaw::probability", "loglik", loglik.size(), static_cast<Eigen::Index>(laws_.size()));
    Eigen::ArrayXd result = Eigen::ArrayXd::Zero(loglik.size());
    for (Eigen::Index k = 0; k < loglik.size(); ++k) {
        if (!(loglik(k) <= 0.0)) {
            throw DomainError("SurpriseLaw::probability", "loglik", k, std::nullopt, loglik(k), "<= 0");
        }
        if (loglik(k) == -infinity) {
            continue;
        }
        const Law& law = laws_[static_cast<std::size_t>(k)];
        const auto end =
            std::upper_bound(law.log_probability.begin(), law.log_probability.end(), loglik(k) + tie);
        const auto as_unusual = static_cast<Eigen::Index>(end - law.log_probability.begin());
        if (!exact_) {
            result(k) = (1.0 + static_cast<double>(as_unusual)) /
                        (1.0 + static_cast<double>(law.log_probability.size()));
        } else if (as_unusual > 0) {
            result(k) = std::min(law.up_to(as_unusual - 1), 1.0);
        }
    }
    return result;
}

}  // namespace steelyard::engine
