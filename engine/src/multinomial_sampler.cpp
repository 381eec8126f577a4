// SPDX-License-Identifier: Apache-2.0
#include "multinomial_sampler.hpp"

#include <algorithm>
#include <boost/math/special_functions/gamma.hpp>
#include <cmath>
#include <cstddef>

#include "steelyard/engine/boost_policy.hpp"

namespace steelyard::engine {
namespace {

constexpr double most_in_small = 256.0;
constexpr double short_by = 8.0;  // standard deviations of a count by which the independent draws aim low

}  // namespace

MultinomialSampler::Table MultinomialSampler::poisson(double rate) {
    constexpr double least = 1e-18;
    const double mode = std::floor(rate);
    const double at_mode =
        std::exp(mode * std::log(rate) - rate - boost::math::lgamma(mode + 1.0, BoostPolicy()));
    std::vector<double> below;  // mass at mode - 1, mode - 2, ...
    double mass = at_mode;
    for (double x = mode; x > 0.0; --x) {
        mass *= x / rate;
        if (mass < least) {
            break;
        }
        below.push_back(mass);
    }
    Table table;
    table.first = mode - static_cast<double>(below.size());
    std::vector<double> all(below.rbegin(), below.rend());
    mass = at_mode;
    for (double x = mode; mass >= least; ++x) {
        all.push_back(mass);
        mass *= rate / (x + 1.0);
    }
    double sum = 0.0;
    for (const double here : all) {
        sum += here;
        table.reached.push_back(sum);
    }
    table.reached.back() = 1.0;
    std::uint32_t at = 0;
    for (std::size_t j = 0; j < all.size(); ++j) {
        while (table.reached[at] <= static_cast<double>(j) / static_cast<double>(all.size())) {
            ++at;
        }
        table.guide.push_back(at);
    }
    return table;
}

double MultinomialSampler::Table::draw(double u) const {
    std::size_t at = guide[static_cast<std::size_t>(u * static_cast<double>(guide.size()))];
    while (reached[at] <= u) {
        ++at;
    }
    return first + static_cast<double>(at);
}

MultinomialSampler::MultinomialSampler(const Eigen::Ref<const Eigen::ArrayXd>& count) : count_(count) {
    double in_small = 0.0;
    for (Eigen::Index c = 0; c < count.size(); ++c) {
        if (count(c) > most_in_small) {
            large_.push_back(c);
        } else if (count(c) > 0.0) {
            small_.push_back(c);
            in_small += count(c);
        }
    }
    left_before_.resize(static_cast<Eigen::Index>(large_.size()));
    double after = in_small;
    for (Eigen::Index i = left_before_.size() - 1; i >= 0; --i) {
        after += count(large_[static_cast<std::size_t>(i)]);
        left_before_(i) = after;
    }
    const double share = 1.0 - short_by / std::sqrt(std::max(in_small, 1.0));
    independent_first_ = share > 0.25;
    if (independent_first_) {
        tables_.resize(static_cast<std::size_t>(most_in_small) + 1);
        for (const Eigen::Index c : small_) {
            Table& table = tables_[static_cast<std::size_t>(count(c))];
            if (table.reached.empty()) {
                table = poisson(share * count(c));
            }
        }
    }
    // Walker's alias method (from memory): every place holds its own cell's chance up to 1 and another's
    // above.
    keep_.assign(small_.size(), 1.0);
    instead_.assign(small_.size(), 0);
    std::vector<std::uint32_t> under, over;
    for (std::size_t i = 0; i < small_.size(); ++i) {
        keep_[i] = count(small_[i]) * static_cast<double>(small_.size()) / in_small;
        (keep_[i] < 1.0 ? under : over).push_back(static_cast<std::uint32_t>(i));
    }
    while (!under.empty() && !over.empty()) {
        const std::uint32_t poor = under.back();
        const std::uint32_t rich = over.back();
        under.pop_back();
        instead_[poor] = rich;
        keep_[rich] -= 1.0 - keep_[poor];
        if (keep_[rich] < 1.0) {
            over.pop_back();
            under.push_back(rich);
        }
    }
    for (const std::uint32_t rest : under) {
        keep_[rest] = 1.0;  // short of it by rounding only
    }
}

double MultinomialSampler::draw_independently(BinomialSampler& random,
                                              Eigen::Ref<Eigen::VectorXd> out) const {
    double sum = 0.0;
    for (const Eigen::Index c : small_) {
        out(c) = tables_[static_cast<std::size_t>(count_(c))].draw(random.uniform());
        sum += out(c);
    }
    return sum;
}

Eigen::Index MultinomialSampler::one_small_cell(BinomialSampler& random) const {
    const double place = random.uniform() * static_cast<double>(small_.size());
    const auto at = static_cast<std::size_t>(place);
    return small_[place - static_cast<double>(at) < keep_[at] ? at : instead_[at]];
}

void MultinomialSampler::draw(std::uint64_t seed, std::uint32_t stream,
                              Eigen::Ref<Eigen::VectorXd> out) const {
    BinomialSampler random(seed, stream);
    out.setZero();
    double left = count_.sum();
    for (std::size_t i = 0; i < large_.size(); ++i) {
        const Eigen::Index c = large_[i];
        out(c) = random.draw(left, count_(c) / left_before_(static_cast<Eigen::Index>(i)));
        left -= out(c);
    }
    if (independent_first_) {
        constexpr int tries = 100;  // the first does but one time in a hundred million
        double sum = left + 1.0;
        for (int i = 0; i < tries && sum > left; ++i) {
            sum = draw_independently(random, out);
        }
        if (sum > left) {
            for (const Eigen::Index c : small_) {
                out(c) = 0.0;
            }
            sum = 0.0;
        }
        left -= sum;
    }
    for (; left > 0.0; --left) {
        out(one_small_cell(random)) += 1.0;
    }
}

}  // namespace steelyard::engine
