// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/ledger.hpp"

#include <cmath>
#include <limits>
#include <optional>

#include "exact_scores.hpp"
#include "guards.hpp"
#include "steelyard/engine/domain_error.hpp"
#include "steelyard/engine/log_math.hpp"

namespace steelyard::engine {
namespace {

/// Above this a double times a power of ten has no fractional digit left to round.
constexpr double most_units = 4503599627370496.0;  // 2^52

/// x * scale to the nearest whole number, ties to even, as if the product were exact.
double rounded_product(double x, double scale) {
    const double product = x * scale;
    const double below = std::floor(product);
    const double part = product - below;
    if (part != 0.5) {
        return part < 0.5 ? below : below + 1.0;
    }
    const double error = std::fma(x, scale, -product);  // on which side of the half the exact product lies
    if (error != 0.0) {
        return error < 0.0 ? below : below + 1.0;
    }
    return std::fmod(below, 2.0) == 0.0 ? below : below + 1.0;
}

}  // namespace

Ledger::Pair Ledger::pair(Eigen::Index a, Eigen::Index b) const {
    check_index("Ledger::pair", "a", a, log_prior.size());
    check_index("Ledger::pair", "b", b, log_prior.size());
    Pair result;
    result.prior = log_prior(a) - log_prior(b);
    result.lines = contribution.col(a) - contribution.col(b);
    result.total = result.prior;
    for (Eigen::Index finding = 0; finding < result.lines.size(); ++finding) {
        result.total += result.lines(finding);
    }
    return result;
}

Ledger ledger(const Eigen::Ref<const Eigen::ArrayXd>& log_prior,
              const Eigen::Ref<const Eigen::ArrayXXd>& loglik,
              const Eigen::Ref<const Eigen::ArrayXd>& weight) {
    const Eigen::ArrayXd below_leader = exact_scores("ledger", log_prior, loglik, weight).below_leader();
    Ledger result;
    result.log_prior = log_prior - log_sum_exp(log_prior);
    result.contribution = loglik.colwise() * weight;
    result.log_posterior = below_leader - log_sum_exp(below_leader);
    return result;
}

std::vector<double> rounded_to_add_up(const std::vector<double>& lines, int digits) {
    check_between("rounded_to_add_up", "digits", digits, 0, 15);
    const double scale = std::pow(10.0, digits);
    std::vector<double> rounded;
    rounded.reserve(lines.size());
    double total = 0.0;
    double total_units = 0.0;
    for (std::size_t i = 0; i < lines.size(); ++i) {
        const auto place = static_cast<Eigen::Index>(i);
        if (!std::isfinite(lines[i])) {
            throw DomainError("rounded_to_add_up", "lines", place, std::nullopt, lines[i], "finite");
        }
        total += lines[i];
        if (!(std::abs(total) * scale <= most_units)) {
            throw DomainError("rounded_to_add_up", "running total", place, std::nullopt, total,
                              "within 2^52 units of the last decimal");
        }
        const double units = rounded_product(total, scale);
        rounded.push_back((units - total_units) / scale);
        total_units = units;
    }
    return rounded;
}

double dependence_weight(int m, double rho) {
    check_between("dependence_weight", "m", m, 1, std::numeric_limits<int>::max());
    check_between("dependence_weight", "rho", rho, 0.0, 1.0);
    return 1.0 / (1.0 + (static_cast<double>(m) - 1.0) * rho);
}

}  // namespace steelyard::engine
