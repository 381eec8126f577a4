// SPDX-License-Identifier: Apache-2.0
#include "steelyard/engine/audit_bootstrap.hpp"

#include <cmath>
#include <limits>
#include <string_view>

#include "acts_at.hpp"
#include "area_order.hpp"
#include "causes_before.hpp"
#include "cells.hpp"
#include "forecast_bins.hpp"
#include "guards.hpp"
#include "hand_till.hpp"
#include "resampler.hpp"
#include "steelyard/engine/calibration.hpp"

namespace steelyard::engine {
namespace {

constexpr std::string_view name = "audit_intervals";
constexpr double nan = std::numeric_limits<double>::quiet_NaN();

/// Where each figure stands in a replicate's column.
struct Layout {
    Eigen::Index causes, thresholds;

    static constexpr Eigen::Index log_score = 0, brier = 1, top_1 = 2, top_2 = 3, log_skill = 4,
                                  brier_skill = 5, hand_till = 6, leader_error = 7, per_cause = 8;
    Eigen::Index area(Eigen::Index k) const { return per_cause + k; }
    Eigen::Index error(Eigen::Index k) const { return per_cause + causes + k; }
    Eigen::Index intercept(Eigen::Index k) const { return per_cause + 2 * causes + k; }
    Eigen::Index slope(Eigen::Index k) const { return per_cause + 3 * causes + k; }
    Eigen::Index benefit(Eigen::Index t) const { return per_cause + 4 * causes + t; }
    Eigen::Index size() const { return per_cause + 4 * causes + thresholds; }
};

double logistic(double x) {
    return x >= 0.0 ? 1.0 / (1.0 + std::exp(-x)) : std::exp(x) / (1.0 + std::exp(x));
}

/// Everything about cells and patterns that a replicate needs, computed once.
class Features {
  public:
    Features(const AuditSample& sample, Eigen::Index bins, const std::vector<ActionThreshold>& thresholds)
        : layout_{sample.causes(), static_cast<Eigen::Index>(thresholds.size())},
          bins_(bins),
          cells_(sample.count),
          order_(sample, cells_),
          pairs_(pairs_of(sample.cause_counts())) {
        read_cells(sample, thresholds);
        read_patterns(sample);
        read_calibration(sample);
    }

    const Cells& cells() const { return cells_; }
    const Layout& layout() const { return layout_; }

    void evaluate(const Eigen::MatrixXd& weights, Eigen::Ref<Eigen::ArrayXXd> figures) const {
        // Means over patients, all at once.
        const Eigen::MatrixXd means = of_cell_ * weights / cells_.count.sum();
        Eigen::MatrixXd patterns = Eigen::MatrixXd::Zero(forecast_.cols(), weights.cols());
        for (Eigen::Index r = 0; r < weights.cols(); ++r) {
            for (Eigen::Index c = 0; c < cells_.size(); ++c) {
                patterns(cells_.pattern(c), r) += weights(c, r);
            }
        }
        const Eigen::MatrixXd fitted = calibration_ * patterns;
        for (Eigen::Index r = 0; r < weights.cols(); ++r) {
            const Eigen::ArrayXd cases = cause_sums(weights.col(r).array());
            Eigen::Ref<Eigen::ArrayXd> out = figures.col(r);
            out.head(4) = means.col(r).head(4).array();
            out.tail(layout_.thresholds) = means.col(r).tail(layout_.thresholds).array();
            skills(cases, out);
            areas(weights.col(r).array(), cases, out);
            errors(weights.col(r).array(), patterns.col(r).array(), out);
            coefficients(weights.col(r).array(), cases, fitted.col(r).array(), out);
        }
    }

  private:
    static Eigen::Index pairs_of(const Eigen::ArrayXd& cases) {
        const Eigen::Index present = (cases > 0.0).count();
        return present * (present - 1) / 2;
    }

    void read_cells(const AuditSample& sample, const std::vector<ActionThreshold>& thresholds) {
        of_cell_.setZero(4 + layout_.thresholds, cells_.size());
        leader_ = leaders(sample);
        own_bin_.resize(cells_.size());
        own_log_odds_.resize(cells_.size());
        for (Eigen::Index c = 0; c < cells_.size(); ++c) {
            const Eigen::Index g = cells_.pattern(c);
            const Eigen::Index own = cells_.cause(c);
            const double log_p = sample.log_forecast(g, own);
            const double square = (2.0 * sample.log_forecast.row(g)).exp().sum();
            const Eigen::Index before = causes_before(sample.log_forecast, leader_(g), g, own);
            of_cell_(Layout::log_score, c) = -log_p;
            of_cell_(Layout::brier, c) = square - 2.0 * std::exp(log_p) + 1.0;
            of_cell_(Layout::top_1, c) = before < 1 ? 1.0 : 0.0;
            of_cell_(Layout::top_2, c) = before < 2 ? 1.0 : 0.0;
            for (std::size_t t = 0; t < thresholds.size(); ++t) {
                const auto& [cause, threshold] = thresholds[t];
                if (acts_at(sample.log_forecast(g, cause), threshold)) {
                    of_cell_(4 + static_cast<Eigen::Index>(t), c) =
                        own == cause ? 1.0 : -threshold / (1.0 - threshold);
                }
            }
        }
    }

    void read_patterns(const AuditSample& sample) {
        forecast_ = sample.log_forecast.transpose().exp();
        bin_.resize(sample.causes(), sample.patterns());
        leader_bin_.resize(sample.patterns());
        leader_forecast_.resize(sample.patterns());
        for (Eigen::Index g = 0; g < sample.patterns(); ++g) {
            for (Eigen::Index k = 0; k < sample.causes(); ++k) {
                bin_(k, g) = static_cast<int>(k * bins_ + bin_of(forecast_(k, g), bins_));
            }
            leader_forecast_(g) = forecast_(leader_(g), g);
            leader_bin_(g) = static_cast<int>(bin_of(leader_forecast_(g), bins_));
        }
        for (Eigen::Index c = 0; c < cells_.size(); ++c) {
            own_bin_(c) = bin_(cells_.cause(c), cells_.pattern(c));
        }
    }

    /// Per pattern and cause, at the sample's own estimate: fitted p, p x, and the information p q (1, x,
    /// x^2).
    void read_calibration(const AuditSample& sample) {
        calibration_.setZero(5 * sample.causes(), sample.patterns());
        estimate_.setConstant(2, sample.causes(), nan);
        for (Eigen::Index k = 0; k < sample.causes(); ++k) {
            const Eigen::ArrayXd x = log_odds_against_rest(sample, k);
            for (Eigen::Index c = 0; c < cells_.size(); ++c) {
                if (cells_.cause(c) == k) {
                    own_log_odds_(c) = x(cells_.pattern(c));
                }
            }
            const CauseCalibration fit = cause_calibration(sample, k);
            if (!fit.cox) {
                continue;
            }
            estimate_(0, k) = fit.cox->intercept;
            estimate_(1, k) = fit.cox->slope;
            for (Eigen::Index g = 0; g < x.size(); ++g) {
                const double eta = fit.cox->intercept + fit.cox->slope * x(g);
                const double p = logistic(eta);
                const double curvature = p * logistic(-eta);
                calibration_.col(g).segment<5>(5 * k) << p, p * x(g), curvature, curvature * x(g),
                    curvature * x(g) * x(g);
            }
        }
    }

    Eigen::ArrayXd cause_sums(const Eigen::Ref<const Eigen::ArrayXd>& weight) const {
        Eigen::ArrayXd sums = Eigen::ArrayXd::Zero(layout_.causes);
        for (Eigen::Index c = 0; c < weight.size(); ++c) {
            sums(cells_.cause(c)) += weight(c);
        }
        return sums;
    }

    static void skills(const Eigen::ArrayXd& cases, Eigen::Ref<Eigen::ArrayXd> out) {
        const Eigen::ArrayXd share = cases / cases.sum();
        double entropy = 0.0;
        for (Eigen::Index k = 0; k < share.size(); ++k) {
            entropy -= share(k) > 0.0 ? share(k) * std::log(share(k)) : 0.0;
        }
        const bool one_cause = share.maxCoeff() == 1.0;
        out(Layout::log_skill) = one_cause ? nan : 1.0 - out(Layout::log_score) / entropy;
        out(Layout::brier_skill) = one_cause ? nan : 1.0 - out(Layout::brier) / (share * (1.0 - share)).sum();
    }

    void areas(const Eigen::Ref<const Eigen::ArrayXd>& weight, const Eigen::ArrayXd& cases,
               Eigen::Ref<Eigen::ArrayXd> out) const {
        Eigen::ArrayXXd wins;
        order_.wins(weight, wins);
        const double n = cases.sum();
        for (Eigen::Index k = 0; k < layout_.causes; ++k) {
            const double possible = cases(k) * (n - cases(k));
            out(layout_.area(k)) = possible > 0.0 ? wins.row(k).sum() / possible : nan;
        }
        const HandTill mean = hand_till(wins, cases);
        out(Layout::hand_till) = mean.pairs == pairs_ ? mean.mean : nan;
    }

    void errors(const Eigen::Ref<const Eigen::ArrayXd>& weight,
                const Eigen::Ref<const Eigen::ArrayXd>& patterns, Eigen::Ref<Eigen::ArrayXd> out) const {
        Eigen::ArrayXd miss = Eigen::ArrayXd::Zero(layout_.causes * bins_);
        Eigen::ArrayXd leader_miss = Eigen::ArrayXd::Zero(bins_);
        for (Eigen::Index g = 0; g < patterns.size(); ++g) {
            const double here = patterns(g);
            if (here > 0.0) {
                for (Eigen::Index k = 0; k < layout_.causes; ++k) {
                    miss(bin_(k, g)) += here * forecast_(k, g);
                }
                leader_miss(leader_bin_(g)) += here * leader_forecast_(g);
            }
        }
        for (Eigen::Index c = 0; c < weight.size(); ++c) {
            miss(own_bin_(c)) -= weight(c);
            const Eigen::Index g = cells_.pattern(c);
            leader_miss(leader_bin_(g)) -= cells_.cause(c) == leader_(g) ? weight(c) : 0.0;
        }
        const double n = weight.sum();
        for (Eigen::Index k = 0; k < layout_.causes; ++k) {
            out(layout_.error(k)) = miss.segment(k * bins_, bins_).abs().sum() / n;
        }
        out(Layout::leader_error) = leader_miss.abs().sum() / n;
    }

    /// One Newton step from the sample's own estimate.
    void coefficients(const Eigen::Ref<const Eigen::ArrayXd>& weight, const Eigen::ArrayXd& cases,
                      const Eigen::Ref<const Eigen::ArrayXd>& fitted, Eigen::Ref<Eigen::ArrayXd> out) const {
        Eigen::ArrayXd log_odds = Eigen::ArrayXd::Zero(layout_.causes);  // summed over each cause's own cases
        for (Eigen::Index c = 0; c < weight.size(); ++c) {
            log_odds(cells_.cause(c)) += weight(c) * own_log_odds_(c);
        }
        const double n = weight.sum();
        for (Eigen::Index k = 0; k < layout_.causes; ++k) {
            const Eigen::ArrayXd at = fitted.segment(5 * k, 5);
            const double first = cases(k) - at(0);
            const double second = log_odds(k) - at(1);
            const double determinant = at(2) * at(4) - at(3) * at(3);
            const bool defined = cases(k) > 0.0 && cases(k) < n && determinant > 1e-12 * at(2) * at(4);
            out(layout_.intercept(k)) =
                defined ? estimate_(0, k) + (at(4) * first - at(3) * second) / determinant : nan;
            out(layout_.slope(k)) =
                defined ? estimate_(1, k) + (at(2) * second - at(3) * first) / determinant : nan;
        }
    }

    Layout layout_;
    Eigen::Index bins_;
    Cells cells_;
    AreaOrder order_;
    Eigen::Index pairs_;
    Eigen::MatrixXd of_cell_;         // shape (4 + T, M): log score, Brier, top 1, top 2, net benefits
    Eigen::ArrayXi own_bin_;          // shape (M): bin of the cell's own cause, as in bin_
    Eigen::ArrayXd own_log_odds_;     // shape (M)
    Eigen::ArrayXXd forecast_;        // shape (K, G): p
    Eigen::ArrayXXi bin_;             // shape (K, G): k B + bin of p
    Eigen::ArrayXi leader_;           // shape (G)
    Eigen::ArrayXi leader_bin_;       // shape (G)
    Eigen::ArrayXd leader_forecast_;  // shape (G)
    Eigen::MatrixXd calibration_;     // shape (5 K, G)
    Eigen::ArrayXXd estimate_;        // shape (2, K): intercept and slope; NaN where not estimable
};

}  // namespace

AuditIntervals audit_intervals(const AuditSample& sample, const ResamplingOptions& options, Eigen::Index bins,
                               const std::vector<ActionThreshold>& thresholds) {
    check_audit_sample(name, sample);
    check_resampling(name, sample.count.reshaped(), options);
    check_bins(name, bins);
    for (const auto& [cause, threshold] : thresholds) {
        check_index(name, "thresholds cause", cause, sample.causes());
        check_between(name, "threshold", threshold, 1e-6, 1.0 - 1e-6);
    }
    const Features features(sample, bins, thresholds);
    const Layout& at = features.layout();
    const Eigen::ArrayXXd replicates =
        resample(features.cells().count, options, at.size(),
                 [&](const Eigen::MatrixXd& weights, Eigen::Ref<Eigen::ArrayXXd> figures) {
                     features.evaluate(weights, figures);
                 });
    const auto interval = [&](Eigen::Index figure) {
        return percentile_interval(replicates.col(figure), options.level);
    };
    AuditIntervals result;
    result.log_score = interval(Layout::log_score);
    result.brier = interval(Layout::brier);
    result.log_skill = interval(Layout::log_skill);
    result.brier_skill = interval(Layout::brier_skill);
    result.top_1 = interval(Layout::top_1);
    result.top_2 = interval(Layout::top_2);
    result.hand_till = interval(Layout::hand_till);
    result.leader_calibration_error = interval(Layout::leader_error);
    for (Eigen::Index k = 0; k < sample.causes(); ++k) {
        result.area.push_back(interval(at.area(k)));
        result.calibration_error.push_back(interval(at.error(k)));
        result.intercept.push_back(interval(at.intercept(k)));
        result.slope.push_back(interval(at.slope(k)));
    }
    for (Eigen::Index t = 0; t < at.thresholds; ++t) {
        result.net_benefit.push_back(interval(at.benefit(t)));
    }
    return result;
}

}  // namespace steelyard::engine
