// SPDX-License-Identifier: Apache-2.0
#include "row_sampler.hpp"

#include <algorithm>
#include <cmath>
#include <limits>
#include <utility>

#include "normal_tail.hpp"
#include "steelyard/engine/distributions.hpp"

namespace steelyard::engine::detail {
namespace {

constexpr double infinity = std::numeric_limits<double>::infinity();
constexpr double least_share = 1e-300;

/// P(Z <= z) by a table with 1/256 between its points, straight between them: off by less than 5e-7, and
/// several times as fast as the error function.
class NormalTable {
  public:
    NormalTable() {
        for (int i = 0; i <= 2 * reach * cells; ++i) {
            values_.push_back(upper_tail(-(static_cast<double>(i) / cells - reach)));
        }
    }
    double lower(double z) const noexcept {
        const double place = (std::clamp(z, -static_cast<double>(reach), reach - 1e-9) + reach) * cells;
        const auto cell = static_cast<std::size_t>(place);
        return values_[cell] + (place - static_cast<double>(cell)) * (values_[cell + 1] - values_[cell]);
    }

  private:
    static constexpr int reach = 8;
    static constexpr int cells = 256;
    std::vector<double> values_;
};

const NormalTable& normal_table() {
    static const NormalTable table;
    return table;
}

class DirichletSampler final : public RowSampler {
  public:
    DirichletSampler(const DirichletLaw& law, const std::vector<Eigen::Index>& cells)
        : certain_(static_cast<Eigen::Index>(cells.size()) == law.alpha.size()) {
        if (certain_) {
            return;  // all cells seen: the share is 1 in every draw
        }
        double seen = 0.0;
        for (const Eigen::Index cell : cells) {
            seen += law.alpha(cell);
        }
        table_ = log_beta_quantiles(seen, law.alpha.sum() - seen);
    }

    void fill(const Eigen::Ref<const Eigen::ArrayXXd>& uniforms,
              const Eigen::Ref<const Eigen::ArrayXd>& /*reference*/,
              Eigen::Ref<Eigen::ArrayXd> out) const override {
        if (certain_) {
            out.setZero();
            return;
        }
        for (Eigen::Index i = 0; i < out.size(); ++i) {
            out(i) = std::min(0.0, table_.at(uniforms(i, 0)));
        }
    }

  private:
    bool certain_;
    QuantileTable table_;
};

/// Variance from its scaled-inverse-chi-square law, then the mean given it; the share of the bands under that
/// normal law.
class SummarySampler final : public RowSampler {
  public:
    SummarySampler(const SummaryLaw& law, std::vector<Eigen::Index> cells)
        : cells_(std::move(cells)),
          relative_sd_(relative_sd_quantiles(law.n - 1.0)),
          root_n_(std::sqrt(law.n)),
          least_(law.least) {
        for (Eigen::Index i = 0; i < law.edges.size(); ++i) {
            const double edge = law.scale == Scale::log ? std::log(law.edges(i)) : law.edges(i);
            edges_.push_back((edge - law.mean) / law.sd);
        }
        seen_.assign(edges_.size() + 1, false);
        for (const Eigen::Index cell : cells_) {
            seen_[static_cast<std::size_t>(cell)] = true;
        }
    }

    Eigen::Index coordinates() const noexcept override { return 2; }

    void fill(const Eigen::Ref<const Eigen::ArrayXXd>& uniforms,
              const Eigen::Ref<const Eigen::ArrayXd>& /*reference*/,
              Eigen::Ref<Eigen::ArrayXd> out) const override {
        const QuantileTable& normal = normal_quantiles();
        // (edge - mean) / sigma, with sigma = sd / ratio and mean = stated mean + sigma z / sqrt(n).
        Eigen::ArrayXd ratio(out.size());
        Eigen::ArrayXd shift(out.size());
        for (Eigen::Index i = 0; i < out.size(); ++i) {
            ratio(i) = relative_sd_.at(uniforms(i, 0));
            shift(i) = normal.at(uniforms(i, 1)) / root_n_;
        }
        if (least_ > 0.0) {
            raised_shares(ratio, shift, out);
        } else {
            for (Eigen::Index i = 0; i < out.size(); ++i) {
                out(i) = share(normal_table(), ratio(i), shift(i));
            }
        }
        out = out.max(least_share).min(1.0).log();
    }

  private:
    double standardised(std::size_t edge, double ratio, double shift) const {
        return edges_[edge] * ratio - shift;
    }

    /// By the table; small shares, of which it would leave too few digits, by the error function.
    double mass(const NormalTable& normal, Eigen::Index band, double ratio, double shift) const {
        constexpr double large_enough = 2e-3;  // the table's error is then below 5e-4 of the share
        const auto b = static_cast<std::size_t>(band);
        const double low = b == 0 ? -infinity : standardised(b - 1, ratio, shift);
        const double high = b == edges_.size() ? infinity : standardised(b, ratio, shift);
        const double share = normal.lower(high) - normal.lower(low);
        return share > large_enough ? share : normal_mass(low, high);
    }

    double share(const NormalTable& normal, double ratio, double shift) const {
        double sum = 0.0;
        for (const Eigen::Index cell : cells_) {
            sum += mass(normal, cell, ratio, shift);
        }
        return sum;
    }

    /// As keep_at_least() does: every band at least `least_`, then divided by their sum. Band by band over
    /// all draws.
    void raised_shares(const Eigen::ArrayXd& ratio, const Eigen::ArrayXd& shift,
                       Eigen::Ref<Eigen::ArrayXd> out) const {
        const NormalTable& normal = normal_table();
        Eigen::ArrayXd all = Eigen::ArrayXd::Zero(out.size());
        Eigen::ArrayXd below = all;  // P(below the band's lower edge)
        Eigen::ArrayXd up_to(out.size());
        out.setZero();
        for (std::size_t band = 0; band <= edges_.size(); ++band) {
            if (band == edges_.size()) {
                up_to.setOnes();
            } else {
                for (Eigen::Index i = 0; i < out.size(); ++i) {
                    up_to(i) = normal.lower(standardised(band, ratio(i), shift(i)));
                }
            }
            const Eigen::ArrayXd raised = (up_to - below).max(least_);
            all += raised;
            if (seen_[band]) {
                out += raised;
            }
            below.swap(up_to);
        }
        out /= all;
    }

    std::vector<bool> seen_;  // by band
    std::vector<Eigen::Index> cells_;
    QuantileTable relative_sd_;
    std::vector<double> edges_;  // in standard deviations from the mean
    double root_n_;
    double least_;
};

/// ln share = ln of the share as weighed + what the reference row moved + a normal deviate.
class RatioSampler final : public RowSampler {
  public:
    RatioSampler(double log_share, double log_sd, double reference_log_share)
        : log_share_(log_share), log_sd_(log_sd), reference_log_share_(reference_log_share) {}

    void fill(const Eigen::Ref<const Eigen::ArrayXXd>& uniforms,
              const Eigen::Ref<const Eigen::ArrayXd>& reference,
              Eigen::Ref<Eigen::ArrayXd> out) const override {
        const QuantileTable& normal = normal_quantiles();
        for (Eigen::Index i = 0; i < out.size(); ++i) {
            const double moved = reference.size() == 0 ? 0.0 : reference(i) - reference_log_share_;
            // A ratio drawn too large would make a share above 1, which no row can have.
            out(i) = std::min(0.0, log_share_ + moved + log_sd_ * normal.at(uniforms(i, 0)));
        }
    }

  private:
    double log_share_, log_sd_, reference_log_share_;
};

/// Of several cells the largest deviation, as if they moved together: it errs on the wide side.
double log_sd_of_cells(const RatioLaw& law, const std::vector<Eigen::Index>& cells) {
    double sd = 0.0;
    for (const Eigen::Index cell : cells) {
        sd = std::max(sd, law.log_sd(cell));
    }
    return sd;
}

}  // namespace

std::unique_ptr<const RowSampler> row_sampler(const UncertainRow& row, double reference_log_share) {
    if (const auto* dirichlet = std::get_if<DirichletLaw>(&row.law)) {
        return std::make_unique<DirichletSampler>(*dirichlet, row.cells);
    }
    if (const auto* summary = std::get_if<SummaryLaw>(&row.law)) {
        return std::make_unique<SummarySampler>(*summary, row.cells);
    }
    return std::make_unique<RatioSampler>(
        row.log_share, log_sd_of_cells(std::get<RatioLaw>(row.law), row.cells), reference_log_share);
}

PriorSampler::PriorSampler(const UncertainPrior& prior) : log_value_(prior.log_value) {
    if (const auto* counted = std::get_if<CountedPrior>(&prior.law)) {
        own_ = log_gamma_quantiles(counted->shape);
        log_value_ -= std::log(counted->shape);  // the mean of the drawn weight is the weight as stated
        return;
    }
    if (const auto* ranged = std::get_if<RangedPrior>(&prior.law)) {
        const double deviate = normal_quantile(0.975);
        below_ = (prior.log_value - ranged->log_low) / deviate;
        above_ = (ranged->log_high - prior.log_value) / deviate;
        is_odds_ = ranged->is_odds;
        deviates_ = &normal_quantiles();
        return;
    }
    known_ = true;
}

double PriorSampler::log_weight(double u) const noexcept {
    if (known_) {
        return log_value_;
    }
    if (deviates_ == nullptr) {
        return log_value_ + own_.at(u);
    }
    const double z = deviates_->at(u);
    const double log_odds = log_value_ + (z < 0.0 ? below_ : above_) * z;
    // ln (o / (1 + o)), on the side where nothing overflows.
    return is_odds_ ? std::min(log_odds, 0.0) - std::log1p(std::exp(-std::abs(log_odds))) : log_odds;
}

}  // namespace steelyard::engine::detail
