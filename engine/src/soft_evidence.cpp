// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/soft_evidence.hpp"

#include <cmath>
#include <limits>
#include <optional>
#include <string>
#include <string_view>

#include "guards.hpp"
#include "normal_tail.hpp"
#include "steelyard/engine/domain_error.hpp"

namespace steelyard::engine {
namespace {

constexpr double infinity = std::numeric_limits<double>::infinity();

void check_table(std::string_view function, const Eigen::Ref<const Eigen::ArrayXXd>& table) {
    check_size_at_least(function, "table rows", table.rows(), 2);
    check_size_at_least(function, "table columns", table.cols(), 1);
    check_all_between(function, "table", table, 0.0, 1.0);
    for (Eigen::Index k = 0; k < table.cols(); ++k) {
        const double sum = table.col(k).sum();
        if (!(std::abs(sum - 1.0) <= 1e-9)) {
            throw DomainError(function, "table column sum", std::nullopt, k, sum, "1 within 1e-9");
        }
    }
}

/// Weights that are >= 0 and not all 0, brought to a largest entry of 1: no sum of them overflows.
Eigen::ArrayXd largest_one(std::string_view function, std::string_view argument,
                           const Eigen::Ref<const Eigen::ArrayXd>& weights) {
    check_all_between(function, argument, weights, 0.0, infinity);
    const double largest = weights.maxCoeff();
    check_positive(function, std::string("largest ").append(argument), largest);
    return weights / largest;
}

Eigen::ArrayXd probabilities(std::string_view function, const Eigen::Ref<const Eigen::ArrayXd>& prior,
                             Eigen::Index causes) {
    check_size(function, "prior", prior.size(), causes);
    const Eigen::ArrayXd weights = largest_one(function, "prior", prior);
    return weights / weights.sum();
}

Eigen::ArrayXd checked_lambda(std::string_view function, const Eigen::Ref<const Eigen::ArrayXd>& lambda,
                              Eigen::Index bands) {
    check_size(function, "lambda", lambda.size(), bands);
    return largest_one(function, "lambda", lambda);
}

/// P(band) for each band, after the checks that both ways of Jeffrey's rule share.
Eigen::ArrayXd checked_marginal(std::string_view function, const Eigen::ArrayXd& prior,
                                const Eigen::Ref<const Eigen::ArrayXXd>& table,
                                const Eigen::Ref<const Eigen::ArrayXd>& q) {
    check_size(function, "q", q.size(), table.rows());
    check_simplex(function, "q", q, 1e-9);
    Eigen::ArrayXd marginal = (table.matrix() * prior.matrix()).array();
    for (Eigen::Index b = 0; b < q.size(); ++b) {
        if (q(b) > 0.0 && marginal(b) == 0.0) {
            throw DomainError(function, "q", b, std::nullopt, q(b),
                              "0 where the prior holds the band impossible");
        }
    }
    return marginal;
}

void check_edges(std::string_view function, const Eigen::Ref<const Eigen::ArrayXd>& edges) {
    check_size_at_least(function, "edges", edges.size(), 1);
    check_all_between(function, "edges", edges, -infinity, infinity);
    for (Eigen::Index i = 1; i < edges.size(); ++i) {
        if (!(edges(i - 1) < edges(i))) {
            throw DomainError(function, "edges", i, std::nullopt, edges(i), "above the edge before it");
        }
    }
}

}  // namespace

Eigen::ArrayXd virtual_loglik(const Eigen::Ref<const Eigen::ArrayXXd>& table,
                              const Eigen::Ref<const Eigen::ArrayXd>& lambda) {
    check_table("virtual_loglik", table);
    const Eigen::ArrayXd scaled = checked_lambda("virtual_loglik", lambda, table.rows());
    Eigen::ArrayXd loglik = (table.matrix().transpose() * scaled.matrix()).array().log();
    return loglik.min(0.0);  // a column may sum to a little over 1
}

Eigen::ArrayXd virtual_evidence(const Eigen::Ref<const Eigen::ArrayXd>& prior,
                                const Eigen::Ref<const Eigen::ArrayXXd>& table,
                                const Eigen::Ref<const Eigen::ArrayXd>& lambda) {
    check_table("virtual_evidence", table);
    const Eigen::ArrayXd share = probabilities("virtual_evidence", prior, table.cols());
    const Eigen::ArrayXd scaled = checked_lambda("virtual_evidence", lambda, table.rows());
    const Eigen::ArrayXd weight = share * (table.matrix().transpose() * scaled.matrix()).array();
    const double sum = weight.sum();
    if (!(sum > 0.0)) {
        throw DomainError("virtual_evidence", "lambda", std::nullopt, std::nullopt, sum,
                          "possible under some cause of the prior");
    }
    return weight / sum;
}

Eigen::ArrayXd band_marginal(const Eigen::Ref<const Eigen::ArrayXd>& prior,
                             const Eigen::Ref<const Eigen::ArrayXXd>& table) {
    check_table("band_marginal", table);
    const Eigen::ArrayXd share = probabilities("band_marginal", prior, table.cols());
    return (table.matrix() * share.matrix()).array();
}

Eigen::ArrayXd jeffrey_update(const Eigen::Ref<const Eigen::ArrayXd>& prior,
                              const Eigen::Ref<const Eigen::ArrayXXd>& table,
                              const Eigen::Ref<const Eigen::ArrayXd>& q) {
    check_table("jeffrey_update", table);
    const Eigen::ArrayXd share = probabilities("jeffrey_update", prior, table.cols());
    const Eigen::ArrayXd marginal = checked_marginal("jeffrey_update", share, table, q);
    Eigen::ArrayXd updated = Eigen::ArrayXd::Zero(share.size());
    for (Eigen::Index b = 0; b < q.size(); ++b) {
        if (q(b) > 0.0) {
            // P(cause | band) before it is weighed by q: q / P(band) alone may overflow.
            updated += q(b) * (share * table.row(b).transpose() / marginal(b));
        }
    }
    return updated / updated.sum();
}

Eigen::ArrayXd equivalent_virtual_evidence(const Eigen::Ref<const Eigen::ArrayXd>& prior,
                                           const Eigen::Ref<const Eigen::ArrayXXd>& table,
                                           const Eigen::Ref<const Eigen::ArrayXd>& q) {
    check_table("equivalent_virtual_evidence", table);
    const Eigen::ArrayXd share = probabilities("equivalent_virtual_evidence", prior, table.cols());
    const Eigen::ArrayXd marginal = checked_marginal("equivalent_virtual_evidence", share, table, q);
    Eigen::ArrayXd lambda = Eigen::ArrayXd::Zero(q.size());
    for (Eigen::Index b = 0; b < q.size(); ++b) {
        lambda(b) = q(b) > 0.0 ? q(b) / marginal(b) : 0.0;
    }
    return lambda;
}

Eigen::Index hard_band(double value, const Eigen::Ref<const Eigen::ArrayXd>& edges) {
    check_between("hard_band", "value", value, -infinity, infinity);
    check_edges("hard_band", edges);
    return (edges <= value).count();
}

Eigen::ArrayXd band_mass(double reading, double sd, const Eigen::Ref<const Eigen::ArrayXd>& edges) {
    check_between("band_mass", "reading", reading, -infinity, infinity);
    check_positive("band_mass", "sd", sd);
    check_edges("band_mass", edges);
    Eigen::ArrayXd mass(edges.size() + 1);
    for (Eigen::Index b = 0; b < mass.size(); ++b) {
        const double low = b == 0 ? -infinity : (edges(b - 1) - reading) / sd;
        const double high = b == edges.size() ? infinity : (edges(b) - reading) / sd;
        mass(b) = detail::normal_mass(low, high);
    }
    return mass;
}

Eigen::ArrayXd band_density(double reading, double sd, const Eigen::Ref<const Eigen::ArrayXd>& edges,
                            double lowest, double highest) {
    check_between("band_density", "reading", reading, -infinity, infinity);
    check_positive("band_density", "sd", sd);
    check_edges("band_density", edges);
    if (!(std::isfinite(lowest) && lowest < edges(0))) {
        throw DomainError("band_density", "lowest", std::nullopt, std::nullopt, lowest,
                          "finite and below the first edge");
    }
    if (!(std::isfinite(highest) && highest > edges(edges.size() - 1))) {
        throw DomainError("band_density", "highest", std::nullopt, std::nullopt, highest,
                          "finite and above the last edge");
    }
    Eigen::ArrayXd density(edges.size() + 1);
    for (Eigen::Index b = 0; b < density.size(); ++b) {
        const double low = b == 0 ? lowest : edges(b - 1);
        const double high = b == edges.size() ? highest : edges(b);
        density(b) = detail::normal_mass((low - reading) / sd, (high - reading) / sd) / (high - low);
    }
    if (!(density.maxCoeff() > 0.0)) {
        throw DomainError("band_density", "reading", std::nullopt, std::nullopt, reading,
                          "within reach of some band, given its error");
    }
    return density;
}

}  // namespace steelyard::engine
