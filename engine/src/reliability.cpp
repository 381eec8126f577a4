// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/reliability.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <string_view>

#include "forecast_bins.hpp"
#include "guards.hpp"
#include "steelyard/engine/counter_random.hpp"
#include "success_law.hpp"

namespace steelyard::engine {
namespace {

constexpr std::uint32_t calibrated_streams = 0xb0000000U;

/// Patients of each pattern by whether the forecast event happened.
struct Events {
    Eigen::ArrayXd p, happened, patients;
};

void check_options(std::string_view function, const ReliabilityOptions& options) {
    check_bins(function, options.bins);
    check_between(function, "draws", static_cast<double>(options.draws), 20.0, 1e7);
    static_cast<void>(two_sided_normal_quantile(options.level));
}

/// |X - mean| of one bin's successes, to be summed, and drawn from a pair of uniform numbers.
class BinError {
  public:
    BinError(const Events& events, const std::vector<Eigen::Index>& patterns) {
        double variance = 0.0;
        double mean = 0.0;
        bool whole = true;
        for (const Eigen::Index g : patterns) {
            mean += events.patients(g) * events.p(g);
            variance += events.patients(g) * events.p(g) * (1.0 - events.p(g));
            whole = whole && events.patients(g) == std::floor(events.patients(g));
        }
        sd_ = std::sqrt(variance);
        if (!whole || variance >= 100.0) {
            expected_ = sd_ * std::sqrt(2.0 / std::numbers::pi);
            return;
        }
        SuccessLaw law;
        for (const Eigen::Index g : patterns) {
            law.add_trials(events.patients(g), events.p(g));
        }
        double sum = 0.0;
        for (std::size_t i = 0; i < law.mass().size(); ++i) {
            sum += law.mass()[i];
            reached_.push_back(sum);
            off_.push_back(std::abs(law.first() + static_cast<double>(i) - mean));
            expected_ += law.mass()[i] * off_.back();
        }
    }

    double expected() const { return expected_; }

    /// @param first, second  uniform in (0, 1)
    double draw(double first, double second) const {
        if (reached_.empty()) {  // Box and Muller
            return sd_ *
                   std::abs(std::sqrt(-2.0 * std::log(first)) * std::cos(2.0 * std::numbers::pi * second));
        }
        const auto place = std::upper_bound(reached_.begin(), reached_.end(), first) - reached_.begin();
        return off_[std::min(static_cast<std::size_t>(place), off_.size() - 1)];
    }

  private:
    std::vector<double> reached_, off_;  // empty where the law is taken as normal
    double sd_ = 0.0;
    double expected_ = 0.0;
};

Reliability reliability_of(const Events& events, const ReliabilityOptions& options) {
    std::vector<std::vector<Eigen::Index>> patterns(static_cast<std::size_t>(options.bins));
    for (Eigen::Index g = 0; g < events.p.size(); ++g) {
        if (events.patients(g) > 0.0) {
            patterns[static_cast<std::size_t>(bin_of(events.p(g), options.bins))].push_back(g);
        }
    }
    const double n = events.patients.sum();
    Reliability result;
    Eigen::ArrayXd error = Eigen::ArrayXd::Zero(options.draws);
    std::vector<double> uniforms(2 * static_cast<std::size_t>(options.draws));
    for (std::size_t b = 0; b < patterns.size(); ++b) {
        if (patterns[b].empty()) {
            continue;
        }
        ReliabilityBin bin;
        bin.index = static_cast<Eigen::Index>(b);
        bin.low = static_cast<double>(b) / static_cast<double>(options.bins);
        bin.high = static_cast<double>(b + 1) / static_cast<double>(options.bins);
        double forecast = 0.0;
        double happened = 0.0;
        for (const Eigen::Index g : patterns[b]) {
            bin.count += events.patients(g);
            forecast += events.patients(g) * events.p(g);
            happened += events.happened(g);
        }
        bin.mean_forecast = forecast / bin.count;
        bin.observed = wilson_interval(std::min(happened, bin.count), bin.count, options.level);
        result.bins.push_back(bin);
        const double gap = std::abs(forecast - happened);
        result.error.value += gap / n;
        result.largest_gap = std::max(result.largest_gap, gap / bin.count);

        const BinError law(events, patterns[b]);
        result.error.expected_if_calibrated += law.expected() / n;
        fill_uniform(options.seed, calibrated_streams + static_cast<std::uint32_t>(b), 0, uniforms);
        for (Eigen::Index draw = 0; draw < error.size(); ++draw) {
            const auto at = 2 * static_cast<std::size_t>(draw);
            error(draw) += law.draw(uniforms[at], uniforms[at + 1]) / n;
        }
    }
    const auto place = static_cast<Eigen::Index>(std::ceil(0.95 * static_cast<double>(error.size()))) - 1;
    std::nth_element(error.data(), error.data() + place, error.data() + error.size());
    result.error.percentile_95_if_calibrated = error(place);
    return result;
}

}  // namespace

Reliability reliability(const AuditSample& sample, Eigen::Index cause, const ReliabilityOptions& options) {
    check_audit_sample("reliability", sample);
    check_index("reliability", "cause", cause, sample.causes());
    check_options("reliability", options);
    return reliability_of(
        {sample.log_forecast.col(cause).exp(), sample.count.col(cause), sample.pattern_counts()}, options);
}

Reliability leader_reliability(const AuditSample& sample, const ReliabilityOptions& options) {
    check_audit_sample("leader_reliability", sample);
    check_options("leader_reliability", options);
    const Eigen::ArrayXi leader = leaders(sample);
    Events events{Eigen::ArrayXd(sample.patterns()), Eigen::ArrayXd(sample.patterns()),
                  sample.pattern_counts()};
    for (Eigen::Index g = 0; g < sample.patterns(); ++g) {
        events.p(g) = std::exp(sample.log_forecast(g, leader(g)));
        events.happened(g) = sample.count(g, leader(g));
    }
    return reliability_of(events, options);
}

}  // namespace steelyard::engine
