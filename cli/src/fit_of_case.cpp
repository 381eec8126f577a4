// SPDX-License-Identifier: Apache-2.0
#include <cmath>

#include "sensitivity_parts.hpp"
#include "steelyard/engine/counter_random.hpp"
#include "steelyard/engine/fit.hpp"

namespace steelyard::cli {
namespace {

using likelihoods::FindingReading;
using likelihoods::Use;

constexpr std::uint32_t fit_streams = 0xe0000000U;  // apart from those of rows and priors

/// The table of one finding as the case reads it: its bands, or, where several cells add up (a joint table of
/// which one half is known), what was seen and the rest.
std::pair<Eigen::ArrayXXd, engine::BandIndex> table_as_read(const CaseModel& model,
                                                            const FindingReading& reading) {
    const Eigen::ArrayXXd& shares = model.shares(reading.table);
    if (reading.cells.size() == 1) {
        return {shares, engine::BandIndex{reading.cells.front()}};
    }
    Eigen::ArrayXXd two = Eigen::ArrayXXd::Zero(2, shares.cols());
    for (const Eigen::Index cell : reading.cells) {
        two.row(0) += shares.row(cell);
    }
    two.row(0) = two.row(0).min(1.0);
    two.row(1) = 1.0 - two.row(0);
    return {two, engine::BandIndex{0}};
}

}  // namespace

Fit fit_of(const CaseModel& model, const Weighing& weighing, std::uint64_t seed) {
    std::vector<Eigen::ArrayXXd> tables;
    std::vector<engine::BandIndex> seen;
    for (const FindingReading& reading : weighing.pattern.findings) {
        if (reading.use == Use::read) {
            auto [table, band] = table_as_read(model, reading);
            tables.push_back(std::move(table));
            seen.push_back(band);
        }
    }
    Fit fit;
    if (tables.empty()) {
        fit.surprise.assign(weighing.causes.size(), 1.0);
        fit.surprise_error.assign(weighing.causes.size(), 0.0);
        return fit;
    }
    Eigen::ArrayXXd loglik(static_cast<Eigen::Index>(tables.size()),
                           static_cast<Eigen::Index>(weighing.causes.size()));
    for (Eigen::Index f = 0; f < loglik.rows(); ++f) {
        const auto i = static_cast<std::size_t>(f);
        loglik.row(f) = tables[i].row(seen[i].value).log();
    }
    const Eigen::ArrayXd prior = model.log_prior().exp();
    fit.conflict_bits = engine::conflict(prior / prior.sum(), loglik).bits;
    const engine::Surprise surprise =
        engine::surprise(tables, seen, [seed](std::uint64_t draw, std::uint32_t finding) {
            return engine::uniform(seed, fit_streams + finding, draw);
        });
    fit.surprise = per_cause(surprise.probability);
    fit.surprise_error = per_cause(surprise.error);
    fit.exact = surprise.exact;
    fit.explained = surprise.probability.maxCoeff() >= unexplained_below;
    return fit;
}

}  // namespace steelyard::cli
