// SPDX-License-Identifier: Apache-2.0
#include "steelyard/likelihoods/box.hpp"

#include <cmath>
#include <cstddef>
#include <limits>

namespace steelyard::likelihoods {

std::optional<Interval> image_of_box(const std::vector<Interval>& box, const Formula& formula) {
    std::vector<std::size_t> spread;  // inputs that are no points
    std::vector<double> corner(box.size());
    for (std::size_t i = 0; i < box.size(); ++i) {
        corner[i] = box[i].low;
        if (!box[i].is_point()) {
            spread.push_back(i);
        }
    }
    Interval image{std::numeric_limits<double>::infinity(), -std::numeric_limits<double>::infinity(), true,
                   true};
    for (std::size_t which = 0; which < (std::size_t{1} << spread.size()); ++which) {
        bool open = false;
        for (std::size_t k = 0; k < spread.size(); ++k) {
            const Interval& side = box[spread[k]];
            const bool upper = ((which >> k) & 1U) != 0;
            corner[spread[k]] = upper ? side.high : side.low;
            open = open || (upper ? side.high_open : side.low_open);
        }
        const double value = formula(corner);
        if (!std::isfinite(value)) {
            return std::nullopt;
        }
        if (value < image.low || (value == image.low && !open)) {
            image.low = value;
            image.low_open = open;
        }
        if (value > image.high || (value == image.high && !open)) {
            image.high = value;
            image.high_open = open;
        }
    }
    if (image.is_point()) {
        image.low_open = image.high_open = false;
    }
    return image;
}

}  // namespace steelyard::likelihoods
