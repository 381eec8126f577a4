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
    Interval image;
    image.low = std::numeric_limits<double>::infinity();
    image.high = -std::numeric_limits<double>::infinity();
    for (std::size_t which = 0; which < (std::size_t{1} << spread.size()); ++which) {
        bool open = false;
        bool supposed = false;  // some input stands at the end of its plausible range
        for (std::size_t k = 0; k < spread.size(); ++k) {
            const Interval& side = box[spread[k]];
            const bool upper = ((which >> k) & 1U) != 0;
            corner[spread[k]] = upper ? side.high : side.low;
            open = open || (upper ? side.high_open : side.low_open);
            supposed = supposed || (upper ? side.high_is_ceiling : side.low_is_floor);
        }
        const double value = formula(corner);
        if (!std::isfinite(value)) {
            return std::nullopt;
        }
        // Of corners with one value a closed one closes the end, and a measured one makes it a measurement.
        if (value <= image.low) {
            const bool tie = value == image.low;
            image.low_open = open && (!tie || image.low_open);
            image.low_is_floor = supposed && (!tie || image.low_is_floor);
            image.low = value;
        }
        if (value >= image.high) {
            const bool tie = value == image.high;
            image.high_open = open && (!tie || image.high_open);
            image.high_is_ceiling = supposed && (!tie || image.high_is_ceiling);
            image.high = value;
        }
    }
    if (image.is_point()) {
        return Interval::point(image.low);
    }
    return image;
}

}  // namespace steelyard::likelihoods
